package bus

import (
	"context"
	"errors"
	"strings"
	"testing"
	"time"

	"github.com/nats-io/nats.go"
)

func TestNotNow(t *testing.T) {
	for _, c := range []struct {
		name  string
		delay time.Duration
	}{{"at once", 0}, {"later", 50 * time.Millisecond}} {
		t.Run(c.name, func(t *testing.T) {
			b := open(t, Config{})
			publish(t, b, part(1, 1, 1))
			k := taker(t, b)
			for i := range uint64(3) {
				d := take(t, k, 1)[0]
				if d.Deliveries != i+1 {
					t.Fatalf("delivery %d says %d", i+1, d.Deliveries)
				}
				if err := d.NotNow(c.delay); err != nil {
					t.Fatal(err)
				}
			}
			if n := waiting(t, b); n != 1 {
				t.Errorf("%d waiting, want 1", n)
			}
		})
	}
}

func TestNotNowWaitsForDelay(t *testing.T) {
	b := open(t, Config{})
	publish(t, b, part(1, 1, 1))
	k := taker(t, b)
	if err := take(t, k, 1)[0].NotNow(time.Hour); err != nil {
		t.Fatal(err)
	}
	none(t, k)
	if n := waiting(t, b); n != 1 {
		t.Errorf("%d waiting, want the one put off", n)
	}
}

func TestNeverAgain(t *testing.T) {
	for _, c := range []struct{ name, reason string }{
		{"reason", "three takers\r\nfailed"}, {"none", ""}, {"long", strings.Repeat("é", 400)}, {"no text", "\xff\xfe"},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := open(t, Config{WorkTime: time.Second})
			publish(t, b, part(1, 1, 1))
			k := taker(t, b)
			if err := take(t, k, 1)[0].NeverAgain(c.reason); err != nil {
				t.Fatal(err)
			}
			emptied(t, b)
			none(t, k)
		})
	}
}

// A part that is not answered comes again after the work time, unless its taker
// says that it is still at it.
func TestWorkTime(t *testing.T) {
	b := open(t, Config{WorkTime: time.Second})
	publish(t, b, part(1, 1, 1), part(2, 1, 1))
	k := taker(t, b)
	held := take(t, k, 2)
	var again []Delivery
	eventually(t, "the silent one comes again", func() bool {
		if err := held[0].StillWorking(); err != nil {
			t.Fatal(err)
		}
		ds, err := k.Take(t.Context(), 5, 50*time.Millisecond)
		if err != nil {
			t.Fatal(err)
		}
		again = append(again, ds...)
		return len(again) > 0
	})
	if len(again) != 1 || again[0].ID != held[1].ID || again[0].Deliveries != 2 {
		t.Errorf("came again: %v", again)
	}
	if err := held[1].DoneConfirmed(within(t, patience)); err != nil { // late, and accepted
		t.Error(err)
	}
	if n := waiting(t, b); n != 1 {
		t.Errorf("%d waiting, want 1", n)
	}
}

// The first part to come is not held back until as many are there as asked for.
func TestTakeReturnsWhatIsThere(t *testing.T) {
	b := open(t, Config{})
	k := taker(t, b)
	took := make(chan []Delivery, 1)
	go func() {
		ds, err := k.Take(t.Context(), 100, time.Hour)
		if err != nil {
			t.Error(err)
		}
		took <- ds
	}()
	publish(t, b, part(1, 1, 1))
	select {
	case ds := <-took:
		if len(ds) != 1 {
			t.Errorf("took %d", len(ds))
		}
	case <-time.After(patience):
		t.Fatal("take holds the first part back")
	}
	publish(t, b, part(2, 1, 1), part(3, 1, 1), part(4, 1, 1))
	if ds, err := k.Take(t.Context(), 2, time.Hour); err != nil || len(ds) != 2 {
		t.Errorf("took %d of 3 waiting, asked for 2: %v", len(ds), err)
	}
	if ds, err := k.Take(t.Context(), 0, time.Hour); err == nil || ds != nil {
		t.Errorf("asked for 0: %v, %v", ds, err)
	}
}

