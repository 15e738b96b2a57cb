package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"slices"
	"strings"
	"time"

	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
	"golang.org/x/term"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

const stageNames = "ingest, indices, alerts"

// daemon is the command `run`.
func (p program) daemon(ctx context.Context, args []string) error {
	f := p.flags("run", "run [--settings FILE] [--only STAGES] [--until-idle]: read feeds, make indices, judge surfaces")
	file := f.String("settings", "settings.yaml", "settings `file`")
	only := f.String("only", "", "run only these `stages` here, separated by commas: "+stageNames+"; needs a database and a bus that other processes share")
	untilIdle := f.Bool("until-idle", false, "return once every feed has been read and everything has settled; status 1 if that takes longer than work.idle_deadline or leaves something behind")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	stages, err := chosen(*only, set)
	if err != nil {
		return err
	}
	log := p.logger()
	defer log.Sync() //nolint:errcheck // a terminal cannot be synced
	d, err := build(ctx, set, log, time.Now)
	if err != nil {
		return err
	}
	if !*untilIdle {
		return errors.Join(d.run(ctx, p.hurry, stages), d.close(context.WithoutCancel(ctx)))
	}
	err = d.runUntilIdle(ctx, p.hurry, stages, p.progress())
	if err == nil {
		err = p.settled(ctx, d.db)
	}
	return errors.Join(err, d.close(context.WithoutCancel(ctx)))
}

// chosen reads --only.
func chosen(only string, set *settings.Settings) ([]string, error) {
	if only == "" {
		return nil, nil
	}
	stages := strings.Split(only, ",")
	for _, s := range stages {
		if !slices.Contains(strings.Split(stageNames, ", "), s) {
			return nil, fmt.Errorf("--only %s: there is no stage %q; stages are %s", only, s, stageNames)
		}
	}
	if set.Store.URL == "" || set.Bus.URL == "" {
		return nil, fmt.Errorf("--only %s: the other stages could not reach a private database or an embedded bus; set store.url (or store.url_file) and bus.url", only)
	}
	return stages, nil
}

func wanted(only []string, stage string) bool { return len(only) == 0 || slices.Contains(only, stage) }

// grace is how long the stages get to finish what they have in hand.
const grace = 30 * time.Second

func (d *daemon) run(ctx context.Context, hurry <-chan struct{}, only []string) error {
	stages := d.stages(only)
	if d.server != nil {
		// The private database is watched like a stage: without it nothing goes on.
		stages = append(stages, lifecycle.Stage{Name: "postgresql", Run: func(intake, _ context.Context) error {
			select {
			case err := <-d.server.Exited():
				return fmt.Errorf("private server exited: %w", err)
			case <-intake.Done():
				return nil
			}
		}})
	}
	d.log.Info("running", zap.Int("stations", len(d.set.Stations)), zap.Int("feeds", len(d.set.Feeds)), zap.Int("sites", len(d.set.Sites)))
	err := lifecycle.Run(ctx, d.log, grace, hurry, stages...)
	d.log.Info("stopped", zap.Error(err))
	return err
}

// errNotIdle says that not everything had settled in time.
var errNotIdle = errors.New("not everything had settled")

// runUntilIdle runs the stages until every feed has been read and has settled,
// no part is open and no change is pending, or the deadline of the settings has
// passed.
func (d *daemon) runUntilIdle(ctx context.Context, hurry <-chan struct{}, only []string, show func(store.Pending)) error {
	watched, stop := context.WithCancel(ctx)
	defer stop()
	idle := make(chan error, 1)
	go func() { idle <- d.awaitIdle(watched, stop, wanted(only, "ingest"), show) }()
	err := d.run(watched, hurry, only)
	stop()
	return errors.Join(err, <-idle, ctx.Err())
}

