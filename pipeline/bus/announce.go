package bus

import (
	"context"
	"errors"
	"fmt"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
)

// Announce tells subscribers about a surface, on the subject
// thawledger.standing.<site>.<surface>. In these names letters, digits, - and _
// stand for themselves; every other byte is written as % and two hexadecimal
// digits. It is kept for 90 days.
//
// It blocks until the server has it on disk or ctx is over, or for 5 s if ctx has
// no deadline. The same id again within two minutes is dropped by the server, and
// is no error; so repeat a failed call with the same id.
func (b *Bus) Announce(ctx context.Context, site, surface, id string, payload []byte) error {
	err := b.announce(ctx, site, surface, id, payload)
	if missing(err) {
		if err = b.restore(ctx, err); err == nil {
			err = b.announce(ctx, site, surface, id, payload)
		}
	}
	if err != nil {
		return fmt.Errorf("announce %q for %q of %q: %w", id, surface, site, told(err))
	}
	return nil
}

func (b *Bus) announce(ctx context.Context, site, surface, id string, payload []byte) error {
	siteToken, err := token("site", site)
	if err != nil {
		return err
	}
	surfaceToken, err := token("surface", surface)
	if err != nil {
		return err
	}
	if id == "" {
		return errors.New("no id")
	}
	if len(payload) > MaxEncodedBytes {
		return fmt.Errorf("%w: %d bytes, at most %d", ErrTooLong, len(payload), MaxEncodedBytes)
	}
	msg := &nats.Msg{Subject: standingSubject + siteToken + "." + surfaceToken, Data: payload}
	_, err = b.js.PublishMsg(ctx, msg, jetstream.WithMsgID(id))
	return err
}

// Nudge tells every process on the bus that something changed in the store, so
// that it need not wait for its next look. It is not kept and may get lost:
// whoever listens must also look by itself from time to time. It does not block.
func (b *Bus) Nudge() error {
	if err := b.conn.Publish(changedSubject, nil); err != nil {
		return fmt.Errorf("nudge: %w", told(err))
	}
	return nil
}

// Nudges returns a channel that holds one value when there was at least one nudge
// since it was last read, from this process or another. It is closed when ctx is
// over or the bus is closed. It blocks, for 5 s at most, until the server knows
// of the listener: what is sent from then on is heard. Nudges sent while the
// server is out of reach are lost.
func (b *Bus) Nudges(ctx context.Context) (<-chan struct{}, error) {
	nudges := make(chan struct{}, 1)
	s, err := b.conn.Subscribe(changedSubject, func(*nats.Msg) {
		select {
		case nudges <- struct{}{}:
		default:
		}
	})
	if err != nil {
		return nil, fmt.Errorf("listen for nudges: %w", told(err))
	}
	s.SetClosedHandler(func(string) { close(nudges) })     // called when no more can come
	context.AfterFunc(ctx, func() { _ = s.Unsubscribe() }) // fails only when the bus is closed
	flush, cancel := context.WithTimeout(ctx, connectTimeout)
	defer cancel()
	if err := b.conn.FlushWithContext(flush); err != nil {
		_ = s.Unsubscribe()
		return nil, fmt.Errorf("listen for nudges: %w", told(err))
	}
	return nudges, nil
}
