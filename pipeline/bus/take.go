package bus

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
)

// errorPause keeps a caller that takes again after a temporary error from doing
// so thousands of times a second.
const errorPause = time.Second

// Taker takes parts off the bus. Any number of takers, in any number of
// processes, share what is there: each waiting part goes to one of them. A Taker
// may be used from several goroutines and needs no closing.
type Taker struct {
	bus  *Bus
	from jetstream.Consumer
}

// NewTaker returns a taker. It asks the server once, for 5 s at most if ctx has
// no deadline.
func (b *Bus) NewTaker(ctx context.Context) (*Taker, error) {
	from, err := b.js.Consumer(ctx, readingsName, takerName)
	if missing(err) {
		if err = b.restore(ctx, err); err == nil {
			from, err = b.js.Consumer(ctx, readingsName, takerName)
		}
	}
	if err != nil {
		return nil, fmt.Errorf("make taker: %w", told(err))
	}
	return &Taker{bus: b, from: from}, nil
}

// Take returns up to most waiting parts in one go. When none waits it blocks up
// to wait for the first one, and takes what came with it; no deliveries and no
// error mean that none came.
//
// Each delivery is to be answered (Done, NotNow, NeverAgain) within
// Config.WorkTime of Take's return, or to be kept by StillWorking; else it is
// given out again. Nothing is fetched ahead: what Take has not returned is with
// no one. So take no more in one go than is worked off in that time.
//
// Order: parts come roughly as published, but parts given out again come later,
// also those of the same station, and other takers work at the same time.
//
// What was taken is always returned, even if ctx ended meanwhile: an error comes
// with no deliveries. Taking ends within a second of ctx; a part that comes at
// that very moment may only be given out again after WorkTime. A Temporary error
// is held back for a second, or wait if that is shorter, so that a caller may
// simply call again. Final are ErrClosed, ctx's own end, and what the server
// refuses (rights withdrawn, say).
func (t *Taker) Take(ctx context.Context, most int, wait time.Duration) ([]Delivery, error) {
	if most < 1 {
		return nil, fmt.Errorf("take: %d parts, not 1 or more", most)
	}
	waiting, cancel := context.WithTimeout(ctx, wait)
	defer cancel()
	ds, err := t.take(ctx, waiting, most)
	if err != nil && missing(err) {
		if err = t.bus.restore(ctx, err); err == nil {
			ds, err = t.take(ctx, waiting, most)
		}
	}
	if err == nil && len(ds) == 0 && !t.bus.Connected() {
		err = ErrUnreachable
	}
	switch {
	case len(ds) > 0:
		return ds, nil // an error beside them will show again
	case t.bus.closing():
		return nil, fmt.Errorf("take: %w", ErrClosed)
	case ctx.Err() != nil:
		return nil, context.Cause(ctx)
	case err == nil:
		return nil, nil
	}
	if err = told(err); Temporary(err) {
		pause := time.NewTimer(errorPause)
		defer pause.Stop()
		select {
		case <-pause.C:
		case <-waiting.Done():
		case <-t.bus.closed:
		}
	}
	return nil, fmt.Errorf("take: %w", err)
}

// take asks for what is there, or else waits for one and then asks for the rest.
// Asking for many with a wait would hold back the first until all are there.
func (t *Taker) take(ctx, waiting context.Context, most int) ([]Delivery, error) {
	if err := ctx.Err(); err != nil {
		return nil, err
	}
	ds, err := collect(t.from.FetchNoWait(most))
	if len(ds) > 0 || err != nil || waiting.Err() != nil {
		return ds, err
	}
	ds, err = collect(t.from.Fetch(1, jetstream.FetchContext(waiting)))
	if waiting.Err() != nil && (errors.Is(err, waiting.Err()) || errors.Is(err, jetstream.ErrInvalidOption)) {
		err = nil
	}
	if len(ds) == 0 || err != nil || most == 1 || ctx.Err() != nil {
		return ds, err
	}
	more, err := collect(t.from.FetchNoWait(most - 1))
	return append(ds, more...), err
}

// collect returns all messages of a request, whatever error ended it.
func collect(batch jetstream.MessageBatch, err error) ([]Delivery, error) {
	if err != nil {
		return nil, err
	}
	var ds []Delivery
	for m := range batch.Messages() {
		ds = append(ds, newDelivery(m))
	}
	if err := batch.Error(); err != nil && !errors.Is(err, nats.ErrTimeout) && !errors.Is(err, jetstream.ErrNoMessages) {
		return ds, err
	}
	return ds, nil
}

// Waiting returns how many parts are on the bus: not yet taken, in work, or put
// off. 0 means that it has been worked off. A done counts once the server has
// seen it, some milliseconds after it was said. It asks the server once, for 5 s
// at most if ctx has no deadline.
func (b *Bus) Waiting(ctx context.Context) (uint64, error) {
	s, err := b.js.Stream(ctx, readingsName)
	if missing(err) {
		if err = b.restore(ctx, err); err == nil {
			s, err = b.js.Stream(ctx, readingsName)
		}
	}
	if err != nil {
		return 0, fmt.Errorf("count waiting parts: %w", told(err))
	}
	return s.CachedInfo().State.Msgs, nil
}