// awaitIdle stops the stages through stop once everything has settled.
func (d *daemon) awaitIdle(ctx context.Context, stop context.CancelFunc, feeds bool, show func(store.Pending)) error {
	limit := time.NewTimer(d.set.Work.IdleDeadline)
	defer limit.Stop()
	tick := time.NewTicker(25 * time.Millisecond)
	defer tick.Stop()
	var last store.Pending
	var unread time.Time // since when feeds cannot be read
	for {
		settled, unreadable := true, error(nil)
		if feeds {
			settled, unreadable = d.ingest.Settled(ctx)
		}
		pending, err := d.db.Pending(ctx)
		switch {
		case ctx.Err() != nil:
			return nil // stopped from outside: whoever did knows why
		case err != nil:
			d.log.Warn("not known whether all has settled", zap.Error(err))
		default:
			last = pending
			show(last)
		}
		switch {
		case unreadable == nil:
			unread = time.Time{}
		case unread.IsZero():
			unread = time.Now()
		case time.Since(unread) > unreadableFor && err == nil && last.Idle():
			stop()
			return fmt.Errorf("feeds cannot be read: %w", unreadable)
		}
		if err == nil && unreadable == nil && settled && last.Idle() {
			stop()
			return nil
		}
		select {
		case <-ctx.Done():
			return nil
		case <-limit.C:
			stop()
			return fmt.Errorf("%w after %s (work.idle_deadline): %s", errNotIdle, d.set.Work.IdleDeadline, describe(last, settled))
		case <-tick.C:
		}
	}
}

// unreadableFor is how long a feed may be unreadable while all else has settled.
const unreadableFor = 5 * time.Second

func describe(p store.Pending, settled bool) string {
	s := fmt.Sprintf("%d batches being read, %d parts not committed, %d stations to be made anew, %d withdrawals, %d changes to be judged, %d to be told",
		p.OpenBatches, p.OpenParts, p.Recomputes, p.Withdrawals, p.Changes, p.Unannounced)
	if !settled {
		s += ", and files still being written or feeds that cannot be read"
	}
	return s
}

// settled sums up what a run until idle has left; what needs somebody's eyes is
// an error.
func (p program) settled(ctx context.Context, db *store.DB) error {
	if err := p.showLedger(ctx, db); err != nil {
		return err
	}
	left, err := db.Pending(ctx)
	if err != nil {
		return err
	}
	print, err := db.Fingerprint(ctx)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "\nfingerprint %s\n", print)
	if left.HeldBack+left.StuckParts > 0 {
		return fmt.Errorf("%d batches held back, %d parts stuck; reasons above", left.HeldBack, left.StuckParts)
	}
	return nil
}

// load reads settings; faults and warnings are shown as they are.
func (p program) load(file string) (*settings.Settings, error) {
	set, warnings, err := settings.Load(file, readable)
	for _, w := range warnings {
		fmt.Fprintf(p.err, "warning: %s\n", w)
	}
	if err == nil {
		err = withGround(set)
	}
	if err != nil {
		return nil, err
	}
	if set.Data == "" {
		set.Data = defaultData()
	}
	return set, nil
}

// readable checks that ingest can read by a layout, so that what it refuses is
// known before anything starts.
func readable(l *pipeline.Layout) error {
	_, err := csvfeed.Compile(l)
	return err
}

// logger writes one line an event: plain text on a terminal, JSON elsewhere.
func (p program) logger() *zap.Logger {
	c := zap.NewProductionEncoderConfig()
	c.EncodeTime = zapcore.RFC3339TimeEncoder
	encoder := zapcore.NewJSONEncoder(c)
	if f, ok := p.err.(*os.File); ok && term.IsTerminal(int(f.Fd())) {
		c.EncodeLevel = zapcore.CapitalLevelEncoder
		encoder = zapcore.NewConsoleEncoder(c)
	}
	return zap.New(zapcore.NewCore(encoder, zapcore.AddSync(p.err), zapcore.InfoLevel))
}
