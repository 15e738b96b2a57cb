package bus

import (
	"context"
	"errors"
	"math"
	"strings"
	"sync"
	"testing"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
)

func TestSameIDIsDropped(t *testing.T) {
	b := open(t, Config{})
	publish(t, b, part(1, 1, 1))
	publish(t, b, part(1, 1, 1))
	if n := waiting(t, b); n != 1 {
		t.Errorf("%d waiting after the same attempt twice, want 1", n)
	}
	publish(t, b, part(1, 2, 1))
	if n := waiting(t, b); n != 2 {
		t.Errorf("%d waiting after a new attempt, want 2", n)
	}
}

// A full bus refuses new parts and keeps the old ones.
func TestFull(t *testing.T) {
	b := open(t, Config{MaxBytes: 1 << 20})
	pub := b.NewPublisher()
	var n int32
	var err error
	for err == nil && n < 1000 {
		n++
		if err = pub.Publish(within(t, patience), part(n, 1, MaxReadings)); err == nil {
			err = pub.Flush(within(t, patience))
		}
	}
	var failed *PublishError
	if !errors.Is(err, ErrFull) || !Temporary(err) || !errors.As(err, &failed) || len(failed.Parts) != 1 || failed.Parts[0].Number != n {
		t.Fatalf("part %d: %v", n, err)
	}
	if w := waiting(t, b); w != uint64(n-1) {
		t.Errorf("%d waiting, %d were published", w, n-1)
	}
	d := take(t, taker(t, b), 1)
	if d[0].ID.Number != 1 {
		t.Errorf("first is %v", d[0].ID)
	}
	if err := d[0].DoneConfirmed(within(t, patience)); err != nil {
		t.Fatal(err)
	}
	publish(t, b, part(n, 2, MaxReadings)) // there is room again
}

// One failure stops the rest, and Flush names all that are not on the bus.
func TestPublisherTellsFailedParts(t *testing.T) {
	b := open(t, Config{})
	pub := b.NewPublisher()
	bad := part(2, 1, 1)
	bad.Readings[0].ValueC = math.NaN()
	good := pub.Publish(t.Context(), part(1, 1, 1))
	err := pub.Publish(t.Context(), bad)
	after := pub.Publish(t.Context(), part(3, 1, 1))
	if good != nil || !errors.Is(err, ErrNotFinite) || Temporary(err) || !errors.Is(after, ErrNotFinite) {
		t.Fatalf("%v; %v; %v", good, err, after)
	}
	err = pub.Flush(t.Context())
	var failed *PublishError
	if !errors.As(err, &failed) || !errors.Is(err, ErrNotFinite) || len(failed.Parts) != 2 ||
		failed.Parts[0].Number != 2 || failed.Parts[1].Number != 3 {
		t.Fatalf("flush: %v", err)
	}
	if want := "publish part 7/2/1 and 1 more: "; !strings.HasPrefix(err.Error(), want) {
		t.Errorf("%q does not begin with %q", err, want)
	}
	if n := waiting(t, b); n != 1 {
		t.Errorf("%d waiting, want 1", n)
	}
	if err := pub.Flush(t.Context()); err != nil {
		t.Errorf("second flush: %v", err)
	}
	publish(t, b, part(2, 2, 1))
}

// Closing the bus ends waiting publishers.
func TestCloseEndsPublishers(t *testing.T) {
	b := open(t, Config{})
	for range maxOutstanding {
		b.slots <- struct{}{} // all places taken by parts that nobody answers for
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if err := b.NewPublisher().Publish(ctx, part(1, 1, 1)); !errors.Is(err, context.Canceled) {
		t.Errorf("with no place and ctx over: %v", err)
	}
	pub := b.NewPublisher()
	unanswered := &sent{by: pub, id: PartID{7, 9, 1}}
	pub.open[unanswered] = struct{}{}
	b.sent[&nats.Msg{}] = unanswered
	var wait sync.WaitGroup
	for range 3 {
		wait.Go(func() {
			if err := b.NewPublisher().Publish(t.Context(), part(1, 1, 1)); !errors.Is(err, ErrClosed) {
				t.Errorf("publish: %v", err)
			}
		})
	}
	wait.Go(func() {
		if err := pub.Flush(t.Context()); !errors.Is(err, ErrClosed) {
			t.Errorf("flush: %v", err)
		}
	})
	shut(t, b)
	wait.Wait()
}

func TestPublishManyAtATime(t *testing.T) {
	b := open(t, Config{})
	var wait sync.WaitGroup
	for g := range int32(4) {
		wait.Go(func() {
			pub := b.NewPublisher()
			for n := range int32(100) {
				if err := pub.Publish(within(t, patience), part(g*100+n+1, 1, 1)); err != nil {
					t.Error(err)
				}
			}
			if err := pub.Flush(within(t, patience)); err != nil {
				t.Error(err)
			}
		})
	}
	wait.Wait()
	if n := waiting(t, b); n != 400 || len(b.slots) != 0 || len(b.sent) != 0 {
		t.Errorf("%d waiting, want 400; %d places taken, %d unanswered", n, len(b.slots), len(b.sent))
	}
}

// What other hands deleted is made again by the first flush that finds out.
func TestPublishRestores(t *testing.T) {
	b := open(t, Config{})
	if err := b.js.DeleteStream(within(t, patience), readingsName); err != nil {
		t.Fatal(err)
	}
	pub := b.NewPublisher()
	if err := pub.Publish(within(t, patience), part(1, 1, 1)); err != nil {
		t.Fatal(err)
	}
	if err := pub.Flush(within(t, patience)); !Temporary(err) || !errors.Is(err, jetstream.ErrNoStreamResponse) {
		t.Fatalf("flush: %v", err)
	}
	if b.Restored() != 2 { // the parts' place and the takers' record
		t.Errorf("restored %d, want 2", b.Restored())
	}
	publish(t, b, part(1, 2, 1))
	if d := take(t, taker(t, b), 1); d[0].ID.Attempt != 2 {
		t.Errorf("took %v", d[0].ID)
	}
}
