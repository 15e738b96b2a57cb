package gather

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

var allStates = []pipeline.State{pipeline.Exceeded, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.Within, pipeline.FellShort}

// said is what was told by states alone.
func said(states ...pipeline.State) (out []Told) {
	for i, s := range states {
		out = append(out, Told{Key: fmt.Sprint("n", i+1), State: s})
	}
	return out
}

// moves reads "near>exceeded progress" and so on as changes 1, 2, ...
func moves(lines ...string) (out []Change) {
	for i, l := range lines {
		states, why, _ := strings.Cut(l, " ")
		from, to, _ := strings.Cut(states, ">")
		out = append(out, Change{ID: int64(i + 1), About: "a", From: pipeline.State(from), To: pipeline.State(to), Why: why})
	}
	return out
}

func TestCompose(t *testing.T) {
	exceededOnly := []pipeline.State{pipeline.Exceeded}
	for _, test := range []struct {
		name    string
		changes []Change
		told    []Told
		now     pipeline.State
		states  []pipeline.State
		want    string // kind from>to, passed, earlier; or why there is none
	}{
		{"first", moves("within>near progress"), nil, pipeline.Near, allStates, "news within>near [] []"},
		{"first judgement", moves(">exceeded first judgement"), nil, pipeline.Exceeded, allStates, "news >exceeded [] []"},
		{"on from there", moves("near>exceeded progress"), said(pipeline.Near), pipeline.Exceeded, allStates, "update near>exceeded [] [n1]"},
		{"two at once", moves("within>near progress", "near>exceeded progress"), nil, pipeline.Exceeded, allStates, "news within>exceeded [near] []"},
		{"came and went", moves("within>near progress", "near>within correction"), nil, pipeline.Within, allStates, NothingChanged},
		{"came and went, told before", moves("near>exceeded progress", "exceeded>near correction"), said(pipeline.Near), pipeline.Near, allStates, NothingChanged},
		{"came and went in part", moves("within>exceeded progress", "exceeded>near correction"), nil, pipeline.Near, allStates, "news within>near [exceeded] []"},
		{"withdrawn", moves("exceeded>near correction"), said(pipeline.Near, pipeline.Exceeded), pipeline.Near, allStates, "withdrawal exceeded>near [] [n1 n2]"},
		{"withdrawn for who hears of exceeded", moves("exceeded>near correction"), said(pipeline.Exceeded), pipeline.Near, exceededOnly, "withdrawal exceeded>near [] [n1]"},
		{"withdrawn to within", moves("exceeded>within correction"), said(pipeline.Exceeded), pipeline.Within, exceededOnly, "withdrawal exceeded>within [] [n1]"},
		{"by another design value", moves("exceeded>within design value replaced"), said(pipeline.Exceeded), pipeline.Within, allStates, "withdrawal exceeded>within [] [n1]"},
		{"withdrawn before it was told", moves("exceeded>near correction"), nil, pipeline.Near, exceededOnly, NotListened},
		{"back by itself", moves("expected>within outlook"), said(pipeline.Expected), pipeline.Within, allStates, "update expected>within [] [n1]"},
		{"back by itself, not to be heard", moves("expected>within outlook"), said(pipeline.Expected), pipeline.Within, []pipeline.State{pipeline.Expected}, NotListened},
		{"a rise not to be heard", moves("near>expected outlook"), said(pipeline.Near), pipeline.Expected, []pipeline.State{pipeline.Near}, NotListened},
		{"again", moves("within>near progress"), said(pipeline.Near, pipeline.Within), pipeline.Near, allStates, "news within>near [] []"},
		{"kept until it stands otherwise", moves("within>near progress"), nil, pipeline.Exceeded, allStates, "news within>exceeded [near] []"},
		{"handed on", []Change{{ID: 1, About: "a", From: pipeline.Near, To: pipeline.Exceeded, HandedOn: true}}, nil, pipeline.Exceeded, []pipeline.State{pipeline.Near}, "news near>exceeded [] []"},
		{"with a note", []Change{{ID: 1, About: "a", From: pipeline.Near, To: pipeline.Exceeded, Note: "undelivered"}}, said(pipeline.Exceeded), pipeline.Exceeded, allStates, "reminder exceeded>exceeded [] [n1]"},
		{"back where it was told to stand", moves("near>exceeded progress"), said(pipeline.Exceeded), pipeline.Exceeded, allStates, NothingChanged},
		{"no longer judged", moves("within>near progress"), nil, "", allStates, NotWatched},
	} {
		t.Run(test.name, func(t *testing.T) {
			now := map[string]pipeline.State{"a": test.now}
			if test.now == "" {
				now = nil
			}
			lines, aside := Compose(test.changes, map[string][]Told{"a": test.told}, now, func(string) []pipeline.State { return test.states })
			got := ""
			for _, l := range lines {
				var keys []string
				for _, e := range l.Earlier {
					keys = append(keys, e.Key)
				}
				got = fmt.Sprintf("%s %s>%s %v %v", l.Kind, l.From, l.To, l.Passed, keys)
			}
			for _, a := range aside {
				got = a.Why
			}
			if got != test.want {
				t.Errorf("%s, want %s", got, test.want)
			}
		})
	}
}

