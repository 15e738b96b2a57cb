package alerts

import (
	"context"
	"errors"
	"strings"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
	"go.uber.org/zap/zaptest/observer"

	"thawledger/pipeline"
)

// running is a service at work.
type running struct {
	cancel context.CancelFunc
	done   chan error
}

func run(t *testing.T, s *Service) *running {
	t.Helper()
	ctx, cancel := context.WithCancel(t.Context())
	r := &running{cancel: cancel, done: make(chan error, 1)}
	go func() { r.done <- s.Run(ctx) }()
	return r
}

// stop ends the service and waits until it has ended.
func (r *running) stop(t *testing.T) {
	t.Helper()
	r.cancel()
	select {
	case err := <-r.done:
		if err != nil {
			t.Errorf("run: %v", err)
		}
	case <-time.After(patience):
		t.Errorf("still running after %v", patience)
	}
}

// twoStations states a site on each station, both past their design values.
func twoStations(t *testing.T) *world {
	t.Helper()
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))), pipeline.Site{ID: "pad", Station: "TARN", Surfaces: []pipeline.Surface{surface("berm", thaw(100))}})
	w.pass(t)
	for _, id := range []string{"FELL", "TARN"} {
		w.set(t, id, pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	}
	return w
}

const waiting = `select station from thaw.changes order by change_id`

// A station that another process is judging is left to it; the others are judged.
func TestStationHeldByAnother(t *testing.T) {
	w := twoStations(t)
	tx, err := w.conn.Begin(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	// The lock's two numbers are those that processes of all versions agree on.
	if _, err := tx.Exec(t.Context(), `select pg_advisory_xact_lock(x'74680004'::int, hashtext('station FELL'))`); err != nil {
		t.Fatal(err)
	}
	w.pass(t)
	same(t, "waiting", w.Rows(t, waiting), []string{"(FELL)"})
	same(t, "told", w.heard(), []string{"berm -> exceeded, first judgement"})
	if err := tx.Rollback(t.Context()); err != nil {
		t.Fatal(err)
	}
	w.pass(t)
	same(t, "waiting", w.Rows(t, waiting), nil)
	same(t, "told", w.heard(), []string{"apron -> exceeded, first judgement"})
}

// A station that cannot be judged keeps its line, leaves nothing half done, and
// does not hold up the others.
func TestStationThatFails(t *testing.T) {
	w := twoStations(t)
	w.exec(t, `create function fail() returns trigger language plpgsql as 'begin raise exception ''no room''; end'`)
	w.exec(t, `create trigger fail before insert on thaw.standing_changes for each row when (new.site = 'strip') execute function fail()`)
	err := w.service.Pass(t.Context())
	if err == nil || !strings.Contains(err.Error(), "judge surfaces on station FELL") || !strings.Contains(err.Error(), "no room") {
		t.Errorf("pass: %v", err)
	}
	same(t, "waiting", w.Rows(t, waiting), []string{"(FELL)"})
	same(t, "standings", w.Rows(t, `select site from thaw.standings union all select site from thaw.exceedances`), []string{"(pad)", "(pad)"})
	same(t, "told", w.heard(), []string{"berm -> exceeded, first judgement"})
	w.exec(t, `drop trigger fail on thaw.standing_changes`)
	w.pass(t)
	same(t, "waiting", w.Rows(t, waiting), nil)
	same(t, "told", w.heard(), []string{"apron -> exceeded, first judgement"})
}

// A line that comes while its station is being judged is worked off later.
func TestChangeWhileJudging(t *testing.T) {
	w := twoStations(t)
	tx, err := w.conn.Begin(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	defer func() { _ = tx.Rollback(context.WithoutCancel(t.Context())) }()
	if _, err := tx.Exec(t.Context(), `lock table thaw.standings in access exclusive mode`); err != nil {
		t.Fatal(err)
	}
	done := make(chan error, 1)
	go func() { done <- w.service.Pass(t.Context()) }()
	eventually(t, "judging waits for the table", func() bool {
		return len(w.Rows(t, `select pid from pg_locks where not granted and relation = 'thaw.standings'::regclass`)) == 1
	})
	other, err := pgx.Connect(t.Context(), w.URL)
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close(context.WithoutCancel(t.Context()))
	if _, err := other.Exec(t.Context(), `insert into thaw.changes (station, from_day) values ('FELL', '2031-06-20')`); err != nil {
		t.Fatal(err)
	}
	if err := tx.Rollback(t.Context()); err != nil {
		t.Fatal(err)
	}
	if err := <-done; err != nil {
		t.Fatal(err)
	}
	same(t, "waiting", w.Rows(t, waiting), []string{"(FELL)"})
	w.pass(t)
	same(t, "waiting", w.Rows(t, waiting), nil)
}

// Two services may work on one store: each change is recorded once, and what is
// told twice has one id.
func TestTwoAtWork(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))), pipeline.Site{ID: "pad", Station: "TARN", Surfaces: []pipeline.Surface{surface("berm", thaw(100))}})
	other := *w.service
	for _, cDays := range []float64{50, 95, 105, 92, 30, 110} {
		for _, id := range []string{"FELL", "TARN"} {
			w.set(t, id, pipeline.Thaw, "2031-01-15", false, at("2031-06-20", cDays))
		}
		done := make(chan error, 2)
		for _, s := range []*Service{w.service, &other} {
			go func() { done <- s.Pass(t.Context()) }()
		}
		for range 2 {
			if err := <-done; err != nil {
				t.Fatal(err)
			}
		}
		w.pass(t) // what each has left to the other
	}
	same(t, "changes", w.Rows(t, `select site, string_agg(to_state, ' ' order by change_id), count(announced_at) from thaw.standing_changes
		group by site order by site`), []string{`(pad,"within near exceeded near within exceeded",5)`, `(strip,"within near exceeded near within exceeded",5)`})
	ids := map[string]bool{}
	for _, a := range w.told {
		ids[a.id] = true
	}
	if len(ids) != 10 {
		t.Errorf("%d ids told, want 10", len(ids))
	}
}

