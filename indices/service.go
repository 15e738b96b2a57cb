package indices

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/store"
)

// Taker takes parts off the bus; *bus.Taker is one.
type Taker interface {
	Take(ctx context.Context, most int, wait time.Duration) ([]bus.Delivery, error)
}

// Service is the index service.
type Service struct {
	DB    *store.DB
	Taker Taker
	// Nudge says that changes are waiting to be judged; it may be lost.
	Nudge func() error
	Log   *zap.Logger
	// CommitReadings is about how many readings go into one transaction.
	CommitReadings int
	// FailuresAllowed is how often a part may fail for a reason of its own
	// before it is given up.
	FailuresAllowed int
	// Workers is how many stations are in work at a time.
	Workers int

	models    models
	hindcasts hindcasts
}

// takeParts is how many messages are asked for in one go: with 500 readings in
// each, a little more than one transaction's worth.
const takeParts = 120

// Run takes parts until intake ends, then finishes what is in hand; work ends
// that too. It also makes stations anew whose rules have changed, and withdraws
// readings that a committed batch makes void.
func (s *Service) Run(intake, work context.Context) error {
	intake, end := context.WithCancel(intake)
	defer end()
	q := newQueue(2 * s.CommitReadings)
	var workers sync.WaitGroup
	for range s.Workers {
		workers.Go(func() {
			for {
				station, ds, ok := q.next(s.CommitReadings)
				if !ok {
					return
				}
				s.work(work, station, ds)
				q.release(station)
			}
		})
	}
	workers.Go(func() { s.chores(intake, work) })
	for intake.Err() == nil {
		if !q.room(intake) {
			break
		}
		ds, err := s.Taker.Take(intake, takeParts, time.Second)
		if err != nil && intake.Err() == nil {
			s.Log.Warn("nothing taken, to be tried again", zap.Error(err))
			if !bus.Temporary(err) {
				end()
				q.close()
				workers.Wait()
				return fmt.Errorf("take parts: %w", err)
			}
		}
		for _, d := range ds {
			if d.Err != nil {
				s.refuse(d)
				continue
			}
			q.put(d)
		}
	}
	for _, d := range q.close() {
		s.answer(d, d.NotNow(0))
	}
	workers.Wait()
	return nil
}

// refuse takes a message that cannot be read off the bus. Its part stays open in
// the ledger and is published again from the archive.
func (s *Service) refuse(d bus.Delivery) {
	s.Log.Error("message cannot be read; its part will be published again from the archive", zap.Stringer("part", d.ID),
		zap.String("station", d.Station), zap.Int("bytes", len(d.Body)), zap.Error(d.Err))
	s.answer(d, d.NeverAgain(d.Err.Error()))
}

func (s *Service) answer(d bus.Delivery, err error) {
	if err != nil {
		s.Log.Warn("answer may not have reached the bus; the part will come again", zap.Stringer("part", d.ID), zap.Error(err))
	}
}

// work works off parts of one station and answers for each.
func (s *Service) work(ctx context.Context, station string, ds []bus.Delivery) {
	parts := make([]*pipeline.Part, len(ds))
	for i := range ds {
		parts[i] = ds[i].Part
	}
	unknown, err := s.take(ctx, station, parts)
	switch {
	case err == nil:
		for i, d := range ds {
			if unknown[i] {
				s.Log.Error("part is not in the ledger", zap.Stringer("part", d.ID), zap.String("station", station))
				s.answer(d, d.NeverAgain("not in the ledger"))
				continue
			}
			s.answer(d, d.Done())
		}
		if err := s.Nudge(); err != nil {
			s.Log.Debug("nudge not sent", zap.Error(err))
		}
	case errors.Is(err, store.ErrBusy):
		s.putOff(ds, 200*time.Millisecond)
	case store.Temporary(err) || ctx.Err() != nil:
		s.Log.Warn("not committed, to be tried again", zap.String("station", station), zap.Int("parts", len(ds)), zap.Error(err))
		s.putOff(ds, time.Second)
	case len(ds) > 1:
		// One of them is at fault: find out which, so that the others get through.
		for _, d := range ds {
			s.work(ctx, station, []bus.Delivery{d})
		}
	default:
		s.fail(ctx, ds[0], err)
	}
}

func (s *Service) putOff(ds []bus.Delivery, delay time.Duration) {
	for _, d := range ds {
		s.answer(d, d.NotNow(delay))
	}
}

// fail counts a failure of a part's own, and gives it up when it has had as many
// as are allowed.
func (s *Service) fail(ctx context.Context, d bus.Delivery, cause error) {
	stuck, err := s.DB.FailPart(ctx, d.ID.Batch, d.ID.Number, cause.Error(), s.FailuresAllowed)
	log := s.Log.With(zap.Stringer("part", d.ID), zap.String("station", d.Station), zap.NamedError("cause", cause))
	switch {
	case err != nil:
		log.Warn("part failed, and that could not be recorded", zap.Error(err))
		s.answer(d, d.NotNow(time.Second))
	case stuck:
		log.Error("part given up; see the ledger")
		s.answer(d, d.NeverAgain(cause.Error()))
	default:
		log.Warn("part failed, to be tried again")
		s.answer(d, d.NotNow(time.Second))
	}
}

// chores looks for stations whose rules have changed, and for readings to be
// withdrawn.
func (s *Service) chores(intake, work context.Context) {
	tick := time.NewTicker(time.Second)
	defer tick.Stop()
	for {
		if err := errors.Join(s.recomputeMarked(intake, work), s.withdraw(intake, work), s.makeOutlooks(intake, work)); err != nil && intake.Err() == nil {
			s.Log.Warn("records not made anew, to be tried again", zap.Error(err))
		}
		select {
		case <-intake.Done():
			return
		case <-tick.C:
		}
	}
}

// recomputeMarked makes the records that are marked anew, as many at a time as
// there are workers.
func (s *Service) recomputeMarked(intake, work context.Context) error {
	var failed []error
	for _, chore := range []struct {
		due  func(context.Context) ([]string, error)
		make func(context.Context, string) error
	}{{s.DB.Recomputes, s.Recompute}, {s.DB.Reindexes, s.Reindex}, {s.DB.Refills, s.Refill}} {
		stations, err := chore.due(work)
		failed = append(failed, err)
		errs := make([]error, len(stations))
		var workers sync.WaitGroup
		free := make(chan struct{}, max(1, s.Workers))
		for i, station := range stations {
			if intake.Err() != nil {
				break
			}
			free <- struct{}{}
			workers.Go(func() {
				defer func() { <-free }()
				errs[i] = chore.make(work, station)
			})
		}
		workers.Wait()
		failed = append(failed, errs...)
	}
	return errors.Join(failed...)
}

// MakeMarked makes the records anew that are marked to be, as Run does once a
// second.
func (s *Service) MakeMarked(ctx context.Context) error { return s.recomputeMarked(ctx, ctx) }

func (s *Service) withdraw(intake, work context.Context) error {
	due, err := s.DB.Withdrawals(work)
	failed := []error{err}
	for _, w := range due {
		if intake.Err() != nil {
			break
		}
		failed = append(failed, s.Withdraw(work, w))
	}
	return errors.Join(failed...)
}
