package outlook

import (
	"math"
	"slices"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

func TestLeads(t *testing.T) {
	w := degreeday.WindowAt(january15, day("2022-06-01"))
	var got []int
	for _, d := range IssuedThrough(w) {
		got = append(got, LeadMonth(w, d))
	}
	want := []int{12, 12, 11, 11, 10, 10, 9, 9, 8, 8, 7, 7, 6, 6, 5, 5, 4, 4, 3, 3, 2, 2, 1, 1, 0}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("(-want +got): %s", diff)
	}
	if got := IssuedThrough(w)[:4]; !slices.Equal(got, []pipeline.Day{day("2022-01-14"), day("2022-01-15"), day("2022-01-31"), day("2022-02-15")}) {
		t.Errorf("%v", got)
	}
}

// A late outlook knows nearly all of a season and an early one nothing: in an
// invented climate without a trend the first has skill, the second none.
func TestSkillGrowsAsASeasonGoesOn(t *testing.T) {
	h := NewRecord(tundra.days(1976, 44, 21)).Hindcast(thawCurve, HindcastOptions{Seed: 1})
	if h.Seasons != 43 || !h.FromRecord || len(h.Thresholds) != 4 {
		t.Fatalf("%d seasons, thresholds %v", h.Seasons, h.Thresholds)
	}
	for lead := 12; lead >= 0; lead-- {
		s, ok := h.Score(Earlier, h.Better(), lead)
		if !ok {
			t.Fatalf("no score at lead %d", lead)
		}
		if s.Years != 33 || !s.Skill.HasInterval || s.Skill.Low > s.Skill.Value || s.Skill.High < s.Skill.Value {
			t.Errorf("lead %d: %+v", lead, s)
		}
		if lead >= 11 && h.Skilful(lead) || lead <= 5 && !h.Skilful(lead) {
			t.Errorf("lead %d: skill %+v", lead, s.Skill)
		}
	}
	if s, _ := h.Score(Earlier, Raw, 0); s.Skill.Value < 0.999 {
		t.Errorf("at the end: %+v", s.Skill)
	}
	if _, ok := h.Score(Earlier, Raw, 13); ok || h.Skilful(13) {
		t.Error("a lead that there is not has a score")
	}
}

// In a climate that warms fast moved members are the better ones, and years to
// come flatter.
func TestTrendInHindcasts(t *testing.T) {
	c := tundra
	c.trendC, c.persistence = 0.2, 0.3
	h := NewRecord(c.days(1970, 36, 4)).Hindcast(thawCurve, HindcastOptions{})
	if h.Better() != Moved {
		t.Error("raw is used in a climate that warms by 2 degC in ten years")
	}
	early, _ := h.Score(Earlier, Raw, 11)
	others, _ := h.Score(Others, Raw, 11)
	moved, _ := h.Score(Earlier, Moved, 11)
	if early.CRPS <= others.CRPS || moved.CRPS >= early.CRPS || early.MovedClimatologyCRPS >= early.RawClimatologyCRPS {
		t.Errorf("CRPS %v from earlier years, %v from others, %v moved", early.CRPS, others.CRPS, moved.CRPS)
	}
	// That it gets warmer is hardly skill: a climatology that follows the trend
	// knows it too.
	if against := 1 - moved.CRPS/moved.RawClimatologyCRPS; against < 0.3 || moved.Skill.Value > against/2 {
		t.Errorf("skill %v, %v against seasons as they were", moved.Skill.Value, against)
	}
}

// Outlooks of past seasons know nothing of what came after: the scores of seasons
// up to one are the same whatever the years after it were.
func TestHindcastDoesNotLookAhead(t *testing.T) {
	days := tundra.days(1980, 36, 9)
	after := day("2011-01-15")
	other := slices.Clone(days)
	for i := range other {
		if other[i].Day >= after {
			other[i] = known(other[i].Day, -other[i].MeanC)
		}
	}
	sumsOf := func(days []degreeday.DayMean) map[key][]sums {
		r, all := NewRecord(days), map[key]*tally{}
		ys := r.cut(january15)
		ends := r.ends(thawCurve, ys)
		for i := range ys.all {
			if ends[i].known && ys.all[i].window.Last < after {
				r.score(thawCurve, ys, ends, i, []float64{500, 700}, all)
			}
		}
		out := map[key][]sums{}
		for k, t := range all {
			if k.information == Earlier {
				out[k] = t.sums
			}
		}
		return out
	}
	a, b := sumsOf(days), sumsOf(other)
	if len(a) != 26 {
		t.Fatalf("%d tallies", len(a))
	}
	if diff := cmp.Diff(a, b, cmp.AllowUnexported(sums{}, climateSums{})); diff != "" {
		t.Error(diff)
	}
}

