package gather

import (
	"slices"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// Change is a change of a standing that waits to be told to one recipient by one
// channel.
type Change struct {
	ID       int64
	About    string // the standing
	From, To pipeline.State
	Why      string

	// HandedOn says that it was told to somebody else, who did not mark it as seen.
	HandedOn bool
	// Note is why it is told though it may have been told before; "" for none.
	Note string
}

// Told is what a notice said of a standing, to one recipient by one channel.
type Told struct {
	Key   string // of the notice
	At    time.Time
	Kind  delivery.Kind
	State pipeline.State
	Seen  bool // somebody whom it was meant for has marked it as seen
}

// Line is what a message says of one standing.
type Line struct {
	About string
	Kind  delivery.Kind
	From  pipeline.State // what was last told, or what stood before the first change
	To    pipeline.State // what stands now
	Why   string         // of the last change; empty in a reminder

	Changes []int64          // that it tells
	Passed  []pipeline.State // states that came and went while it waited
	Notes   []string
	Earlier []Told // notices about the same, since it was last within; oldest first
}

// Aside is why a change ends in no message.
type Aside struct {
	ID  int64
	Why string
}

// The reasons for which a change is set aside.
const (
	NothingChanged = "what stands now is what was told before"
	NotListened    = "what stands now is not among the states to be heard of"
	NotWatched     = "the surface is no longer judged"
)

// Compose says of each standing what a message has to say, in the order of its
// first change. told is what the recipient has been told by the channel, oldest
// first, and now how each stands; a standing that is not in now is judged no
// more. states are those to be heard of by this channel, for each standing. Each
// change is in exactly one line, or set aside.
func Compose(changes []Change, told map[string][]Told, now map[string]pipeline.State, states func(about string) []pipeline.State) (lines []Line, aside []Aside) {
	byAbout := map[string][]Change{}
	var order []string
	for _, c := range changes {
		if byAbout[c.About] == nil {
			order = append(order, c.About)
		}
		byAbout[c.About] = append(byAbout[c.About], c)
	}
	for _, about := range order {
		group := byAbout[about]
		stands, watched := now[about]
		l, why := Line{}, NotWatched
		if watched {
			l, why = line(group, told[about], stands, states(about))
		}
		if why == "" {
			lines = append(lines, l)
			continue
		}
		for _, c := range group {
			aside = append(aside, Aside{c.ID, why})
		}
	}
	return lines, aside
}

// line returns a line, or why there is none.
func line(group []Change, told []Told, stands pipeline.State, states []pipeline.State) (Line, string) {
	last := group[len(group)-1]
	l := Line{About: last.About, From: group[0].From, To: stands, Why: last.Why, Earlier: sinceWithin(told)}
	base := pipeline.Within
	if len(told) > 0 {
		base = told[len(told)-1].State
		l.From = base
	}
	corrected, handed := false, false
	for _, c := range group {
		l.Changes = append(l.Changes, c.ID)
		corrected = corrected || Corrects(c.Why) && rank[c.To] < rank[c.From]
		handed = handed || c.HandedOn || c.Note != ""
		if c.Note != "" && !slices.Contains(l.Notes, c.Note) {
			l.Notes = append(l.Notes, c.Note)
		}
		if c.To != stands && c.To != base && !slices.Contains(l.Passed, c.To) {
			l.Passed = append(l.Passed, c.To)
		}
	}
	switch {
	case stands == base && len(l.Notes) == 0:
		return l, NothingChanged
	case !handed && !tells(states, base, stands, corrected):
		return l, NotListened
	case stands == base && len(l.Earlier) > 0:
		l.Kind = delivery.Reminder
	case len(l.Earlier) == 0:
		l.Kind = delivery.News
	case corrected && rank[stands] < rank[base]:
		l.Kind = delivery.Withdrawal
	default:
		l.Kind = delivery.Update
	}
	return l, ""
}

// sinceWithin returns what was told after a standing was last said to be within.
func sinceWithin(told []Told) []Told {
	for i := len(told) - 1; i >= 0; i-- {
		if told[i].State == pipeline.Within {
			return told[i+1:]
		}
	}
	return told
}

// KindOf returns the kind of a message of lines: theirs, or update if they differ.
func KindOf(lines []Line) delivery.Kind {
	kind := lines[0].Kind
	for _, l := range lines {
		if l.Kind != kind {
			return delivery.Update
		}
	}
	return kind
}