// A run of changes at any times, with holds and reminders left out: whatever the
// burst, a message goes out at most once in the time for gathering, every change
// is in exactly one message or set aside, nothing is told in quiet hours, and in
// the end what was told last is what stands.
func TestNothingIsLostAndNothingStorms(t *testing.T) {
	alaska := zone(t, "America/Anchorage")
	rapid.Check(t, func(t *rapid.T) {
		r := &pipeline.Recipient{Zone: alaska, Quiet: hours("22:00", "06:00"), GatherFor: time.Duration(rapid.IntRange(0, 30).Draw(t, "gather")) * time.Minute}
		start := time.Date(2031, rapid.SampledFrom([]time.Month{3, 7, 11}).Draw(t, "month"), 1, 0, 0, 0, 0, alaska)
		now := map[string]pipeline.State{}
		told := map[string][]Told{}
		ended := map[int64]string{} // change -> message or why it was set aside
		var waiting []Change
		var first time.Time
		var messages []time.Time
		n := int64(0)
		at := start
		look := func() {
			if len(waiting) == 0 {
				return
			}
			if yes, _ := Ready(r, first, false, at); !yes {
				return
			}
			lines, aside := Compose(waiting, told, now, func(string) []pipeline.State { return allStates })
			key := fmt.Sprint("m", len(messages))
			for _, l := range lines {
				for _, id := range l.Changes {
					if ended[id] != "" {
						t.Fatalf("change %d is told twice", id)
					}
					ended[id] = key
				}
				told[l.About] = append(told[l.About], Told{Key: key, At: at, Kind: l.Kind, State: l.To})
				if (l.Kind == delivery.Withdrawal || l.Kind == delivery.Update) && len(l.Earlier) == 0 {
					t.Fatalf("%s cites nothing", l.Kind)
				}
			}
			for _, a := range aside {
				if ended[a.ID] != "" {
					t.Fatalf("change %d is told and set aside", a.ID)
				}
				ended[a.ID] = a.Why
			}
			if len(lines) > 0 {
				messages = append(messages, at)
			}
			waiting = nil
		}
		for range rapid.IntRange(1, 40).Draw(t, "bursts") {
			at = at.Add(time.Duration(rapid.IntRange(0, 300).Draw(t, "minutes")) * time.Minute)
			look()
			for range rapid.IntRange(0, 30).Draw(t, "changes") {
				about := rapid.SampledFrom([]string{"a", "b", "c"}).Draw(t, "about")
				from := now[about]
				to := rapid.SampledFrom(allStates).Draw(t, "to")
				if from == to || from == "" && to == pipeline.Within {
					continue
				}
				n++
				now[about] = to
				if len(waiting) == 0 {
					first = at
				}
				waiting = append(waiting, Change{ID: n, About: about, From: from, To: to, Why: rapid.SampledFrom([]string{"progress", correction, "gap"}).Draw(t, "why")})
			}
			look()
		}
		for range 2 * 24 * 60 {
			at = at.Add(time.Minute)
			look()
		}
		for id := range n {
			if ended[id+1] == "" {
				t.Fatalf("change %d was lost", id+1)
			}
		}
		for about, state := range now {
			last := pipeline.Within
			if list := told[about]; len(list) > 0 {
				last = list[len(list)-1].State
			}
			if last != state {
				t.Fatalf("%s: told %s, it stands at %s", about, last, state)
			}
		}
		for i, m := range messages {
			if h := m.In(alaska).Hour(); h >= 22 || h < 6 {
				t.Fatalf("told at %s", m)
			}
			if i > 0 && m.Sub(messages[i-1]) < r.GatherFor {
				t.Fatalf("%s after %s", m, messages[i-1])
			}
		}
	})
}

