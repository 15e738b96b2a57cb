package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/jackc/pgx/v5"

	"thawledger/pipeline/localpg"
)

// crashes is how often the daemon is killed; every third time the database as well.
const crashes = 24

// TestKilledDuringLoad kills the daemon, and at times its private PostgreSQL
// with it, while it loads, starts it again each time, and finds the database as
// an undisturbed run leaves it (invariants 2 and 3).
func TestKilledDuringLoad(t *testing.T) {
	if testing.Short() {
		t.Skip("takes a minute")
	}
	t.Parallel()
	seed := uint64(time.Now().UnixNano())
	t.Logf("seed %d", seed)
	random := rand.New(rand.NewPCG(seed, 1))
	calm, rough := newCrashSite(t), newCrashSite(t)

	rounds, kills, inWork, withBase := 0, 0, 0, 0
	for ; kills < crashes; rounds++ {
		if rounds == 3*crashes {
			t.Fatalf("%d kills in %d rounds: the daemon is done too soon", kills, rounds)
		}
		rough.deliver(t, rounds)
		p := rough.start(t, "run", "--until-idle")
		openParts := 0
		if kills%2 == 0 {
			openParts = rough.awaitOpenParts(t, p)
		}
		// The moment is what is being tried out; nothing is waited for.
		time.Sleep(time.Duration(random.Int64N(int64(120 * time.Millisecond))))
		base := rough.postmaster(t)
		if kills%3 == 2 {
			base = rough.awaitPostmaster(t, p)
		}
		if err := p.cmd.Process.Kill(); errors.Is(err, os.ErrProcessDone) {
			continue // done before its time: no kill
		} else if err != nil {
			t.Fatal(err)
		}
		if kills%3 == 2 && base != 0 && syscall.Kill(base, syscall.SIGKILL) == nil {
			withBase++
		}
		<-p.ended
		if openParts > 0 {
			inWork++
		}
		kills++
	}
	got := rough.untilIdle(t)
	for n := range rounds {
		calm.deliver(t, n)
	}
	want := calm.untilIdle(t)
	t.Logf("%d kills, %d while parts were open, %d with the database", kills, inWork, withBase)
	if inWork < crashes/3 || withBase < 5 {
		t.Error("too few of them")
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("tables after kills differ (-undisturbed +killed):\n%s", diff)
	}
}

// crashSite is a place with deliveries for a daemon that is killed.
type crashSite struct{ *place }

const crashSettings = `
data: data
stations:
  - {id: FELL, latitude: 69, longitude: -120, utc_offset: "-08:00", daily_mean: hourly}
  - {id: TARN, latitude: 70, longitude: -118, utc_offset: "-08:00", daily_mean: hourly}
layouts:
  hourly:
    delimiter: ","
    names_line: 1
    time: {columns: [time], format: "YYYY-MM-DDThh:mmZ", zone: Z, covers: instant}
    station: {column: station}
    values: [{column: t, variable: air_temp, unit: degC}]
feeds:
  - {name: fells, folder: feed, settle: 0s, every: "@every 1h", layout: hourly}
sites:
  - id: strip
    station: FELL
    surfaces:
      - id: gravel
        n_factors: [{kind: thaw, value: 1.3, source: invented}]
        design_values:
          - {kind: thaw, definition: curve, of: surface, direction: not_above, index: 1500, unit: degC.d, source: invented}
work: {commit_readings: 500, republish_after: 1s, idle_deadline: 2m}
`

func newCrashSite(t *testing.T) crashSite {
	return crashSite{newPlace(t, crashSettings, nil)}
}

// deliver writes a delivery: half a year of both stations, correcting a month of
// the one before, with a row that cannot be read.
func (s crashSite) deliver(t *testing.T, n int) {
	t.Helper()
	var b strings.Builder
	b.WriteString("station,time,t\n")
	first := time.Date(2000, 1, 1, 8, 0, 0, 0, time.UTC).AddDate(0, 5*n, 0)
	for at := first; at.Before(first.AddDate(0, 6, 0)); at = at.Add(time.Hour) {
		c := -8 + 19*math.Sin(float64(at.YearDay()-110)/58) + 4*math.Sin(float64(at.Hour())/4) + float64(n)/10
		fmt.Fprintf(&b, "FELL,%[1]s,%.1[2]f\nTARN,%[1]s,%.1[3]f\n", at.Format("2006-01-02T15:04Z"), c, c-3)
	}
	b.WriteString("FELL,yesterday,3\n")
	path := s.write(t, fmt.Sprintf("feed/%02d.csv", n), b.String())
	// The order of batches is that of these times.
	written := time.Date(2026, 1, 1, n, 0, 0, 0, time.UTC)
	if err := os.Chtimes(path, written, written); err != nil {
		t.Fatal(err)
	}
}

// untilIdle lets a daemon finish and returns what the tables then hold.
func (s crashSite) untilIdle(t *testing.T) []string {
	t.Helper()
	p := s.start(t, "run", "--until-idle")
	<-p.ended
	if p.err != nil {
		t.Fatalf("%v\n%s", p.err, p.said())
	}
	return s.rows(t, "select * from thaw.fingerprint_tables()")
}

// postmaster returns the private server's process; 0 if it does not run.
func (s crashSite) postmaster(t *testing.T) int {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(s.postgresql(), "cluster", "postmaster.pid"))
	if err != nil {
		return 0
	}
	pid, _ := strconv.Atoi(strings.SplitN(string(text), "\n", 2)[0])
	return pid
}

// awaitPostmaster waits until the private server runs, and returns its process; 0
// if the daemon has ended by itself before. A server that was killed leaves its
// number behind.
func (s crashSite) awaitPostmaster(t *testing.T, p *process) int {
	t.Helper()
	tick := time.NewTicker(2 * time.Millisecond)
	defer tick.Stop()
	deadline := time.After(time.Minute)
	for {
		if pid := s.postmaster(t); pid != 0 && syscall.Kill(pid, 0) == nil {
			return pid
		}
		select {
		case <-tick.C:
		case <-p.ended:
			return 0
		case <-deadline:
			t.Fatalf("no server came\n%s", p.said())
		}
	}
}

// awaitOpenParts waits until the daemon has parts on their way, and returns how
// many; 0 if it has ended by itself before.
func (s crashSite) awaitOpenParts(t *testing.T, p *process) int {
	t.Helper()
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	for ctx.Err() == nil {
		if n := s.openParts(ctx); n > 0 {
			return n
		}
		select {
		case <-p.ended:
			return 0
		default:
		}
	}
	t.Fatalf("no open parts came\n%s", p.said())
	return 0
}

// openParts is 0 as long as there is no server, or no table, to ask.
func (s crashSite) openParts(ctx context.Context) (n int) {
	conn, err := pgx.Connect(ctx, localpg.DSN(s.postgresql(), "postgres"))
	if err != nil {
		return 0
	}
	defer conn.Close(context.WithoutCancel(ctx))
	for ctx.Err() == nil {
		err := conn.QueryRow(ctx, "select count(*) from thaw.batch_parts where committed_at is null").Scan(&n)
		if err != nil || n > 0 {
			return n
		}
	}
	return 0
}