// Judging goes on at a nudge, and without one after a while; a failure in between
// is logged and tried again.
func TestRun(t *testing.T) {
	for _, tc := range []struct {
		name   string
		poll   time.Duration
		nudged bool
	}{
		{"at a nudge", time.Hour, true},
		{"the nudge was lost", 10 * time.Millisecond, false},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := twoStations(t)
			core, log := observer.New(zapcore.ErrorLevel)
			w.service.Log, w.service.Poll = zap.New(core), tc.poll
			w.refuse = func(string) error { return errors.New("out of reach") }
			running := run(t, w.service)
			defer running.stop(t)
			eventually(t, "a failure is logged", func() bool { return log.FilterMessage("judging failed, to be tried again").Len() > 0 })
			w.mu.Lock()
			w.refuse = nil
			w.mu.Unlock()
			if tc.nudged {
				w.nudges <- struct{}{}
			}
			eventually(t, "both are told", func() bool {
				w.mu.Lock()
				defer w.mu.Unlock()
				return len(w.told) == 2
			})
		})
	}
}

func TestRunCannotBegin(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.service.Bus = deaf{w.listener}
	if err := w.service.Run(t.Context()); !errors.Is(err, errDeaf) {
		t.Errorf("run: %v", err)
	}
	over, stop := context.WithCancel(t.Context())
	stop()
	if err := w.service.Run(over); err != nil {
		t.Errorf("run that is over before it begins: %v", err)
	}
}

var errDeaf = errors.New("cannot listen")

type deaf struct{ Bus }

func (deaf) Nudges(context.Context) (<-chan struct{}, error) { return nil, errDeaf }

// A bus that is closed sends no more nudges; that is no reason to look without
// end.
func TestRunWithoutNudges(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	core, log := observer.New(zapcore.ErrorLevel)
	w.service.Log, w.service.Poll = zap.New(core), time.Hour
	close(w.nudges)
	w.DB.Close() // each look is logged
	ctx, cancel := context.WithTimeout(t.Context(), 200*time.Millisecond)
	defer cancel()
	if err := w.service.Run(ctx); err != nil {
		t.Errorf("run: %v", err)
	}
	if n := log.Len(); n > 2 { // at the start, and when the bus closed
		t.Errorf("looked %d times", n)
	}
}
