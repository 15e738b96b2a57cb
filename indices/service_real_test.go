package indices

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/goleak"
	"go.uber.org/zap"
	"go.uber.org/zap/zaptest/observer"

	"thawledger/pipeline"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// patience is how long a test waits for something that must come.
const patience = 30 * time.Second

func eventually(t testing.TB, what string, isTrue func() bool) {
	t.Helper()
	tick := time.NewTicker(5 * time.Millisecond)
	defer tick.Stop()
	deadline := time.Now().Add(patience)
	for !isTrue() {
		if <-tick.C; time.Now().After(deadline) {
			t.Fatalf("%s: not within %v", what, patience)
		}
	}
}

// served is a world with a bus, on which its service runs.
type served struct {
	*world
	bus   *bus.Bus
	nudge atomic.Int32
}

func newServed(t *testing.T) *served {
	t.Helper()
	w := &served{world: newWorld(t, fell)}
	b, err := bus.Open(t.Context(), bus.Config{Embedded: &bus.Embedded{Dir: t.TempDir()}})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := b.Close(context.WithoutCancel(t.Context())); err != nil {
			t.Error(err)
		}
	})
	taker, err := b.NewTaker(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	w.bus = b
	w.service.Taker, w.service.Workers, w.service.FailuresAllowed = taker, 2, 2
	w.service.Nudge = func() error { w.nudge.Add(1); return nil }
	return w
}

func (w *served) publish(t *testing.T, parts ...*pipeline.Part) {
	t.Helper()
	out := w.bus.NewPublisher()
	for _, p := range parts {
		if err := out.Publish(t.Context(), p); err != nil {
			t.Fatal(err)
		}
	}
	if err := out.Flush(t.Context()); err != nil {
		t.Fatal(err)
	}
}

func (w *served) waiting(t *testing.T) uint64 {
	t.Helper()
	n, err := w.bus.Waiting(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// run runs the service until the condition holds and ends it by its intake.
func (w *served) run(t *testing.T, what string, until func() bool) {
	t.Helper()
	intake, end := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- w.service.Run(intake, t.Context()) }()
	eventually(t, what, until)
	end()
	if err := <-ended; err != nil {
		t.Errorf("run ended with %v", err)
	}
}

func (w *served) one(t *testing.T, sql string) string {
	t.Helper()
	rows := w.Rows(t, sql)
	if len(rows) != 1 {
		t.Fatalf("%s: %v", sql, rows)
	}
	return strings.Trim(rows[0], `()"`)
}

const committed = `select count(*) from thaw.batch_parts where committed_at is not null`

var may = pipeline.DayOf(2030, time.May, 1)

// Parts come off the bus into the tables; one that comes again changes nothing;
// when the intake ends Run returns and leaves nothing running.
func TestRun(t *testing.T) {
	w := newServed(t)
	parts := w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 10)
	w.publish(t, parts...)
	before := goleak.IgnoreCurrent()
	w.run(t, "all committed and off the bus", func() bool { return w.one(t, committed) == "5" && w.waiting(t) == 0 })
	if err := goleak.Find(before); err != nil {
		t.Error(err)
	}
	if w.nudge.Load() == 0 {
		t.Error("the judge was not told")
	}
	const ledger = `select part, committed_at, readings_new, readings_changed, readings_unchanged, readings_repeated from thaw.batch_parts order by part`
	tables, lines, changes := w.fingerprint(t), w.Rows(t, ledger), w.one(t, `select count(*) from thaw.changes`)
	for _, p := range parts {
		p.Attempt = 2 // the same, published again
	}
	w.publish(t, parts...)
	w.run(t, "repeated parts off the bus", func() bool { return w.waiting(t) == 0 })
	if diff := cmp.Diff(tables, w.fingerprint(t)); diff != "" {
		t.Errorf("repeated parts changed tables: %s", diff)
	}
	if diff := cmp.Diff(lines, w.Rows(t, ledger)); diff != "" {
		t.Errorf("repeated parts changed the ledger: %s", diff)
	}
	if n := w.one(t, `select count(*) from thaw.changes`); n != changes {
		t.Errorf("%s changes to be judged, there were %s", n, changes)
	}
}

