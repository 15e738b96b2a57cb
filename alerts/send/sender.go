package send

import (
	"context"
	"math/rand/v2"
	"slices"
	"sync"
	"time"

	"go.uber.org/zap"
	"golang.org/x/time/rate"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// Config is what a sender works with. A zero length of time is the default.
type Config struct {
	DB         *store.DB
	Channels   map[string]delivery.Channel // by name
	Recipients []pipeline.Recipient
	Sites      []pipeline.Site
	Log        *zap.Logger
	Now        func() time.Time // the clock

	Workers int           // deliveries at once; 4
	Poll    time.Duration // how often it looks without being woken; 2 s
	Timeout time.Duration // the longest that a delivery may take; 2 min
	Lease   time.Duration // how long a sender that ended keeps others from a notice; Timeout and a minute

	// The wait after an attempt that failed doubles from Base, 30 s, up to Most,
	// half an hour; see gather.Backoff.
	Base, Most time.Duration
	// GiveUpAfter is how long after it was due a notice is given up; two days.
	GiveUpAfter time.Duration
	// A recipient gets Burst messages at once, 10, and then one in Every, 10 s.
	Every time.Duration
	Burst int

	// SeenURL and HoldURL make a notice's links; nil for none.
	SeenURL, HoldURL func(key string) string
}

// Sender writes notices and delivers them.
type Sender struct {
	Config
	byID  map[string]*pipeline.Recipient
	sites map[string]*pipeline.Site
	wake  chan struct{} // changes may wait
	due   chan struct{} // notices may be due

	lookedAtAll time.Time // by gathering alone

	mu     sync.Mutex // of taking
	limits map[string]*rate.Limiter
	random func() float64
}

// New returns a sender.
func New(c Config) *Sender {
	or := func(d *time.Duration, otherwise time.Duration) {
		if *d == 0 {
			*d = otherwise
		}
	}
	or(&c.Poll, 2*time.Second)
	or(&c.Timeout, 2*time.Minute)
	or(&c.Lease, c.Timeout+time.Minute)
	or(&c.Base, 30*time.Second)
	or(&c.Most, 30*time.Minute)
	or(&c.GiveUpAfter, 48*time.Hour)
	or(&c.Every, 10*time.Second)
	if c.Workers == 0 {
		c.Workers = 4
	}
	if c.Burst == 0 {
		c.Burst = 10
	}
	s := &Sender{Config: c, byID: map[string]*pipeline.Recipient{}, sites: map[string]*pipeline.Site{}, wake: make(chan struct{}, 1),
		due: make(chan struct{}, c.Workers), limits: map[string]*rate.Limiter{}, random: rand.Float64}
	for i := range c.Recipients {
		s.byID[c.Recipients[i].ID] = &c.Recipients[i]
	}
	for i := range c.Sites {
		s.sites[c.Sites[i].ID] = &c.Sites[i]
	}
	return s
}

// Wake says that changes may wait. It does not block.
func (s *Sender) Wake() {
	select {
	case s.wake <- struct{}{}:
	default:
	}
}

// Run works until intake is over, then finishes the deliveries in hand; once work
// is over too it breaks them off. What fails is logged and tried again.
func (s *Sender) Run(intake, work context.Context) error {
	if len(s.Recipients) == 0 {
		<-intake.Done()
		return nil
	}
	var all sync.WaitGroup
	all.Go(func() { s.gathering(intake) })
	for range s.Workers {
		all.Go(func() { s.delivering(intake, work) })
	}
	all.Wait()
	return nil
}

// gathering writes notices as they become ready.
func (s *Sender) gathering(intake context.Context) {
	for dropped := false; ; {
		if !dropped {
			err := s.DB.DropWaiting(intake, s.hearers(), s.Now())
			dropped = err == nil
			s.report("notices to nobody were not dropped, to be tried again", err, intake)
		}
		s.report("notices were not written, to be tried again", s.gatherWaiting(intake), intake)
		if !s.await(intake, s.wake) {
			return
		}
	}
}

// await waits until there is something on c, or for a while; false if intake is over.
func (s *Sender) await(intake context.Context, c <-chan struct{}) bool {
	timer := time.NewTimer(s.Poll)
	defer timer.Stop()
	select {
	case <-intake.Done():
		return false
	case <-c:
	case <-timer.C:
	}
	return intake.Err() == nil
}

func (s *Sender) report(what string, err error, ctx context.Context) { //nolint:revive // the context says only whether it matters
	if err != nil && ctx.Err() == nil {
		s.Log.Error(what, zap.Error(err))
	}
}

// hearers are all recipients by all their channels.
func (s *Sender) hearers() (out []store.Hearer) {
	for i := range s.Recipients {
		r := &s.Recipients[i]
		for _, c := range s.channelsOf(r) {
			out = append(out, store.Hearer{Recipient: r.ID, Channel: c})
		}
	}
	return out
}

func (s *Sender) channelsOf(r *pipeline.Recipient) []string {
	return slices.DeleteFunc(r.Channels(), func(c string) bool { return s.Channels[c] == nil })
}

// delivering delivers one notice after another.
func (s *Sender) delivering(intake, work context.Context) {
	for intake.Err() == nil {
		n, err := s.take(intake)
		s.report("no notice could be taken, to be tried again", err, intake)
		if n == nil {
			if !s.await(intake, s.due) {
				return
			}
			continue
		}
		s.deliver(work, n)
	}
}

// DeliverDue delivers one after another what is due, until nothing is.
func (s *Sender) DeliverDue(ctx context.Context) error {
	for {
		n, err := s.take(ctx)
		if n == nil || err != nil {
			return err
		}
		s.deliver(ctx, n)
	}
}

// take takes a notice whose recipient may be sent one now.
func (s *Sender) take(ctx context.Context) (*store.DueNotice, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	now := s.Now()
	var enough []string
	for id, l := range s.limits {
		if l.TokensAt(now) < 1 {
			enough = append(enough, id)
		}
	}
	n, err := s.DB.TakeNotice(ctx, now, s.Lease, enough)
	if n == nil || err != nil {
		return nil, err
	}
	l := s.limits[n.Recipient]
	if l == nil {
		l = rate.NewLimiter(rate.Every(s.Every), s.Burst)
		s.limits[n.Recipient] = l
	}
	l.AllowN(now, 1)
	return n, nil
}