// One score of a hindcast against the outlook as a caller would have made it.
func TestHindcastIsMadeOfOutlooks(t *testing.T) {
	days := tundra.days(1980, 40, 2)
	// a day filled from those beside it was not known in the evening: the outlook
	// issued on 1 July used 29 June
	days[day("2018-06-30")-days[0].Day].Origin = pipeline.Interpolated
	r := NewRecord(days)
	h := r.Hindcast(thawCurve, HindcastOptions{FromYear: 2018, Thresholds: []float64{600}})
	w := degreeday.WindowAt(january15, day("2018-06-01"))
	for _, which := range []Which{Raw, Moved} {
		var crps, brier float64
		for _, through := range []pipeline.Day{day("2018-06-29"), day("2018-07-15")} {
			o, err := r.Outlook(thawCurve, through, which)
			if err != nil {
				t.Fatal(err)
			}
			s := degreeday.Build(pipeline.Thaw, w, "", 0, days[w.First-days[0].Day:w.Last-days[0].Day+1], r.Last())
			crps += CRPS(o.low.ends, s.Curve.Index.Low) / 2
			happened := 0.0
			if s.Curve.Index.Low >= 600 {
				happened = 1
			}
			brier += square(o.Passing(600).Probability.Low-happened) / 2
		}
		got, ok := h.Score(Earlier, which, 6)
		if !ok || got.N != 2 || got.Years != 1 || math.Abs(got.CRPS-crps) > 1e-9 || math.Abs(got.Brier-brier) > 1e-12 {
			t.Errorf("%s: %+v; want CRPS %v, Brier %v", which, got, crps, brier)
		}
		if got.Skill.HasInterval {
			t.Error("an interval from one season")
		}
	}
}

// A place that never thaws has nothing to be skilful about.
func TestNoSeason(t *testing.T) {
	r := NewRecord(plain(1996, 24, func(int, time.Month, int) float64 { return -5 }))
	h := r.Hindcast(thawCurve, HindcastOptions{})
	s, ok := h.Score(Earlier, h.Better(), 5)
	if !ok || s.CRPS != 0 || s.Skill.OK || h.Skilful(5) {
		t.Errorf("%+v", s)
	}
	o, err := r.Outlook(thawCurve, day("2019-06-30"), Moved)
	if err != nil {
		t.Fatal(err)
	}
	if p := o.Passing(10); p.HasOn || o.End().P90.High != 0 {
		t.Errorf("%+v", p)
	}
}

// A season with missing days that leave its index open is neither scored nor in
// the climatology; without any known season there is no hindcast.
func TestHindcastWithMissingDays(t *testing.T) {
	days := tundra.days(1980, 30, 2)
	at := day("2000-07-01") - days[0].Day
	days[at] = missing(days[at].Day, 0, 20)
	whole := NewRecord(days).Hindcast(thawCurve, HindcastOptions{FromYear: 1999})
	s, ok := whole.Score(Earlier, Raw, 6)
	if !ok || s.Years != 9 || whole.Seasons != 28 { // 1999 to 2008 but 2000
		t.Errorf("%+v, %d seasons", s, whole.Seasons)
	}
	for i := range days {
		if _, m, d := days[i].Day.Date(); m == time.July && d == 1 {
			days[i] = missing(days[i].Day, 0, 20)
		}
	}
	if h := NewRecord(days).Hindcast(thawCurve, HindcastOptions{}); len(h.Scores) != 0 || h.Better() != Raw || h.Skilful(3) {
		t.Errorf("%+v", h)
	}
}

func TestHindcastIsRepeatable(t *testing.T) {
	r := NewRecord(tundra.days(1990, 24, 9))
	a := r.Hindcast(thawCurve, HindcastOptions{Seed: 5})
	b := r.Hindcast(thawCurve, HindcastOptions{Seed: 5})
	if diff := cmp.Diff(a.Scores, b.Scores); diff != "" {
		t.Error(diff)
	}
}

func BenchmarkOutlook(b *testing.B) {
	days := tundra.days(1960, 62, 1)
	through := day("2021-06-30")
	for b.Loop() {
		r := NewRecord(days)
		for _, which := range []Which{Raw, Moved} {
			o, err := r.Outlook(thawCurve, through, which)
			if err != nil {
				b.Fatal(err)
			}
			o.Passing(700)
			o.End()
		}
	}
}

func BenchmarkHindcast(b *testing.B) {
	r := NewRecord(tundra.days(1960, 62, 1))
	for b.Loop() {
		r.Hindcast(thawCurve, HindcastOptions{})
	}
}

// A hindcast's paths leave out how this year's days so far went, but for where
// they leave the index: they end where whole paths do.
func TestShortPathsEndWhereWholeOnesDo(t *testing.T) {
	r := NewRecord(tundra.days(2000, 23, 8))
	differ := 0
	for _, kind := range []pipeline.Kind{pipeline.Thaw, pipeline.Freeze} {
		for _, definition := range []pipeline.Definition{pipeline.Curve, pipeline.Sum} {
			q := Question{Kind: kind, Definition: definition, BaseC: 0, Starts: pipeline.MonthDay{Month: time.April, Day: 15}}
			for _, w := range []degreeday.Window{degreeday.WindowAt(q.Starts, day("2020-05-01")), degreeday.WindowAt(q.Starts, day("2019-05-01"))} {
				for _, through := range IssuedThrough(w) {
					ys := r.cut(q.Starts)
					j := join{question: q, years: ys, window: w, slot: ys.slotOf(w, through)}
					members := j.members(func(y *year) bool { return y.window.Last < w.First })
					open := j.begin(r, through)
					got, ok := j.ends(members, &slopes{}, open)
					whole, _ := j.ensemble(members, slopes{}, false)
					if !ok || len(got) < 15 {
						t.Fatalf("%v through %s: %d ends", q, through, len(got))
					}
					for i := range got {
						if math.Abs(got[i]-whole.ends[i]) > 1e-9 {
							t.Fatalf("%v through %s: %v; want %v", q, through, got[i], whole.ends[i])
						}
					}
					if got[0] != got[len(got)-1] {
						differ++
					}
				}
			}
		}
	}
	if differ < 40 {
		t.Errorf("members differ in %d outlooks only", differ)
	}
}
