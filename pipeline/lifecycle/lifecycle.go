// Package lifecycle starts the stages of a process and stops them in order: the
// first stage ends its intake and finishes what it has in hand, then the next,
// so that what one hands on is still taken by the one behind it. One deadline
// bounds the whole; when it has passed, or a second signal comes, work in hand
// is broken off.
package lifecycle

import (
	"context"
	"errors"
	"fmt"
	"time"

	"go.uber.org/zap"
)

// Stage is something that runs until its intake ends.
type Stage struct {
	Name string
	// Run works until intake is over, then finishes what it has in hand and
	// returns; once work is over too it returns at once. Returning before intake
	// is over stops the process.
	Run func(intake, work context.Context) error
}

// ErrBrokenOff says that a stage had to be broken off in its work.
var ErrBrokenOff = errors.New("broken off before its work was finished")

// Run starts all stages and waits. When ctx is over, or a stage returns, the
// stages are stopped one after the other in the order given. They get grace
// altogether; hurry cuts that short. Run returns the first error of a stage.
func Run(ctx context.Context, log *zap.Logger, grace time.Duration, hurry <-chan struct{}, stages ...Stage) error {
	work, breakOff := context.WithCancel(context.WithoutCancel(ctx))
	defer breakOff()
	type running struct {
		Stage
		stop context.CancelFunc
		done chan struct{}
		err  error
	}
	ended := make(chan *running, len(stages))
	all := make([]*running, len(stages))
	for i, s := range stages {
		intake, stop := context.WithCancel(context.WithoutCancel(ctx))
		r := &running{Stage: s, stop: stop, done: make(chan struct{})}
		all[i] = r
		go func() {
			r.err = s.Run(intake, work)
			close(r.done)
			ended <- r
		}()
	}
	var first error
	select {
	case <-ctx.Done():
	case r := <-ended:
		first = fmt.Errorf("%s ended: %w", r.Name, orEarly(r.err))
	}
	limit := time.NewTimer(grace)
	defer limit.Stop()
	for _, r := range all {
		r.stop()
		broken := false
		select {
		case <-r.done:
		case <-hurry:
			broken = true
		case <-limit.C:
			broken = true
		}
		if broken {
			log.Warn("work in hand is broken off", zap.String("stage", r.Name))
			breakOff()
			<-r.done
			r.err = errors.Join(r.err, ErrBrokenOff)
		}
		if r.err != nil && first == nil {
			first = fmt.Errorf("%s: %w", r.Name, r.err)
		}
	}
	return first
}

func orEarly(err error) error {
	if err == nil {
		return errors.New("it returned although nobody had stopped it")
	}
	return err
}
