package ingest

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"go.uber.org/zap"

	"thawledger/ingest/archive"
	"thawledger/ingest/feed"
	"thawledger/pipeline"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/store"
)

// Config is what an ingest worker is made of.
type Config struct {
	DB      *store.DB
	Bus     *bus.Bus
	Archive *archive.Archive
	Feeds   []pipeline.Feed
	Log     *zap.Logger
	Now     func() time.Time
	// RepublishAfter is the least time after which a part that the bus has lost
	// is published again, RepublishAllowed how often it may be published at all.
	RepublishAfter   time.Duration
	RepublishAllowed int
	// DeliveriesOnly leaves the feeds' own sources alone: only what is handed over
	// is read, and what was begun is finished.
	DeliveriesOnly bool
}

// Service is the ingest worker.
type Service struct {
	Config

	// one batch is read at a time: the store is slower than the reading
	reading sync.Mutex
	folders map[string]*feed.Folder
	remotes map[string]remote
	failed  map[int64]int // how often reading an open batch failed
	looks   map[string]look
	// climates are those that readings were last held against, by station
	climates map[string]knownClimate
}

// look is how the last look at a feed went.
type look struct {
	unsettled int
	err       error
	at        time.Time // by the process's clock
}

// failedAgain is how soon Settled looks again at a feed that could not be read.
const failedAgain = time.Second

// New returns an ingest worker.
func New(c Config) *Service {
	s := &Service{Config: c, folders: map[string]*feed.Folder{}, failed: map[int64]int{}, looks: map[string]look{}, climates: map[string]knownClimate{}}
	for i := range s.Feeds {
		f := &s.Feeds[i]
		s.folders[f.Name] = feed.NewFolder(f.Folder, f.Pattern, f.Subfolders, f.Settle)
	}
	s.remotes = newRemotes(s.Feeds)
	return s
}

// Run finishes what an earlier process left, looks at every feed once, so that
// what a schedule has missed is caught up, and then on schedule, until intake
// ends; work ends what is in hand then.
func (s *Service) Run(intake, work context.Context) error {
	s.reopenHeld(intake)
	s.finish(intake)
	for _, f := range s.sources() {
		s.look(intake, f)
	}
	stop, err := s.schedule(intake)
	if err != nil {
		return err
	}
	tick := time.NewTicker(min(max(s.RepublishAfter/4, time.Second), 5*time.Second))
	defer tick.Stop()
	for {
		select {
		case <-intake.Done():
			stop(work)
			s.closeRemotes()
			return nil
		case <-tick.C:
			s.finish(intake)
		}
	}
}

// sources returns the feeds that are looked at.
func (s *Service) sources() (out []*pipeline.Feed) {
	for i := range s.Feeds {
		if s.Feeds[i].Folder != "" && !s.DeliveriesOnly {
			out = append(out, &s.Feeds[i])
		}
	}
	return out
}

// Settled says whether every feed was looked at and nothing in it is still
// being written. It looks again at those where something was.
func (s *Service) Settled(ctx context.Context) (bool, error) {
	s.reading.Lock()
	var again []*pipeline.Feed
	missing := 0
	var failed []error
	for _, f := range s.sources() {
		l, ok := s.looks[f.Name]
		switch {
		case !ok:
			missing++
		case l.err != nil:
			failed = append(failed, l.err)
			if time.Since(l.at) >= failedAgain {
				again = append(again, f)
			}
		case l.unsettled > 0:
			again = append(again, f)
		}
	}
	s.reading.Unlock()
	for _, f := range again {
		s.look(ctx, f)
	}
	return missing+len(again) == 0, errors.Join(failed...)
}

// Look looks at every feed now, whatever their schedules.
func (s *Service) Look(ctx context.Context) error {
	var failed []error
	for _, f := range s.sources() {
		s.look(ctx, f)
		s.reading.Lock()
		failed = append(failed, s.looks[f.Name].err)
		s.reading.Unlock()
	}
	return errors.Join(failed...)
}

// look takes what has newly arrived in a feed's folder.
func (s *Service) look(ctx context.Context, f *pipeline.Feed) {
	fetched := s.fetch(ctx, f) // not under the lock: a server may take its time
	s.reading.Lock()
	defer s.reading.Unlock()
	unsettled, err := s.arrivals(ctx, f)
	err = errors.Join(fetched, err)
	if err != nil && ctx.Err() == nil {
		s.Log.Error("feed not read to its end, to be looked at again", zap.String("feed", f.Name), zap.Error(err))
	}
	s.looks[f.Name] = look{unsettled, err, time.Now()}
}

func (s *Service) arrivals(ctx context.Context, f *pipeline.Feed) (unsettled int, err error) {
	seen, err := s.DB.FilesSeen(ctx, f.Name, s.Archive.ID())
	if err != nil {
		return 0, err
	}
	folder := s.folders[f.Name]
	files, unsettled, err := folder.Look(s.Now(), func(file feed.File) bool {
		last, ok := seen[file.Name]
		same := ok && last.Bytes == file.Bytes && last.SourceTime.Equal(file.Written)
		return same && !(f.Grows && last.Position < last.Bytes && s.stoodStill(file))
	})
	var failed []error
	if err != nil {
		failed = append(failed, fmt.Errorf("look at feed %s: %w", f.Name, err))
	}
	for _, file := range files {
		if ctx.Err() != nil {
			return unsettled, ctx.Err()
		}
		changed, err := s.arrival(ctx, f, folder, file, seen[file.Name])
		if err != nil {
			// One file that cannot be taken does not keep the others.
			failed = append(failed, fmt.Errorf("take %s of feed %s: %w", file.Name, f.Name, err))
		}
		if changed {
			unsettled++
		}
		if store.Temporary(err) {
			break
		}
	}
	return unsettled, errors.Join(failed...)
}

// earlier keeps a source whose clock is ahead from winning over every later
// batch.
func earlier(a, b time.Time) time.Time {
	if b.Before(a) {
		return b.UTC().Truncate(time.Microsecond)
	}
	return a
}