func TestTakeEnds(t *testing.T) {
	b := open(t, Config{})
	k := taker(t, b)
	ctx, cancel := context.WithCancelCause(t.Context())
	stop := errors.New("soft stop")
	ended := make(chan error, 1)
	go func() {
		_, err := k.Take(ctx, 10, time.Hour)
		ended <- err
	}()
	cancel(stop)
	if err := <-ended; !errors.Is(err, stop) {
		t.Errorf("ended with %v", err)
	}
	if ds, err := k.Take(t.Context(), 10, time.Millisecond); err != nil || ds != nil {
		t.Errorf("empty bus: %v, %v", ds, err)
	}
	go func() {
		_, err := k.Take(t.Context(), 10, time.Hour)
		ended <- err
	}()
	shut(t, b)
	if err := <-ended; !errors.Is(err, ErrClosed) || Temporary(err) {
		t.Errorf("closed bus: %v", err)
	}
}

// What other hands deleted is made again, and what is still there given out.
func TestTakeRestores(t *testing.T) {
	b := open(t, Config{})
	publish(t, b, part(1, 1, 1))
	k := taker(t, b)
	if err := b.js.DeleteConsumer(within(t, patience), readingsName, takerName); err != nil {
		t.Fatal(err)
	}
	if d := take(t, k, 1)[0]; d.ID.Number != 1 {
		t.Errorf("took %v", d.ID)
	}
	if b.Restored() != 1 {
		t.Errorf("restored %d, want 1", b.Restored())
	}
	took := make(chan error, 1)
	go func() {
		var ds []Delivery
		err := ErrUnreachable
		for Temporary(err) && !t.Failed() { // the server reports the deletion before it is through with it
			ds, err = k.Take(t.Context(), 1, time.Hour)
		}
		if err == nil && len(ds) != 1 {
			err = errors.New("nothing taken")
		}
		took <- err
	}()
	eventually(t, "taker waits", func() bool {
		info, err := k.from.Info(within(t, patience))
		return err == nil && info.NumWaiting == 1
	})
	if err := b.js.DeleteStream(within(t, patience), readingsName); err != nil {
		t.Fatal(err)
	}
	eventually(t, "all made again", func() bool { return b.Restored() >= 3 })
	publish(t, b, part(2, 1, 1))
	if err := <-took; err != nil {
		t.Error(err)
	}
}

// A message that holds no part is told as such, named by its header lines.
func TestSpoiledMessage(t *testing.T) {
	body, err := Encode(nil, part(3, 2, 1))
	if err != nil {
		t.Fatal(err)
	}
	header := func(batch, station string) nats.Header {
		return nats.Header{batchHeader: {batch}, numberHeader: {"3"}, attemptHeader: {"2"}, stationHeader: {station}}
	}
	const station = "upper bench.2"
	token, err := token("station", station)
	if err != nil {
		t.Fatal(err)
	}
	id := PartID{7, 3, 2}
	flipped := append([]byte(nil), body...)
	flipped[len(flipped)/2] ^= 1
	for _, c := range []struct {
		name    string
		header  nats.Header
		body    []byte
		err     error
		id      PartID
		station string
	}{
		{"good", header("7", token), body, nil, id, station},
		{"no header", nil, body, nil, id, station},
		{"header of no use", header("seven", token), body, nil, id, station},
		{"flipped bit", header("7", token), flipped, ErrChecksum, id, station},
		{"no body", header("7", token), nil, ErrTruncated, id, station},
		{"neither", nil, []byte("hello"), ErrNotPart, PartID{}, ""},
		{"other batch", header("8", token), body, ErrMismatch, PartID{8, 3, 2}, station},
		{"other station", header("7", "lower"), body, ErrMismatch, id, "lower"},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := open(t, Config{})
			m := &nats.Msg{Subject: readingsSubject + "x", Header: c.header, Data: c.body}
			if _, err := b.js.PublishMsg(within(t, patience), m); err != nil {
				t.Fatal(err)
			}
			d := take(t, taker(t, b), 1)[0]
			if !errors.Is(d.Err, c.err) || (d.Part == nil) != (c.err != nil) || d.ID != c.id || d.Station != c.station || string(d.Body) != string(c.body) {
				t.Errorf("%v, part %v, id %v of %q", d.Err, d.Part, d.ID, d.Station)
			}
			if err := d.NeverAgain("cannot be read"); err != nil {
				t.Error(err)
			}
			emptied(t, b)
		})
	}
}
