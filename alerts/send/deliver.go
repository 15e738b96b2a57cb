package send

import (
	"context"
	"fmt"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/gather"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// recording is how long the outcome of an attempt may take to be recorded, even
// when work is over.
const recording = 10 * time.Second

// deliver hands a notice to its channel and records what came of it.
func (s *Sender) deliver(work context.Context, n *store.DueNotice) {
	log := s.Log.With(zap.String("notice", n.Key), zap.String("recipient", n.Recipient), zap.String("channel", n.Channel), zap.Int("attempt", n.Attempt))
	out := s.hand(work, n)
	end := s.end(n, out)
	ctx, cancel := context.WithTimeout(context.WithoutCancel(work), recording)
	defer cancel()
	var operator string
	var channels []string
	if r := s.byID[pipeline.Operator]; r != nil && end.GiveUp != "" {
		operator, channels = r.ID, s.channelsOf(r)
	}
	if err := s.DB.EndAttempt(ctx, n, end, operator, channels); err != nil {
		// The lease runs out and the notice is sent again, with the same key.
		log.Error("outcome of an attempt is not recorded", zap.Bool("delivered", out.Delivered), zap.Error(err))
		return
	}
	switch {
	case end.Delivered:
		log.Info("notice delivered", zap.String("answer", end.Answer))
		s.nudge() // the next to the same recipient may go
	case end.GiveUp != "":
		log.Error("notice given up", zap.String("why", end.GiveUp))
		s.nudge()
		s.Wake()
	default:
		log.Warn("notice not delivered, to be tried again", zap.String("answer", end.Answer), zap.Time("next", end.Next))
	}
}

func (s *Sender) nudge() {
	select {
	case s.due <- struct{}{}:
	default:
	}
}

// hand calls the channel.
func (s *Sender) hand(work context.Context, n *store.DueNotice) delivery.Outcome {
	c := s.Channels[n.Channel]
	if c == nil {
		return delivery.Failed(true, fmt.Sprintf("the settings have no channel %s", n.Channel))
	}
	notice, err := s.notice(n)
	if err != nil {
		return delivery.Failed(false, err.Error())
	}
	ctx, cancel := context.WithTimeout(work, s.Timeout)
	defer cancel()
	return c.Deliver(ctx, notice)
}

// end decides what follows from an outcome.
func (s *Sender) end(n *store.DueNotice, out delivery.Outcome) store.AttemptEnd {
	now := s.Now()
	e := store.AttemptEnd{At: now, Delivered: out.Delivered, Again: out.Again, Answer: out.Answer}
	if out.Delivered {
		return e
	}
	e.Next = now.Add(gather.Backoff(n.Attempt, s.Base, s.Most, out.After, s.random()))
	switch {
	case !out.Again:
		e.GiveUp = fmt.Sprintf("refused for good: %s", out.Answer)
	case e.Next.Sub(n.DueAt) > s.GiveUpAfter:
		e.GiveUp = fmt.Sprintf("not delivered in %s and %d attempts: %s", now.Sub(n.DueAt).Round(time.Second), n.Attempt, out.Answer)
	}
	return e
}
