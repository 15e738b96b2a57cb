package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"sync/atomic"
	"time"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"

	"thawledger/cmd/thawledger/region"
	"thawledger/pipeline"
	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/localpg"
	"thawledger/pipeline/settings"
)

// demo is the command `demo`: the invented region's history is loaded, its
// current season replayed, all through the real stages.
func (p program) demo(ctx context.Context, args []string) error {
	f := p.flags("demo", "demo [--dir FOLDER] [--stay]: an invented region, from CSV files to standings")
	dir := f.String("dir", filepath.Join(filepath.Dir(defaultData()), "thawledger-demo"), "`folder` to work in; what an earlier demo left there is removed")
	stay := f.Bool("stay", false, "keep the daemon and its database running until interrupted")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	started := time.Now()
	if err := emptyFolder(*dir); err != nil {
		return err
	}
	log, err := fileLogger(filepath.Join(*dir, "thawledger.log"))
	if err != nil {
		return err
	}
	defer log.Sync() //nolint:errcheck // nothing to be done about it
	set, err := p.load(filepath.Join(*dir, "settings.yaml"))
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "An invented region: its places, names, weather and design values are made up, from a fixed seed.\nWorking in %s\n\n", *dir)
	files, err := region.NewWriter(filepath.Join(*dir, "feeds"))
	if err != nil {
		return err
	}
	s := &show{program: p, files: files, set: set, dir: *dir, stay: *stay, started: started}
	s.setDay(region.Replay)
	d, err := build(ctx, set, log, s.now)
	if err != nil {
		return err
	}
	s.daemon = d
	fmt.Fprintf(p.out, "PostgreSQL %s, TimescaleDB %s; bus embedded\n", d.db.Version, orNone(d.db.Timescale))
	running, stop := context.WithCancel(ctx)
	defer stop()
	ended := make(chan error, 1)
	go func() { ended <- lifecycle.Run(running, log, grace, p.hurry, d.stages(nil)...) }()
	err = s.tell(running)
	if err == nil && *stay {
		fmt.Fprintln(p.out, "\nstill running; interrupt (Ctrl-C) ends it")
		<-ctx.Done()
	}
	stop()
	return errors.Join(err, <-ended, d.close(context.WithoutCancel(ctx)))
}

// marker is the file by which a folder is known to be the demo's own.
const marker = "made-by-thawledger-demo"

// emptyFolder makes the demo's folder anew; a folder that is not the demo's own
// is never touched.
func emptyFolder(dir string) error {
	entries, err := os.ReadDir(dir)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("look at demo folder: %w", err)
	}
	if _, err := os.Stat(filepath.Join(dir, marker)); len(entries) > 0 && err != nil {
		return fmt.Errorf("%s holds something that no demo has made; name an empty folder with --dir", dir)
	}
	if len(entries) > 0 {
		release, err := lifecycle.LockFolder(filepath.Join(dir, "data"))
		if err != nil {
			return err
		}
		defer release()
		if err := os.RemoveAll(dir); err != nil {
			return fmt.Errorf("empty demo folder: %w", err)
		}
	}
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return fmt.Errorf("make demo folder: %w", err)
	}
	err = os.WriteFile(filepath.Join(dir, marker), []byte("this folder is removed by the next demo\n"), 0o644)
	return errors.Join(err, os.WriteFile(filepath.Join(dir, "settings.yaml"), region.Settings, 0o644))
}

func fileLogger(path string) (*zap.Logger, error) {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_WRONLY|os.O_APPEND, 0o644)
	if err != nil {
		return nil, fmt.Errorf("open log: %w", err)
	}
	c := zap.NewProductionEncoderConfig()
	c.EncodeTime = zapcore.RFC3339TimeEncoder
	return zap.New(zapcore.NewCore(zapcore.NewJSONEncoder(c), f, zapcore.InfoLevel)), nil
}

// show is a demo under way.
type show struct {
	program
	daemon  *daemon
	files   *region.Writer
	set     *settings.Settings
	dir     string
	stay    bool
	started time.Time

	today atomic.Int32 // the region's date
	told  int64        // last change shown
}

func (s *show) setDay(d pipeline.Day) { s.today.Store(int32(d)) }

// now is the region's clock: noon of its date.
func (s *show) now() time.Time { return pipeline.Day(s.today.Load()).Time().Add(12 * time.Hour) }

// step is how many days of the current season are sent at a time.
const step = 10

