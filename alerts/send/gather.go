package send

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"maps"
	"slices"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/gather"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// remembered is how far back notices count as told: more than any season lasts.
const remembered = 500 * 24 * time.Hour

// everybody is how often reminders are looked for.
const everybody = 30 * time.Second

// charts is how many standings of a message are drawn; the mail shows no more.
const charts = 4

// Gather writes the notices that are ready, reminders and what is handed on
// included. A recipient for whom it fails does not keep the others waiting.
func (s *Sender) Gather(ctx context.Context) error {
	var all []string
	for i := range s.Recipients {
		all = append(all, s.Recipients[i].ID)
	}
	return s.gatherFor(ctx, all)
}

// gatherWaiting does that for recipients for whom something waits; from time to
// time for all, since reminders come due of themselves.
func (s *Sender) gatherWaiting(ctx context.Context) error {
	if now := s.Now(); now.Sub(s.lookedAtAll) >= everybody || now.Before(s.lookedAtAll) {
		s.lookedAtAll = now
		return s.Gather(ctx)
	}
	waiting, err := s.DB.RecipientsWaiting(ctx)
	if err != nil {
		return err
	}
	return s.gatherFor(ctx, waiting)
}

func (s *Sender) gatherFor(ctx context.Context, recipients []string) error {
	var failed []error
	for _, id := range recipients {
		r := s.byID[id]
		if r == nil {
			continue
		}
		err := s.DB.Gather(ctx, id, func(g *store.Gathering) error { return s.gather(ctx, g, r) })
		if err != nil && !errors.Is(err, store.ErrBusy) {
			failed = append(failed, fmt.Errorf("write to %s: %w", id, err))
		}
	}
	return errors.Join(failed...)
}

// gather writes one message to a recipient, if there is something to say.
func (s *Sender) gather(ctx context.Context, g *store.Gathering, r *pipeline.Recipient) error {
	now := s.Now()
	waiting, err := g.Waiting(ctx, now)
	if err != nil {
		return err
	}
	told, err := g.Told(ctx, now.Add(-remembered))
	if err != nil {
		return err
	}
	abouts := map[string]bool{}
	for _, w := range waiting {
		abouts[w.About] = true
	}
	for _, t := range told {
		abouts[t.About] = true
	}
	if len(abouts) == 0 {
		return nil
	}
	stands, err := g.Now(ctx, slices.Collect(maps.Keys(abouts)), now)
	if err != nil {
		return err
	}
	ready, err := s.ready(ctx, g, r, waiting, now)
	if err != nil {
		return err
	}
	wrote := false
	for _, channel := range s.channelsOf(r) {
		w, err := s.tell(ctx, g, r, channel, ready, told, stands, now)
		if err != nil {
			return err
		}
		wrote = wrote || w
	}
	if wrote {
		s.nudge()
	}
	return s.handOn(ctx, g, r, told, stands, now)
}

// ready returns the changes that are told now: none, or all that are not held.
func (s *Sender) ready(ctx context.Context, g *store.Gathering, r *pipeline.Recipient, waiting []store.WaitingChange, now time.Time) ([]store.WaitingChange, error) {
	var first time.Time
	free := slices.DeleteFunc(waiting, func(w store.WaitingChange) bool { return w.Held })
	for _, w := range free {
		if first.IsZero() || w.NotedAt.Before(first) {
			first = w.NotedAt
		}
	}
	if len(free) == 0 {
		return nil, nil
	}
	busy := false
	if r.GatherFor > 0 {
		var err error
		if busy, err = g.Busy(ctx); err != nil {
			return nil, err
		}
	}
	if yes, _ := gather.Ready(r, first, busy, now); !yes {
		return nil, nil
	}
	return free, nil
}