// What can never be committed is tried as often as is allowed and then given up
// with its reason; what came with it is committed.
func TestPartThatAlwaysFails(t *testing.T) {
	for _, tc := range []struct {
		name  string
		spoil func(t *testing.T, w *served, p *pipeline.Part)
		want  string
	}{
		{"station not in the settings", func(t *testing.T, w *served, p *pipeline.Part) {
			if err := pipelinetest.Exec(t.Context(), w.URL, `update thaw.batch_parts set station = 'SCAR' where part = 2`); err != nil {
				t.Fatal(err)
			}
			p.Station = "SCAR"
		}, "commit parts of station SCAR: station SCAR is not in the settings"},
		{"value that the table refuses", func(_ *testing.T, _ *served, p *pipeline.Part) { p.Readings[3].ValueC = 500 },
			"commit parts of station FELL: write readings of FELL: ERROR"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newServed(t)
			parts := w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 10)
			tc.spoil(t, w, parts[1])
			w.publish(t, parts...)
			w.run(t, "all off the bus", func() bool { return w.waiting(t) == 0 })
			got := w.Rows(t, `select part, committed_at is not null, stuck_at is not null, failures from thaw.batch_parts order by part`)
			if diff := cmp.Diff([]string{"(1,t,f,0)", "(2,f,t,2)", "(3,t,f,0)", "(4,t,f,0)", "(5,t,f,0)"}, got); diff != "" {
				t.Error(diff)
			}
			if reason := w.one(t, `select reason from thaw.batch_parts where part = 2`); !strings.HasPrefix(reason, tc.want) {
				t.Errorf("reason %q, want %q", reason, tc.want)
			}
			if n := w.one(t, `select count(*) from thaw.readings`); n != "40" {
				t.Errorf("%s readings, want those of four parts", n)
			}
		})
	}
}

func TestPartNotInLedger(t *testing.T) {
	w := newServed(t)
	parts := w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 500)
	stray := *parts[0]
	stray.Batch = 99
	elsewhere := *parts[0]
	elsewhere.Station, elsewhere.Attempt = "TARN", 2 // the ledger has the part for another station
	w.publish(t, &stray, &elsewhere)
	core, seen := observer.New(zap.ErrorLevel)
	w.service.Log = zap.New(core)
	w.run(t, "both off the bus", func() bool { return w.waiting(t) == 0 })
	if n := seen.FilterMessage("part is not in the ledger").Len(); n != 2 || n != seen.Len() {
		t.Errorf("of %d faults told %d are of parts that are not in the ledger, want 2", seen.Len(), n)
	}
	if got := w.one(t, `select count(*), sum(failures) from thaw.batch_parts where committed_at is null`); got != "1,0" {
		t.Errorf("open parts and failures %s, want the one that has not come, with none", got)
	}
	if got := w.one(t, `select count(*) from thaw.readings`); got != "0" {
		t.Errorf("%s readings of unknown parts", got)
	}
}

// spoiling gives out the first delivery as one that cannot be read.
type spoiling struct {
	Taker
	done bool
}

func (s *spoiling) Take(ctx context.Context, most int, wait time.Duration) ([]bus.Delivery, error) {
	ds, err := s.Taker.Take(ctx, most, wait)
	if len(ds) > 0 && !s.done {
		s.done = true
		ds[0].Part, ds[0].Err = nil, bus.ErrChecksum
	}
	return ds, err
}

// A message that cannot be read leaves the bus; its part stays open in the ledger.
func TestUnreadableMessage(t *testing.T) {
	w := newServed(t)
	w.service.Taker = &spoiling{Taker: w.service.Taker}
	w.publish(t, w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 25)...)
	w.run(t, "all off the bus", func() bool { return w.waiting(t) == 0 })
	got := w.one(t, `select count(*) filter (where committed_at is null), count(*) filter (where stuck_at is not null or failures > 0) from thaw.batch_parts`)
	if got != "1,0" {
		t.Errorf("open and failed parts %s, want one open", got)
	}
}

// refusing fails a few times before it lets parts through.
type refusing struct {
	Taker
	with  error
	times atomic.Int32
}

func (r *refusing) Take(ctx context.Context, most int, wait time.Duration) ([]bus.Delivery, error) {
	if r.times.Add(-1) >= 0 {
		return nil, r.with
	}
	return r.Taker.Take(ctx, most, wait)
}

