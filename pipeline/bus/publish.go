package bus

import (
	"context"
	"fmt"
	"strconv"
	"sync"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"

	"thawledger/pipeline"
)

const (
	// maxOutstanding bounds the parts that are published and not yet answered
	// for, over all publishers of a bus. With every write synced the server
	// stalls beyond about so many.
	maxOutstanding = 128
	// maxMessageBytes leaves room for the header lines beside the part.
	maxMessageBytes = MaxEncodedBytes + 4096
)

// Names of header lines.
const (
	batchHeader   = "Thaw-Batch"
	numberHeader  = "Thaw-Part"
	attemptHeader = "Thaw-Attempt"
	stationHeader = "Thaw-Station"
)

// PartID names a part on its way.
type PartID struct {
	Batch   int64
	Number  int32
	Attempt int32
}

// IDOf returns the name of a part.
func IDOf(p *pipeline.Part) PartID { return PartID{p.Batch, p.Number, p.Attempt} }

// String returns batch/number/attempt. The server drops a second message of
// the same within two minutes.
func (id PartID) String() string { return fmt.Sprintf("%d/%d/%d", id.Batch, id.Number, id.Attempt) }

// PublishError says which parts are not known to be on the bus. A part may be
// there all the same, when only the answer was lost.
type PublishError struct {
	Parts []PartID // in no particular order
	Err   error    // the first failure
}

func (e *PublishError) Error() string {
	if n := len(e.Parts) - 1; n > 0 {
		return fmt.Sprintf("publish part %v and %d more: %v", e.Parts[0], n, e.Err)
	}
	return fmt.Sprintf("publish part %v: %v", e.Parts[0], e.Err)
}

func (e *PublishError) Unwrap() error { return e.Err }

// Publisher publishes parts without waiting for each one's answer. Use one for
// each batch: its Flush answers for the parts it was given. A Publisher may be
// used from several goroutines and again after Flush; it needs no closing.
type Publisher struct {
	bus *Bus

	mu     sync.Mutex
	open   map[*sent]struct{}
	failed []PartID
	err    error         // the first failure
	idle   chan struct{} // closed when open gets empty; nil if nobody waits
}

// sent is one part on its way to the server.
type sent struct {
	by *Publisher
	id PartID
}

// NewPublisher returns a publisher.
func (b *Bus) NewPublisher() *Publisher {
	return &Publisher{bus: b, open: map[*sent]struct{}{}}
}

// Publish hands a part to the server and returns without its answer; it is
// published once Flush says so. It blocks while 128 parts of all publishers of
// the bus are unanswered, until one is or ctx is over. The part may be changed
// when Publish has returned.
//
// It fails when the part cannot be encoded or the server is out of reach, and
// at once when an earlier part has failed since the last Flush. A part that
// Publish refused also counts among those that Flush tells of, so that a caller
// may look at Flush alone.
func (p *Publisher) Publish(ctx context.Context, part *pipeline.Part) error {
	s := &sent{by: p, id: IDOf(part)}
	p.mu.Lock()
	err := p.err
	p.open[s] = struct{}{}
	p.mu.Unlock()
	if err != nil {
		p.settle(s, err)
		return fmt.Errorf("publish part %v: an earlier part failed: %w", s.id, err)
	}
	if err := p.bus.send(ctx, s, part); err != nil {
		p.settle(s, err)
		return fmt.Errorf("publish part %v: %w", s.id, err)
	}
	return nil
}

// Flush waits until every part given to Publish since the last Flush is
// answered for, or ctx is over. nil means that each of them is on the server's
// disk. Otherwise it returns a *PublishError with those that are not known to
// be; publish these again, with a new attempt. A server that does not answer is
// given 30 s.
func (p *Publisher) Flush(ctx context.Context) error {
	err := p.flush(ctx)
	if err == nil {
		return nil
	}
	if missing(err) {
		if again := p.bus.restore(ctx, err); again != nil {
			err.Err = fmt.Errorf("%w; %w", err.Err, again)
		}
	}
	return err
}

func (p *Publisher) flush(ctx context.Context) *PublishError {
	for {
		p.mu.Lock()
		over := ctx.Err() != nil
		if len(p.open) == 0 || over {
			defer p.mu.Unlock()
			if over && len(p.open) > 0 && p.err == nil {
				p.err = context.Cause(ctx)
			}
			for s := range p.open {
				p.failed = append(p.failed, s.id)
			}
			failed, err := p.failed, p.err
			p.open, p.failed, p.err = map[*sent]struct{}{}, nil, nil
			if len(failed) == 0 {
				return nil
			}
			return &PublishError{Parts: failed, Err: err}
		}
		if p.idle == nil {
			p.idle = make(chan struct{})
		}
		idle := p.idle
		p.mu.Unlock()
		select {
		case <-idle:
		case <-ctx.Done():
		}
	}
}

// settle records how a part ended. Parts of an earlier Flush are forgotten.
func (p *Publisher) settle(s *sent, err error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if _, ok := p.open[s]; !ok {
		return
	}
	delete(p.open, s)
	if err != nil {
		p.failed = append(p.failed, s.id)
		if p.err == nil {
			p.err = err
		}
	}
	if len(p.open) == 0 && p.idle != nil {
		close(p.idle)
		p.idle = nil
	}
}

// send puts a part on its way; settle is called when its answer is there.
func (b *Bus) send(ctx context.Context, s *sent, part *pipeline.Part) error {
	station, err := token("station", part.Station)
	if err != nil {
		return err
	}
	body, err := Encode(nil, part)
	if err != nil {
		return err
	}
	msg := &nats.Msg{
		Subject: readingsSubject + station,
		Header: nats.Header{
			jetstream.MsgIDHeader: {s.id.String()},
			batchHeader:           {strconv.FormatInt(s.id.Batch, 10)},
			numberHeader:          {strconv.Itoa(int(s.id.Number))},
			attemptHeader:         {strconv.Itoa(int(s.id.Attempt))},
			stationHeader:         {station},
		},
		Data: body,
	}
	if b.closing() {
		return ErrClosed
	}
	select {
	case b.slots <- struct{}{}:
	case <-b.closed:
		return ErrClosed
	case <-ctx.Done():
		return context.Cause(ctx)
	}
	b.mu.Lock()
	if b.closing() {
		b.mu.Unlock()
		<-b.slots
		return ErrClosed
	}
	b.sent[msg] = s
	b.mu.Unlock()
	if _, err := b.js.PublishMsgAsync(msg); err != nil {
		b.settle(msg, err)
		return told(err)
	}
	return nil
}

// settle is told by the client how a message ended. The first word counts.
func (b *Bus) settle(m *nats.Msg, err error) {
	b.mu.Lock()
	s, ok := b.sent[m]
	delete(b.sent, m)
	b.mu.Unlock()
	if ok {
		<-b.slots
		s.by.settle(s, told(err))
	}
}

func (b *Bus) settleAll(err error) {
	b.mu.Lock()
	all := make([]*nats.Msg, 0, len(b.sent))
	for m := range b.sent {
		all = append(all, m)
	}
	b.mu.Unlock()
	for _, m := range all {
		b.settle(m, err)
	}
}
