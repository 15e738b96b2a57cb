package ingest

import (
	"context"
	"fmt"
	"time"

	"github.com/robfig/cron/v3"
	"go.uber.org/zap"
)

// schedule looks at each feed by its cron schedule (UTC). The returned function
// ends that and waits for looks under way, or for ctx.
//
// The library starts with no protection at all: a panic is recovered and logged,
// and a look that is still under way is not begun again, only because it is
// said here. A panic is to be recovered inside, or the look would count as under
// way for ever. It forgets everything with the process; Run looks at every feed
// when it starts.
func (s *Service) schedule(intake context.Context) (stop func(context.Context), err error) {
	log := cronLog{s.Log}
	c := cron.New(cron.WithLocation(time.UTC), cron.WithLogger(log),
		cron.WithChain(cron.SkipIfStillRunning(log), cron.Recover(log)))
	for _, f := range s.sources() {
		if _, err := c.AddFunc(f.Schedule, func() { s.look(intake, f) }); err != nil {
			return nil, fmt.Errorf("schedule feed %s: %w", f.Name, err)
		}
	}
	c.Start()
	return func(ctx context.Context) {
		select {
		case <-c.Stop().Done():
		case <-ctx.Done():
		}
	}, nil
}

// cronLog writes what the schedule has to say into the program's log.
type cronLog struct{ log *zap.Logger }

func (l cronLog) Info(msg string, kv ...any) { l.log.Debug("schedule: "+msg, zap.Any("details", kv)) }

func (l cronLog) Error(err error, msg string, kv ...any) {
	l.log.Error("schedule: "+msg, zap.Error(err), zap.Any("details", kv))
}