// tell writes the notice of a message that goes by one channel, and says whether
// there was one to write.
func (s *Sender) tell(ctx context.Context, g *store.Gathering, r *pipeline.Recipient, channel string, ready []store.WaitingChange, told []store.ToldLine,
	stands map[string]store.StandsAs, now time.Time) (bool, error) {
	var changes []gather.Change
	for _, w := range ready {
		if w.Channel == channel {
			changes = append(changes, gather.Change{ID: w.ID, About: w.About, From: w.From, To: w.To, Why: w.Why, HandedOn: w.HandedFrom != "", Note: w.Note})
		}
	}
	past := byAbout(told, channel)
	nowBy, open := map[string]pipeline.State{}, map[string]pipeline.State{}
	for about, st := range stands {
		nowBy[about] = st.State
		if !st.Over && !st.Held {
			open[about] = st.State
		}
	}
	lines, aside := gather.Compose(changes, past, nowBy, func(about string) []pipeline.State { return s.states(r, channel, stands[about]) })
	for _, a := range aside {
		if err := g.SetAside(ctx, channel, a.ID, a.Why, now); err != nil {
			return false, err
		}
	}
	lines = append(lines, gather.Remind(r, past, open, lines, now)...)
	if len(lines) == 0 {
		return false, nil
	}
	return true, s.write(ctx, g, r, channel, lines, stands, now)
}

func byAbout(told []store.ToldLine, channel string) map[string][]gather.Told {
	out := map[string][]gather.Told{}
	for _, t := range told {
		if channel == "" || t.Channel == channel {
			out[t.About] = append(out[t.About], gather.Told{Key: t.Key, At: t.At, Kind: delivery.Kind(t.Kind), State: t.State, Seen: t.Seen})
		}
	}
	return out
}

// states are the states of a standing that a recipient hears of by a channel.
func (s *Sender) states(r *pipeline.Recipient, channel string, st store.StandsAs) []pipeline.State {
	site := s.sites[st.Site]
	if site == nil {
		return nil
	}
	return gather.States(r, channel, site, st.Surface)
}

func (s *Sender) write(ctx context.Context, g *store.Gathering, r *pipeline.Recipient, channel string, lines []gather.Line, stands map[string]store.StandsAs, now time.Time) error {
	n := &store.NewNotice{Channel: channel, Kind: string(gather.KindOf(lines)), At: now}
	c := content{Version: contentVersion, Recipient: recipient{Name: r.Name, Unit: r.Unit, Zone: r.Zone.String()}}
	for i := range lines {
		l := &lines[i]
		st := stands[l.About]
		f, err := g.Figures(ctx, st.Design, st.Season)
		if err != nil {
			return err
		}
		if f == nil {
			return fmt.Errorf("the standing %s went while it was written about", l.About)
		}
		item := s.item(l, f)
		if i < charts {
			days, past, seasons, err := g.Curve(ctx, f)
			if err != nil {
				return err
			}
			item.Chart = chart(days, past, seasons)
		}
		c.Items = append(c.Items, item)
		for _, note := range l.Notes {
			if !slices.Contains(c.Cautions, note) {
				c.Cautions = append(c.Cautions, note)
			}
		}
		ni := store.NewItem{About: l.About, Kind: string(l.Kind), From: l.From, Figures: f, Changes: l.Changes}
		if first, ok := item.First(); ok {
			ni.First = first.Key
			if n.First == "" {
				n.First = first.Key
			}
		}
		n.Items = append(n.Items, ni)
	}
	var err error
	if n.Content, err = json.Marshal(c); err != nil {
		return fmt.Errorf("write content of a notice to %s: %w", r.ID, err)
	}
	key, err := g.Write(ctx, n)
	if err != nil {
		return err
	}
	s.Log.Info("notice written", zap.String("notice", key), zap.String("recipient", r.ID), zap.String("channel", channel), zap.String("kind", n.Kind), zap.Int("items", len(n.Items)))
	return nil
}

// handOn has the next recipient told of what was not marked as seen in time.
func (s *Sender) handOn(ctx context.Context, g *store.Gathering, r *pipeline.Recipient, told []store.ToldLine, stands map[string]store.StandsAs, now time.Time) error {
	next := s.byID[r.Next]
	if next == nil {
		return nil
	}
	open := map[string]pipeline.State{}
	for about, st := range stands {
		if !st.Held && (!st.Over || st.State == pipeline.FellShort) {
			open[about] = st.State
		}
	}
	if abouts := gather.HandOn(r, byAbout(told, ""), open, now); len(abouts) > 0 {
		return g.HandOn(ctx, next.ID, s.channelsOf(next), abouts, now)
	}
	return nil
}