func (s *show) tell(ctx context.Context) error {
	fmt.Fprintf(s.out, "\nHistory, %s to %s:\n", region.First, region.Replay-1)
	n, err := s.files.History()
	if err != nil {
		return err
	}
	if err := s.settle(ctx); err != nil {
		return err
	}
	fmt.Fprintf(s.out, "  %d files of %d stations read, indices made, every past season judged (%.1f s)\n", n, len(region.Stations), time.Since(s.started).Seconds())
	fmt.Fprintf(s.out, "\nThe season of 2031, %d days at a time; what the alerting stage announces:\n", step)
	for from := region.Replay; from <= region.Last; from += step {
		to := min(from+step-1, region.Last)
		s.setDay(to + 1)
		// in spring the region's loggers and typists make their usual mistakes
		if err := s.files.Step(from, to, from == region.Replay+5*step); err != nil {
			return err
		}
		if err := s.settle(ctx); err != nil {
			return err
		}
		if err := s.announced(ctx, to); err != nil {
			return err
		}
	}
	return s.sumUp(ctx)
}

// settle has the feeds looked at and waits until all that follows is done.
func (s *show) settle(ctx context.Context) error {
	progress := s.progress()
	limit := time.Now().Add(s.set.Work.IdleDeadline)
	tick := time.NewTicker(20 * time.Millisecond)
	defer tick.Stop()
	looked := make(chan error, 1)
	go func() { looked <- s.daemon.ingest.Look(ctx) }()
	done := false
	for {
		select {
		case err := <-looked:
			if err != nil {
				return err
			}
			done = true
		case <-tick.C:
		case <-ctx.Done():
			return ctx.Err()
		}
		left, err := s.daemon.db.Pending(ctx)
		if err != nil {
			return err
		}
		if progress(left); done && left.Idle() {
			return nil
		}
		if time.Now().After(limit) {
			return fmt.Errorf("%w: %s; see %s", errNotIdle, describe(left, done), filepath.Join(s.dir, "thawledger.log"))
		}
	}
}

// announced shows what has been told since the last time.
func (s *show) announced(ctx context.Context, day pipeline.Day) error {
	changes, err := s.daemon.db.Told(ctx, s.told)
	if err != nil {
		return err
	}
	for _, c := range changes {
		s.told = c.ID
		from := ""
		if c.From != "" {
			from = string(c.From) + " -> "
		}
		fmt.Fprintf(s.out, "  %s  %-28s %-22s %s of %.0f degC.d (%s)\n", day, c.Site+" / "+c.Surface, from+string(c.To), bounds(c.Low, c.High, c.DesignC, ""), c.DesignC, c.Why)
	}
	return nil
}

func (s *show) sumUp(ctx context.Context) error {
	db := s.daemon.db
	fmt.Fprintf(s.out, "\nStandings on %s:\n\n", region.Last)
	rows, err := db.StandingsNow(ctx, "")
	if err != nil {
		return err
	}
	s.showStandings(rows)
	if err := s.exceedances(ctx); err != nil {
		return err
	}
	fmt.Fprintln(s.out, "\nLedger:")
	if err := s.showLedger(ctx, db); err != nil {
		return err
	}
	fingerprint, err := db.Fingerprint(ctx)
	if err != nil {
		return err
	}
	fmt.Fprintf(s.out, "\nfingerprint %s, %.0f s in all\n\nTo look for oneself", fingerprint, time.Since(s.started).Seconds())
	if !s.stay {
		fmt.Fprintf(s.out, " (with the database running: thawledger demo --stay)")
	}
	psql := "psql"
	if found, err := localpg.Find(nil); err == nil {
		if path := filepath.Join(found[0].BinDir, "psql"); exists(path) {
			psql = path
		}
	}
	fmt.Fprintf(s.out, ":\n  %s '%s' -c 'select * from thaw.standing_now'\n", psql, localpg.DSN(filepath.Join(s.set.Data, "postgresql"), "postgres"))
	return nil
}

func exists(path string) bool {
	_, err := os.Stat(path)
	return err == nil
}

// exceedances shows the current season's, with their dates.
func (s *show) exceedances(ctx context.Context) error {
	all, err := s.daemon.db.ExceedancesSince(ctx, region.Replay.Time())
	if err != nil {
		return err
	}
	fmt.Fprintln(s.out, "\nExceedances of the season of 2031 (earlier seasons: thaw.exceedances):")
	for _, e := range all {
		var dates []string
		if e.NearOn != nil {
			dates = append(dates, "near on "+e.NearOn.Format(time.DateOnly))
		}
		if e.ExceededOn != nil {
			dates = append(dates, "exceeded on "+e.ExceededOn.Format(time.DateOnly))
		}
		if e.ClosedAs != nil {
			dates = append(dates, *e.ClosedAs+" "+e.ClosedOn.Format(time.DateOnly))
		}
		fmt.Fprintf(s.out, "  %-28s %s: %s of %.0f degC.d\n", e.Site+" / "+e.Surface, strings.Join(dates, ", "), bounds(e.IndexLowCDays, e.IndexHighCDays, e.DesignCDays, ""), e.DesignCDays)
	}
	return nil
}