// Trouble that passes is waited for; trouble that does not ends Run at once, so
// that the process is not left running without its intake.
func TestTroubleTaking(t *testing.T) {
	w := newServed(t)
	r := &refusing{Taker: w.service.Taker, with: fmt.Errorf("take: %w", bus.ErrUnreachable)}
	r.times.Store(3)
	w.service.Taker = r
	w.publish(t, w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 500)...)
	w.run(t, "taken once the bus is back", func() bool { return w.one(t, committed) == "1" })

	before := goleak.IgnoreCurrent()
	final := errors.New("rights withdrawn")
	r.with = final
	r.times.Store(1)
	intake, cancel := context.WithTimeout(t.Context(), patience)
	defer cancel()
	if err := w.service.Run(intake, t.Context()); !errors.Is(err, final) || intake.Err() != nil {
		t.Errorf("run ended with %v, intake %v; want %v while the intake goes on", err, intake.Err(), final)
	}
	if err := goleak.Find(before); err != nil {
		t.Error(err)
	}
}

// While another worker has the station in hand its parts are put off, not failed.
func TestStationInWorkElsewhere(t *testing.T) {
	w := newServed(t)
	has, let, done := make(chan bool), make(chan bool), make(chan error, 1)
	go func() {
		done <- w.TakeStation(t.Context(), "FELL", func(*store.Take) error { close(has); <-let; return nil })
	}()
	<-has
	w.publish(t, w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 500)...)
	counting := &again{Taker: w.service.Taker}
	w.service.Taker = counting
	released := false
	w.run(t, "committed once the other is done", func() bool {
		if counting.most.Load() >= 2 && !released { // given out a second time: it was put off
			released = true
			close(let)
		}
		return w.one(t, committed) == "1"
	})
	if err := <-done; err != nil {
		t.Error(err)
	}
	if n := w.one(t, `select failures from thaw.batch_parts`); n != "0" {
		t.Errorf("%s failures, want none", n)
	}
}

// again notes how often a part was given out.
type again struct {
	Taker
	most atomic.Uint64
}

func (a *again) Take(ctx context.Context, most int, wait time.Duration) ([]bus.Delivery, error) {
	ds, err := a.Taker.Take(ctx, most, wait)
	for _, d := range ds {
		a.most.Store(max(a.most.Load(), d.Deliveries))
	}
	return ds, err
}

// Ended in the middle, Run gives back what it has not worked off.
func TestRunEndedInTheMiddle(t *testing.T) {
	w := newServed(t)
	w.service.CommitReadings, w.service.Workers = 1, 1
	parts := w.open(t, "fell", 1, delivery{"file", days(may, 1, wave(2, 8, 200, 0)...)}, 4)
	w.publish(t, parts...)
	intake, end := context.WithCancel(t.Context())
	defer end()
	returned := make(chan bool)
	w.service.Nudge = func() error {
		if w.nudge.Add(1) == 3 {
			end()
			select {
			case <-returned:
				t.Error("Run has returned with parts in hand")
			case <-time.After(100 * time.Millisecond):
			}
		}
		return nil
	}
	if err := w.service.Run(intake, t.Context()); err != nil {
		t.Fatal(err)
	}
	close(returned)
	n := w.one(t, committed)
	if n == fmt.Sprint(len(parts)) || n == "0" {
		t.Fatalf("%s of %d committed, want some", n, len(parts))
	}
	eventually(t, "the rest on the bus", func() bool {
		return fmt.Sprint(uint64(len(parts))-w.waiting(t)) == n
	})
	w.service.CommitReadings = 50000
	w.run(t, "all committed", func() bool { return w.one(t, committed) == fmt.Sprint(len(parts)) && w.waiting(t) == 0 })
	whole := newWorld(t, fell)
	whole.take(t, whole.open(t, "fell", 1, delivery{"file", days(may, 1, wave(2, 8, 200, 0)...)}, 4)...)
	if diff := cmp.Diff(whole.fingerprint(t), w.fingerprint(t)); diff != "" {
		t.Error(diff)
	}
}

// A station whose rules have changed is made anew by Run itself.
func TestRunMakesAnew(t *testing.T) {
	w := newServed(t)
	w.take(t, w.open(t, "fell", 1, delivery{"file", days(may, 1, thawHand...)}, 500)...)
	st := fell
	st.BaseC = 2
	if err := w.State(t.Context(), store.Stated{Hash: "h", Stations: []pipeline.Station{st}}); err != nil {
		t.Fatal(err)
	}
	w.run(t, "made anew", func() bool { return w.one(t, `select recompute or reindex from thaw.stations`) == "f" })
	if got := w.one(t, `select distinct base_c from thaw.air_index_season`); got != "2" || w.nudge.Load() == 0 {
		t.Errorf("base %s, want 2; told %d times", got, w.nudge.Load())
	}
}
