package outlook

import (
	"errors"
	"math"
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// By hand. Every day is at -1 degC but for 1 to 20 June of past years, at +1, and
// 1 to 5 May of this year, likewise. On 10 May this year's curve index to date is
// 5; each past year still brings a rise of 20. The low of the joined curve is on
// 31 May, though, below the one of April: the season's index is 20. Just adding
// would make it 25, and have it pass 22. The sum index is 25.
func TestRelapseMovesTheLow(t *testing.T) {
	days := plain(2001, 22, func(y int, m time.Month, d int) float64 {
		if y < 2022 && m == time.June && d <= 20 || y == 2022 && m == time.May && d <= 5 {
			return 1
		}
		return -1
	})
	r := NewRecord(days)
	o, err := r.Outlook(thawCurve, day("2022-05-10"), Raw)
	if err != nil {
		t.Fatal(err)
	}
	if n := len(o.Members); n != 21 { // 2001 to 2021
		t.Errorf("members %v", o.Members)
	}
	if o.ToDate != (degreeday.Bounds{Low: 5, High: 5}) {
		t.Errorf("to date %v; want 5", o.ToDate)
	}
	if got := o.End().P50; got != (degreeday.Bounds{Low: 20, High: 20}) {
		t.Errorf("end %v; want 20", got)
	}
	n := float64(len(o.Members))
	if got, want := o.Passing(22).Probability.Low, 0.5/(n+1); math.Abs(got-want) > 1e-15 {
		t.Errorf("passes 22 with %v; want %v", got, want)
	}
	p := o.Passing(20)
	if want := (n + 0.5) / (n + 1); math.Abs(p.Probability.Low-want) > 1e-15 {
		t.Errorf("comes to 20 with %v; want %v", p.Probability.Low, want)
	}
	if !p.HasOn || p.On.P50 != day("2022-06-20") || p.On.P10 != p.On.P90 {
		t.Errorf("comes to 20 on %v", p.On)
	}
	sum := thawCurve
	sum.Definition = pipeline.Sum
	if o, err = r.Outlook(sum, day("2022-05-10"), Raw); err != nil {
		t.Fatal(err)
	}
	if got := o.End().P50.Low; got != 25 {
		t.Errorf("sum %v; want 25", got)
	}
}

// A joined path is this year's days and then the member's days of the same
// dates, and its index is that of any season: every member against
// degreeday.Build, day by day, by dates.
func TestJoinedPathsAreSeasons(t *testing.T) {
	r := NewRecord(tundra.days(1990, 34, 7))
	for _, starts := range []pipeline.MonthDay{january15, {Month: time.July, Day: 15}, {Month: time.February, Day: 29}, {Month: time.March, Day: 1}} {
		for _, q := range []Question{
			{Kind: pipeline.Thaw, Definition: pipeline.Curve, Starts: starts}, {Kind: pipeline.Freeze, Definition: pipeline.Curve, BaseC: -1, Starts: starts},
			{Kind: pipeline.Freeze, Definition: pipeline.Sum, Starts: starts},
		} {
			for _, through := range []string{"2020-02-20", "2020-02-28", "2020-02-29", "2020-07-14", "2021-05-06", "2023-02-28", "2023-11-30", "2020-01-14"} {
				o, err := r.Outlook(q, day(through), Raw)
				if err != nil {
					t.Fatal(err)
				}
				for i, number := range o.Members {
					path := joinedByDate(r, o, number)
					s := degreeday.Build(q.Kind, o.Window, "", q.BaseC, path, o.Window.Last)
					for k, d := range s.Days {
						want := d.CurveToDate.Low
						if q.Definition == pipeline.Sum {
							want = d.Sum.Low
						}
						if got := o.low.paths[i][k]; got != want {
							t.Fatalf("%v through %s, member %d, %s: %v; want %v", q, through, number, d.Day, got, want)
						}
					}
				}
			}
		}
	}
}

// joinedByDate joins by month and day, in the plainest way.
func joinedByDate(r *Record, o *Outlook, member int) []degreeday.DayMean {
	number, _, _ := o.Window.First.Date()
	var out []degreeday.DayMean
	for d := o.Window.First; d <= o.Window.Last; d++ {
		from := d
		if d > o.Through {
			y, m, dom := d.Date()
			y += member - number
			from = pipeline.DayOf(y, m, dom)
			if _, _, got := from.Date(); got != dom { // no 29 February
				a, b := r.days[pipeline.DayOf(y, time.February, 28)-r.First()].MeanC, r.days[pipeline.DayOf(y, time.March, 1)-r.First()].MeanC
				out = append(out, known(d, (a+b)/2))
				continue
			}
		}
		out = append(out, known(d, r.days[from-r.First()].MeanC))
	}
	return out
}

// At a season's end what is said is what was, but for the plotting rule.
func TestAtTheSeasonsEnd(t *testing.T) {
	r := NewRecord(tundra.days(1990, 34, 3))
	for _, which := range []Which{Raw, Moved} {
		o, err := r.Outlook(thawCurve, day("2023-01-13"), which) // a day is left, at the depth of winter
		if err != nil {
			t.Fatal(err)
		}
		s := degreeday.Build(pipeline.Thaw, o.Window, "", 0, r.days[o.Window.First-r.First():o.Window.Last-r.First()+1], r.Last())
		was, n := s.Curve.Index.Low, float64(len(o.Members))
		if got := o.End(); got.P10.Low != was || got.P90.High != was {
			t.Errorf("%s: end %v; it was %v", which, got, was)
		}
		below, above := o.Passing(was-0.1), o.Passing(was+0.1)
		if below.Probability.Low != (n+0.5)/(n+1) || !below.Passed || above.Probability.High != 0.5/(n+1) || above.Passed {
			t.Errorf("%s: %v and %v", which, below, above)
		}
		if got, want := above.FallsShort().Low, (n+0.5)/(n+1); math.Abs(got-want) > 1e-15 || above.Adverse(pipeline.NotBelow) != above.FallsShort() {
			t.Errorf("%s: falls short with %v; want %v", which, got, want)
		}
	}
}

// Warmth added to a day of this year, or (raw) of a member, never makes a thawing
// index less likely to pass anything, nor a freezing one more likely.
func TestWarmthNeverLowersTheChance(t *testing.T) {
	base := tundra.days(2000, 23, 11)
	rapid.Check(t, func(t *rapid.T) {
		q := Question{
			Kind:       rapid.SampledFrom([]pipeline.Kind{pipeline.Thaw, pipeline.Freeze}).Draw(t, "kind"),
			Definition: rapid.SampledFrom([]pipeline.Definition{pipeline.Curve, pipeline.Sum}).Draw(t, "definition"), Starts: january15,
		}
		which := rapid.SampledFrom([]Which{Raw, Moved}).Draw(t, "which")
		through := day("2022-01-15") + pipeline.Day(rapid.IntRange(0, 330).Draw(t, "through"))
		first := day("2022-01-15")
		if which == Raw {
			first = base[0].Day
		}
		from := first + pipeline.Day(rapid.IntRange(0, int(through-first)).Draw(t, "from"))
		count := rapid.IntRange(1, 60).Draw(t, "count")
		more := rapid.Float64Range(0, 20).Draw(t, "more")
		warmer := slices.Clone(base)
		for i := range warmer {
			if d := &warmer[i]; d.Day >= from && d.Day < from+pipeline.Day(count) && (which == Raw || d.Day <= through) {
				*d = known(d.Day, d.MeanC+more)
			}
		}
		before, err := NewRecord(base).Outlook(q, through, which)
		if err != nil {
			t.Fatal(err)
		}
		after, err := NewRecord(warmer).Outlook(q, through, which)
		if err != nil {
			t.Fatal(err)
		}
		if q.Kind == pipeline.Freeze {
			before, after = after, before
		}
		threshold := rapid.Float64Range(0, 5000).Draw(t, "threshold")
		if a, b := before.Passing(threshold), after.Passing(threshold); b.Probability.Low < a.Probability.Low {
			t.Fatalf("%v before, %v after", a, b)
		}
		for _, share := range shares {
			if a, b := Quantile(before.low.ends, share), Quantile(after.low.ends, share); b < a {
				t.Fatalf("end %v before, %v after", a, b)
			}
		}
	})
}

// Moved to a climate with a trend and nothing else, every member is this year
// again; raw ones are not.
func TestMovedFollowsTheTrend(t *testing.T) {
	c := climate{meanC: -10, amplitudeC: 18, trendC: 0.05}
	days := plain(1990, 32, func(y int, m time.Month, d int) float64 {
		phase := 2 * math.Pi * float64(int(m)*30+d-200) / 365
		return c.meanC + c.amplitudeC*math.Cos(phase) + c.trendC*float64(y-1990)
	})
	r := NewRecord(days)
	o, err := r.Outlook(thawCurve, day("2021-01-14"), Moved)
	if err != nil {
		t.Fatal(err)
	}
	w := o.Window
	s := degreeday.Build(pipeline.Thaw, w, "", 0, append(slices.Clone(days[w.First-days[0].Day:]), joinedTail(days, w)...), w.Last)
	if got := o.End(); math.Abs(got.P10.Low-s.Curve.Index.Low) > 0.5 || math.Abs(got.P90.Low-s.Curve.Index.Low) > 0.5 {
		t.Errorf("moved %v; the season is %v", got, s.Curve.Index.Low)
	}
	if o, err = r.Outlook(thawCurve, day("2021-01-14"), Raw); err != nil {
		t.Fatal(err)
	}
	if got := o.End().P50.Low; got > s.Curve.Index.Low-50 {
		t.Errorf("raw %v; the season is %v", got, s.Curve.Index.Low)
	}
}

// joinedTail gives the last days of a window that the record does not have, at -30.
func joinedTail(days []degreeday.DayMean, w degreeday.Window) (out []degreeday.DayMean) {
	for d := days[len(days)-1].Day + 1; d <= w.Last; d++ {
		out = append(out, known(d, -30))
	}
	return out
}

// Missing days of this season leave a range that holds what comes of any filling.
func TestMissingDaysLeaveARange(t *testing.T) {
	base := tundra.days(2000, 23, 5)
	rapid.Check(t, func(t *rapid.T) {
		kind := rapid.SampledFrom([]pipeline.Kind{pipeline.Thaw, pipeline.Freeze}).Draw(t, "kind")
		q := Question{Kind: kind, Definition: pipeline.Curve, Starts: january15}
		through := day("2022-08-10")
		from := day("2022-05-01") + pipeline.Day(rapid.IntRange(0, 80).Draw(t, "from"))
		count := rapid.IntRange(1, 20).Draw(t, "count")
		open, filled := slices.Clone(base), slices.Clone(base)
		for i := range open {
			if d := open[i].Day; d >= from && d < from+pipeline.Day(count) {
				open[i] = missing(d, -5, 20)
				filled[i] = known(d, rapid.Float64Range(-5, 20).Draw(t, "filling"))
			}
		}
		a, err := NewRecord(open).Outlook(q, through, Raw)
		if err != nil {
			t.Fatal(err)
		}
		b, err := NewRecord(filled).Outlook(q, through, Raw)
		if err != nil {
			t.Fatal(err)
		}
		if b.Open() {
			t.Fatal("open without missing days")
		}
		threshold := rapid.Float64Range(0, 4000).Draw(t, "threshold")
		ra, pb := a.Passing(threshold).Probability, b.Passing(threshold).Probability.Low
		if pb < ra.Low || pb > ra.High {
			t.Fatalf("%v is not in %v", pb, ra)
		}
		if e := b.ToDate.Low; e < a.ToDate.Low || e > a.ToDate.High {
			t.Fatalf("to date %v is not in %v", e, a.ToDate)
		}
		ea, eb := a.End(), b.End()
		if eb.P50.Low < ea.P50.Low || eb.P50.Low > ea.P50.High || eb.P10.Low < ea.P10.Low || eb.P90.High > ea.P90.High {
			t.Fatalf("end %v is not in %v", eb, ea)
		}
	})
}

// A member must be complete over the rest of the season, and over nothing else.
func TestMembers(t *testing.T) {
	days := tundra.days(2000, 23, 5)
	gap := func(s string) { i := day(s) - days[0].Day; days[i] = missing(days[i].Day, -5, 5) }
	gap("2003-06-30")
	gap("2004-07-01")
	gap("2004-02-29") // dropped in 2022
	o, err := NewRecord(days).Outlook(thawCurve, day("2022-06-30"), Raw)
	if err != nil {
		t.Fatal(err)
	}
	if slices.Contains(o.Members, 2004) || !slices.Contains(o.Members, 2003) || slices.Contains(o.Members, 2022) || len(o.Members) != 21 {
		t.Errorf("members %v", o.Members)
	}
	gap("2005-07-01")
	gap("2006-12-31")
	if _, err := NewRecord(days).Outlook(thawCurve, day("2022-06-30"), Raw); !errors.Is(err, ErrFewMembers) {
		t.Errorf("with 19 members: %v", err)
	}
	days = tundra.days(2000, 23, 5)
	gap("2004-02-29")
	if o, err = NewRecord(days).Outlook(thawCurve, day("2022-02-01"), Raw); err != nil || !slices.Contains(o.Members, 2004) {
		t.Errorf("29 February that is not needed: %v", err)
	}
}

// Days after through, and seasons after it, are not looked at.
func TestAsOf(t *testing.T) {
	days := tundra.days(1990, 34, 5)
	through := day("2017-07-04")
	for _, which := range []Which{Raw, Moved} {
		whole, err := NewRecord(days).Outlook(thawCurve, through, which)
		if err != nil {
			t.Fatal(err)
		}
		cut, err := NewRecord(days[:through-days[0].Day+1]).Outlook(thawCurve, through, which)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(whole.Members, cut.Members) || !same(whole.low.ends, cut.low.ends) {
			t.Errorf("%s: %v and %v", which, whole.End(), cut.End())
		}
	}
}
