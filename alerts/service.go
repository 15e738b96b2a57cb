package alerts

import (
	"context"
	"errors"
	"time"

	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// Bus is what the stage needs of the message bus.
type Bus interface {
	// Nudges says that changes may be waiting; nudges may be lost. The channel is
	// closed when no more can come.
	Nudges(ctx context.Context) (<-chan struct{}, error)
	// Announce tells what has changed on a surface; id is its key.
	Announce(ctx context.Context, site, surface, id string, payload []byte) error
}

// Service judges and announces.
type Service struct {
	DB  *store.DB
	Bus Bus
	Log *zap.Logger
	// Now is the clock: a season that is over by it is history, and told to no one.
	Now func() time.Time
	// Recipients are told of changes of Sites; what they are told is written with
	// the change. Wake, if not nil, is called when something may have been written.
	Recipients []pipeline.Recipient
	Sites      []pipeline.Site
	Wake       func()
	// Poll is how often changes are looked for without a nudge; 2 s if zero.
	Poll time.Duration
}

// Run works until ctx ends. It returns an error only if it cannot begin; what
// fails later is logged and tried again.
func (s *Service) Run(ctx context.Context) error {
	nudges, err := s.Bus.Nudges(ctx)
	switch {
	case ctx.Err() != nil:
		return nil // over before it began
	case err != nil:
		return err
	}
	poll := s.Poll
	if poll == 0 {
		poll = 2 * time.Second
	}
	tick := time.NewTicker(poll)
	defer tick.Stop()
	for {
		if err := s.Pass(ctx); err != nil && ctx.Err() == nil {
			s.Log.Error("judging failed, to be tried again", zap.Error(err))
		}
		select {
		case <-ctx.Done():
			return nil
		case _, ok := <-nudges:
			if !ok {
				nudges = nil
			}
		case <-tick.C:
		}
	}
}

// Pass judges every station that has changed and tells what is to be told.
// A station that fails does not keep the others from being judged.
func (s *Service) Pass(ctx context.Context) error {
	stations, err := s.DB.ChangedStations(ctx)
	if err != nil {
		return err
	}
	if s.Wake != nil && len(stations) > 0 {
		defer s.Wake()
	}
	var failed []error
	for _, station := range stations {
		if err := s.judgeStation(ctx, station); err != nil && !errors.Is(err, store.ErrBusy) {
			failed = append(failed, err)
		}
	}
	return errors.Join(append(failed, s.announce(ctx))...)
}
