package bus

import (
	"context"
	"errors"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/goleak"

	"thawledger/pipeline"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// patience is how long a test waits for something that must come.
const patience = 20 * time.Second

// open opens a bus and closes it at the end of the test, unless it is closed by
// then. Without a server it gets an embedded one in a folder of its own.
func open(t *testing.T, c Config) *Bus {
	t.Helper()
	if c.URL == "" && c.Embedded == nil {
		c.Embedded = &Embedded{Dir: t.TempDir()}
	}
	b, err := Open(within(t, patience), c)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { shut(t, b) })
	return b
}

func shut(t *testing.T, b *Bus) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.WithoutCancel(t.Context()), patience)
	defer cancel()
	if err := b.Close(ctx); err != nil {
		t.Error(err)
	}
}

func within(t *testing.T, d time.Duration) context.Context {
	ctx, cancel := context.WithTimeout(t.Context(), d)
	t.Cleanup(cancel)
	return ctx
}

// eventually waits for a condition, and fails the test if it does not come true.
func eventually(t *testing.T, what string, isTrue func() bool) {
	t.Helper()
	tick := time.NewTicker(5 * time.Millisecond)
	defer tick.Stop()
	ctx := within(t, patience)
	for !isTrue() {
		select {
		case <-tick.C:
		case <-ctx.Done():
			t.Fatalf("%s: not within %v", what, patience)
		}
	}
}

// part makes up a part with its number in its values.
func part(number, attempt int32, readings int) *pipeline.Part {
	p := &pipeline.Part{
		Batch: 7, Number: number, Attempt: attempt, Feed: "airstrips", Station: "upper bench.2",
		Series: []pipeline.Series{{Sensor: "t1", Variable: pipeline.AirTempMean, LevelM: 2, SpanS: 3600}},
	}
	for i := range readings {
		p.Readings = append(p.Readings, pipeline.Reading{
			Row: int32(i + 1), StartS: int64(number)*1e6 + int64(i)*3600, ValueC: float64(i%400)/10 - 20,
		})
	}
	return p
}

func publish(t *testing.T, b *Bus, parts ...*pipeline.Part) {
	t.Helper()
	pub := b.NewPublisher()
	for _, p := range parts {
		if err := pub.Publish(within(t, patience), p); err != nil {
			t.Fatal(err)
		}
	}
	if err := pub.Flush(within(t, patience)); err != nil {
		t.Fatal(err)
	}
}

func taker(t *testing.T, b *Bus) *Taker {
	t.Helper()
	k, err := b.NewTaker(within(t, patience))
	if err != nil {
		t.Fatal(err)
	}
	return k
}

// take takes n deliveries, in as many goes as it needs.
func take(t *testing.T, k *Taker, n int) []Delivery {
	t.Helper()
	var all []Delivery
	ctx := within(t, patience)
	for len(all) < n {
		ds, err := k.Take(ctx, n-len(all), time.Second)
		if err != nil {
			t.Fatalf("took %d of %d: %v", len(all), n, err)
		}
		all = append(all, ds...)
	}
	return all
}

// none checks that nothing is given out just now.
func none(t *testing.T, k *Taker) {
	t.Helper()
	ds, err := k.Take(within(t, patience), 10, 0)
	if err != nil || len(ds) > 0 {
		t.Fatalf("took %d (%v), want none", len(ds), err)
	}
}

func emptied(t *testing.T, b *Bus) {
	t.Helper()
	eventually(t, "no part on the bus", func() bool { return waiting(t, b) == 0 })
}

func waiting(t *testing.T, b *Bus) uint64 {
	t.Helper()
	n, err := b.Waiting(within(t, patience))
	if err != nil {
		t.Fatal(err)
	}
	return n
}

func TestPublishTakeDone(t *testing.T) {
	b := open(t, Config{})
	var want []*pipeline.Part
	for n := range int32(300) { // more than may be outstanding
		want = append(want, part(n+1, 1, 3))
	}
	publish(t, b, want...)
	if n := waiting(t, b); n != 300 {
		t.Fatalf("%d waiting, want 300", n)
	}
	got := take(t, taker(t, b), 300)
	for i := range got {
		if diff := cmp.Diff(want[i], got[i].Part); diff != "" || got[i].Err != nil || got[i].Deliveries != 1 {
			t.Fatalf("delivery %d, %d times, %v: %s", i, got[i].Deliveries, got[i].Err, diff)
		}
		if err := got[i].Done(); err != nil {
			t.Fatal(err)
		}
	}
	emptied(t, b)
	if err := got[0].Done(); err == nil {
		t.Error("a second answer is no error")
	}
	if b.Restored() != 0 || !b.Connected() || b.URL() != "" {
		t.Errorf("restored %d, connected %v, url %q", b.Restored(), b.Connected(), b.URL())
	}
}

// What is not done survives a restart on the same folder and is given out again.
func TestRestart(t *testing.T) {
	c := Config{Embedded: &Embedded{Dir: t.TempDir()}, WorkTime: time.Second}
	b := open(t, c)
	publish(t, b, part(1, 1, 1), part(2, 1, 1), part(3, 1, 1))
	ds := take(t, taker(t, b), 2) // the third is never taken
	if err := ds[0].DoneConfirmed(within(t, patience)); err != nil {
		t.Fatal(err)
	}
	shut(t, b)
	if err := ds[1].Done(); !errors.Is(err, ErrClosed) {
		t.Errorf("done on a closed bus: %v", err)
	}
	b = open(t, c)
	seen := map[int32]uint64{}
	for _, d := range take(t, taker(t, b), 2) {
		seen[d.ID.Number] = d.Deliveries
		if err := d.Done(); err != nil {
			t.Error(err)
		}
	}
	if diff := cmp.Diff(map[int32]uint64{2: 2, 3: 1}, seen); diff != "" {
		t.Error(diff)
	}
	emptied(t, b)
}

// Open changes what an earlier program version set up otherwise.
func TestOpenBringsIntoLine(t *testing.T) {
	dir := t.TempDir()
	b := open(t, Config{Embedded: &Embedded{Dir: dir}, MaxBytes: 8 << 20})
	publish(t, b, part(1, 1, 1))
	shut(t, b)
	b = open(t, Config{Embedded: &Embedded{Dir: dir}, MaxBytes: 4 << 20, WorkTime: 5 * time.Second})
	s, err := b.js.Stream(within(t, patience), readingsName)
	if err != nil {
		t.Fatal(err)
	}
	k, err := s.Consumer(within(t, patience), takerName)
	if err != nil {
		t.Fatal(err)
	}
	if max, work := s.CachedInfo().Config.MaxBytes, k.CachedInfo().Config.AckWait; max != 4<<20 || work != 5*time.Second {
		t.Errorf("room %d, work time %v", max, work)
	}
	if d := take(t, taker(t, b), 1); d[0].ID.Number != 1 || b.Restored() != 0 {
		t.Errorf("took %v, restored %d", d[0].ID, b.Restored())
	}
}

// What a test cannot bring about: a power failure, and an hour without a server.
func TestDurableAndPatient(t *testing.T) {
	b := open(t, Config{})
	if c := b.server.JetStreamConfig(); !c.SyncAlways {
		t.Error("the embedded server answers before it syncs")
	}
	if n := b.conn.Opts.MaxReconnect; n >= 0 {
		t.Errorf("the client gives up for good after %d tries", n)
	}
	if c := b.taker(); c.MaxDeliver != -1 || c.MaxAckPending != maxInWork {
		t.Errorf("given out %d times at most, %d at a time", c.MaxDeliver, c.MaxAckPending)
	}
}
