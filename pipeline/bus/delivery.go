package bus

import (
	"context"
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/nats-io/nats.go/jetstream"

	"thawledger/pipeline"
)

// ErrMismatch says that a message's header lines and its body name different
// parts.
var ErrMismatch = errors.New("header lines and body differ")

// maxReason is how many bytes of a reason are sent to the server.
const maxReason = 200

// Delivery is one part as taken off the bus, or a message that holds none. It is
// to be answered by exactly one of Done (or DoneConfirmed), NotNow and
// NeverAgain; a second answer is an error. Answers do not block; an answer that
// fails or gets lost leads to the part being given out again, which writing by
// key must bear anyway, so an error is worth a log line at most.
type Delivery struct {
	Part *pipeline.Part // nil if Err is set
	Err  error          // why the message could not be read; see Decode and ErrMismatch

	ID         PartID // from the header lines; from the body where they are lacking; zero if neither tells
	Station    string // likewise
	Deliveries uint64 // how often the message was given out, this time included; starts anew if the server's records were lost
	Body       []byte // the message as it came, to be kept with what is never taken again

	msg jetstream.Msg
}

func newDelivery(m jetstream.Msg) Delivery {
	d := Delivery{Body: m.Data(), msg: m}
	if meta, err := m.Metadata(); err == nil {
		d.Deliveries = meta.NumDelivered
	}
	headed := d.readHeader()
	p, err := Decode(m.Data())
	switch {
	case err != nil:
		d.Err = err
	case headed && (d.ID != IDOf(p) || d.Station != p.Station):
		d.Err = fmt.Errorf("%w: %v of %q and %v of %q", ErrMismatch, d.ID, d.Station, IDOf(p), p.Station)
	default:
		d.Part, d.ID, d.Station = p, IDOf(p), p.Station
	}
	return d
}

// readHeader says whether the header lines name a part; all four are needed.
func (d *Delivery) readHeader() bool {
	h := d.msg.Headers()
	batch, err1 := strconv.ParseInt(h.Get(batchHeader), 10, 64)
	number, err2 := strconv.ParseInt(h.Get(numberHeader), 10, 32)
	attempt, err3 := strconv.ParseInt(h.Get(attemptHeader), 10, 32)
	station, err4 := untoken(h.Get(stationHeader))
	if errors.Join(err1, err2, err3, err4) != nil {
		return false
	}
	d.ID = PartID{batch, int32(number), int32(attempt)}
	d.Station = station
	return true
}

// Done says that the part is worked off: it leaves the bus. It does not wait for
// the server; if the word is lost, the part comes again.
func (d *Delivery) Done() error { return d.answer("done", d.msg.Ack()) }

// DoneConfirmed is Done, and waits for the server to confirm it, until ctx is
// over, or for 5 s if ctx has no deadline. One round trip each: for tests and
// single parts, not for hundreds.
func (d *Delivery) DoneConfirmed(ctx context.Context) error {
	return d.answer("done", d.msg.DoubleAck(ctx))
}

// NotNow puts the part off: it is given out again, to any taker, after delay, at
// once if that is 0. Up to 2000 parts may be with takers or put off at a time;
// further ones wait, so keep delays to seconds where many may be put off.
func (d *Delivery) NotNow(delay time.Duration) error {
	if delay <= 0 {
		return d.answer("not now", d.msg.Nak())
	}
	return d.answer("not now", d.msg.NakWithDelay(delay))
}

// NeverAgain takes the part off the bus although it is not worked off. The bus
// keeps no copy (see Body). The reason, cut to one line of 200 bytes, is made
// known by the server to whoever watches it.
func (d *Delivery) NeverAgain(reason string) error {
	reason = strings.Join(strings.Fields(strings.ToValidUTF8(reason, "?")), " ")
	if len(reason) > maxReason {
		reason = strings.ToValidUTF8(reason[:maxReason], "")
	}
	if reason == "" {
		reason = "no reason given"
	}
	return d.answer("never again", d.msg.TermWithReason(reason))
}

// StillWorking starts the part's Config.WorkTime anew. It may be said any number
// of times before the answer.
func (d *Delivery) StillWorking() error { return d.answer("still working", d.msg.InProgress()) }

func (d *Delivery) answer(what string, err error) error {
	if err != nil {
		return fmt.Errorf("say %s to part %v: %w", what, d.ID, told(err))
	}
	return nil
}