func TestHeard(t *testing.T) {
	site := &pipeline.Site{ID: "strip", Tags: []string{"airfields"}}
	r := &pipeline.Recipient{Hears: []pipeline.Hearing{
		{Tags: []string{"roads", "airfields"}, Surfaces: []string{"apron"}, States: []pipeline.State{pipeline.Exceeded}, Channels: []string{"post"}},
		{Sites: []string{"strip"}, States: []pipeline.State{pipeline.Near, pipeline.Within}, Channels: []string{"hook", "post"}},
		{Sites: []string{"dock"}, Channels: []string{"feed"}},
	}}
	for _, test := range []struct {
		surface, from, to, why string
		want                   []string
	}{
		{"apron", "near", "exceeded", "progress", []string{"post"}},
		{"runway", "near", "exceeded", "progress", nil},
		{"apron", "within", "near", "progress", []string{"hook", "post"}},
		{"apron", "exceeded", "unknown", "correction", []string{"post"}},
		{"apron", "exceeded", "within", "correction", []string{"post", "hook"}},
		{"apron", "expected", "within", "outlook", []string{"hook", "post"}},
		{"apron", "near", "expected", "outlook", nil},
	} {
		got := Heard(r, site, test.surface, pipeline.State(test.from), pipeline.State(test.to), test.why)
		if diff := cmp.Diff(test.want, got); diff != "" {
			t.Errorf("%+v, - wanted, + got:\n%s", test, diff)
		}
	}
	if got := Heard(r, &pipeline.Site{ID: "dock"}, "x", "", pipeline.Unknown, "gap"); !slices.Equal(got, []string{"feed"}) {
		t.Errorf("of another site by %v", got)
	}
}

func TestRemindAndHandOn(t *testing.T) {
	noon := time.Date(2031, 7, 20, 12, 0, 0, 0, time.UTC)
	ago := func(h float64, s pipeline.State, seen bool) Told {
		return Told{Key: "n", At: noon.Add(-time.Duration(h * float64(time.Hour))), State: s, Seen: seen}
	}
	told := map[string][]Told{
		"late":      {ago(30, pipeline.Near, false), ago(24, pipeline.Exceeded, false)},
		"nearly":    {ago(23.9, pipeline.Exceeded, false)},
		"later":     {ago(20, pipeline.Exceeded, false)},
		"recent":    {ago(1, pipeline.Exceeded, false)},
		"seen":      {ago(50, pipeline.Exceeded, true), ago(26, pipeline.Exceeded, false)},
		"seen once": {ago(90, pipeline.Exceeded, true), ago(60, pipeline.Near, false), ago(30, pipeline.Exceeded, false)},
		"over":      {ago(30, pipeline.Exceeded, false)},
		"near":      {ago(30, pipeline.Near, false)},
		"short":     {ago(30, pipeline.FellShort, false)},
	}
	now := map[string]pipeline.State{"late": pipeline.Exceeded, "nearly": pipeline.Exceeded, "later": pipeline.Exceeded, "recent": pipeline.Exceeded,
		"seen": pipeline.Exceeded, "seen once": pipeline.Exceeded, "over": pipeline.Near, "near": pipeline.Near, "short": pipeline.FellShort}
	r := &pipeline.Recipient{RemindEvery: 24 * time.Hour, GatherFor: 10 * time.Minute, Next: "chief", NextAfter: 4 * time.Hour}
	abouts := func(lines []Line) (out []string) {
		for _, l := range lines {
			out = append(out, l.About)
			if l.Kind != delivery.Reminder || len(l.Earlier) == 0 {
				t.Errorf("%+v", l)
			}
		}
		return out
	}
	same := func(what string, got []string, want ...string) {
		if !slices.Equal(got, want) {
			t.Errorf("%s: %q, want %q", what, got, want)
		}
	}
	same("reminded", abouts(Remind(r, told, now, nil, noon)), "late", "nearly", "seen once")
	same("with a message that tells of one", abouts(Remind(r, told, now, []Line{{About: "late"}}, noon)), "nearly", "seen once")
	same("handed on", HandOn(r, told, now, noon), "late", "later", "nearly", "seen once", "short")
	r.Quiet = hours("11:00", "13:00")
	same("at night", abouts(Remind(r, told, now, nil, noon)))
	r.Quiet, r.RemindEvery, r.Next = nil, 0, ""
	same("never", abouts(Remind(r, told, now, nil, noon)))
	same("to nobody", HandOn(r, told, now, noon))
}

func TestBackoff(t *testing.T) {
	const base, most = 30 * time.Second, 30 * time.Minute
	for _, test := range []struct {
		attempt int
		share   float64
		asked   time.Duration
		want    time.Duration
	}{
		{1, 1, 0, 30 * time.Second}, {1, 0.5, 0, 15 * time.Second}, {1, 0, 0, 0}, {4, 1, 0, 4 * time.Minute}, {6, 1, 0, 16 * time.Minute},
		{7, 1, 0, most}, {1000000, 1, 0, most}, {1, 0.1, time.Hour, time.Hour},
	} {
		if got := Backoff(test.attempt, base, most, test.asked, test.share); got != test.want {
			t.Errorf("%+v: %s", test, got)
		}
	}
}
