package indices

import (
	"context"
	"errors"
	"fmt"

	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// take works parts of one station off in one transaction. It says which parts
// the ledger does not know; parts that are committed already are left alone.
func (s *Service) take(ctx context.Context, station string, parts []*pipeline.Part) (unknown []bool, err error) {
	unknown = make([]bool, len(parts))
	err = s.DB.TakeStation(ctx, station, func(t *store.Take) error {
		states, err := t.PartStates(ctx, parts)
		if err != nil {
			return err
		}
		var todo []*pipeline.Part
		var todoStates []store.PartState
		for i, p := range parts {
			unknown[i] = !states[i].Known
			if states[i].Known && !states[i].Committed {
				todo, todoStates = append(todo, p), append(todoStates, states[i])
			}
		}
		if len(todo) == 0 {
			return nil
		}
		st, err := t.Station(ctx)
		if err != nil {
			return err
		}
		fates, days, err := t.WriteReadings(ctx, st, todo, todoStates)
		if err != nil {
			return err
		}
		if len(days) > 0 {
			if err := s.bringIntoLine(ctx, t, st, days); err != nil {
				return err
			}
		}
		return t.CommitParts(ctx, todo, fates)
	})
	if err != nil {
		return nil, fmt.Errorf("commit parts of station %s: %w", station, err)
	}
	return unknown, nil
}

// Recompute makes a station's whole record anew from its readings, by the rules
// now in force, and takes the mark that asked for it off.
func (s *Service) Recompute(ctx context.Context, station string) error {
	err := s.DB.TakeStation(ctx, station, func(t *store.Take) error {
		if err := t.Recomputed(ctx); err != nil {
			return err
		}
		st, err := t.Station(ctx)
		if err != nil {
			return err
		}
		return s.makeAnew(ctx, t, st)
	})
	if errors.Is(err, store.ErrBusy) {
		return nil // looked at again later
	}
	if err != nil {
		return fmt.Errorf("make record of station %s anew: %w", station, err)
	}
	s.Log.Info("record made anew by changed rules", zap.String("station", station))
	return s.Nudge()
}

// Reindex fills a station's gaps and works its indices out anew, from the daily
// values that it has, and takes the mark that asked for it off.
func (s *Service) Reindex(ctx context.Context, station string) error {
	return s.refill(ctx, station, true)
}

// Refill fills a station's gaps anew and works the indices out that follow from
// what that changes.
func (s *Service) Refill(ctx context.Context, station string) error {
	return s.refill(ctx, station, false)
}

func (s *Service) refill(ctx context.Context, station string, all bool) error {
	err := s.DB.TakeStation(ctx, station, func(t *store.Take) error {
		if err := t.Reindexed(ctx); err != nil {
			return err
		}
		st, err := t.Station(ctx)
		if err != nil {
			return err
		}
		stored, err := t.Days(ctx)
		if err != nil {
			return err
		}
		if all && whole(st, stored) {
			return index(ctx, t, st, &filled{}, stored, stored, nil, true)
		}
		return s.write(ctx, t, st, stored, merge(stored, nil), false, all)
	})
	if errors.Is(err, store.ErrBusy) {
		return nil // looked at again later
	}
	if err != nil {
		return fmt.Errorf("work indices of station %s out anew: %w", station, err)
	}
	s.Log.Info("gaps filled and indices worked out anew", zap.String("station", station))
	return s.Nudge()
}

// Withdraw takes back the readings that a committed batch makes void, and brings
// the station's record into line.
func (s *Service) Withdraw(ctx context.Context, w store.Withdrawal) error {
	var days []pipeline.Day
	err := s.DB.TakeStation(ctx, w.Station, func(t *store.Take) error {
		st, err := t.Station(ctx)
		if err != nil {
			return err
		}
		if days, err = t.Withdraw(ctx, st, w.Batch); err != nil || len(days) == 0 {
			return err
		}
		return s.bringIntoLine(ctx, t, st, days)
	})
	if errors.Is(err, store.ErrBusy) {
		return nil // looked at again later
	}
	if err != nil {
		return fmt.Errorf("withdraw readings of station %s: %w", w.Station, err)
	}
	s.Log.Info("readings withdrawn", zap.String("station", w.Station), zap.Int64("by_batch", w.Batch), zap.Int("days", len(days)))
	return s.Nudge()
}
