package degreeday

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

var thawYear = pipeline.MonthDay{Month: time.January, Day: 15}

// window2031 is a northern thaw year of 365 days.
func window2031() Window { return WindowAt(thawYear, pipeline.DayOf(2031, time.July, 1)) }

// observed returns means as observed days from first on.
func observed(first pipeline.Day, meanC []float64) []DayMean {
	days := make([]DayMean, len(meanC))
	for i, c := range meanC {
		days[i] = DayMean{Day: first + pipeline.Day(i), Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
	}
	return days
}

// year returns a whole window of means: warmC from the first to the last date
// said (month-day of the window's first year), coldC otherwise.
func year(t *testing.T, w Window, from, through string, warmC, coldC float64) []DayMean {
	t.Helper()
	y, _, _ := w.First.Date()
	first, last := day(t, fmt.Sprintf("%d-%s", y, from)), day(t, fmt.Sprintf("%d-%s", y, through))
	days := observed(w.First, make([]float64, w.Days()))
	for i := range days {
		c := coldC
		if first <= days[i].Day && days[i].Day <= last {
			c = warmC
		}
		days[i].MeanC, days[i].LowC, days[i].HighC = c, c, c
	}
	return days
}

// lose makes the days from one date through another missing.
func lose(days []DayMean, from, through pipeline.Day, lowC, highC float64) {
	for i := range days {
		if from <= days[i].Day && days[i].Day <= through {
			days[i] = DayMean{Day: days[i].Day, Origin: pipeline.Missing, LowC: lowC, HighC: highC}
		}
	}
}

func mustPanic(t *testing.T, text string, f func()) {
	t.Helper()
	defer func() {
		t.Helper()
		if got := fmt.Sprint(recover()); !strings.Contains(got, text) || !strings.HasPrefix(got, "degreeday: ") {
			t.Errorf("panic %q; want one of this package with %q", got, text)
		}
	}()
	f()
}

func TestSeasonOfHandSeries(t *testing.T) {
	w := window2031()
	end := w.First + pipeline.Day(len(handThaw)) - 1
	s := Build(pipeline.Thaw, w, w.Label(), 0, observed(w.First, handThaw), end)
	// hand-computable series; cumulative curve worked by hand
	if s.Curve.Index != (Bounds{51, 51}) || s.Sum.Index != (Bounds{60, 60}) || !s.Curve.Index.Known() {
		t.Errorf("curve %v, sum %v; want 51 and 60", s.Curve.Index, s.Sum.Index)
	}
	if !s.Curve.Began || s.Curve.First != w.First+8 || s.Curve.Last != w.First+20 {
		t.Errorf("season from %s to %s; want the 9th to the 21st day", s.Curve.First, s.Curve.Last)
	}
	if s.Sum.First != w.First+3 || s.Sum.Last != w.First+20 {
		t.Errorf("days that count from %s to %s; want the 4th to the 21st", s.Sum.First, s.Sum.Last)
	}
	for i, d := range s.Days {
		if d.Day != w.First+pipeline.Day(i) || d.Running != (Bounds{handThawRunning[i], handThawRunning[i]}) {
			t.Errorf("day %d: %+v; want running %v", i+1, d, handThawRunning[i])
		}
	}
	if s.Over || s.Complete() || s.Through != end || s.Observed != 25 || s.Missing+s.Interpolated+s.LongestGap != 0 || s.Label != "2031" {
		t.Errorf("season %+v", s)
	}
	f := Build(pipeline.Freeze, w, w.Label(), 0, observed(w.First, handFreeze), w.First+pipeline.Day(len(handFreeze))-1)
	if f.Curve.Index != (Bounds{55, 55}) || f.Sum.Index != (Bounds{64, 64}) {
		t.Errorf("freeze: curve %v, sum %v; want 55 and 64", f.Curve.Index, f.Sum.Index)
	}
}

func TestSeasonBase(t *testing.T) {
	w := window2031()
	// by the definition: (3 - 2) + (5 - 2) above 2 degC
	s := Build(pipeline.Thaw, w, "2031", 2, observed(w.First, []float64{-1, 3, 5}), w.First+2)
	if s.Curve.Index != (Bounds{4, 4}) || s.Sum.Index != (Bounds{4, 4}) {
		t.Errorf("curve %v, sum %v; want 4 and 4", s.Curve.Index, s.Sum.Index)
	}
}

// A gap of 10 days in July at 12 degC, taken as zero, loses 120 degC.d: the
// index with the days taken as zero must lie below the low bound.
func TestGapIsNotZero(t *testing.T) {
	w := window2031()
	days := year(t, w, "05-01", "10-01", 12, -15)
	truth := Build(pipeline.Thaw, w, "2031", 0, days, w.Last)
	from := day(t, "2031-07-10")
	lose(days, from, from+9, 8, 15)
	s := Build(pipeline.Thaw, w, "2031", 0, days, w.Last)
	want := truth.Curve.Index.Low
	// 10 days at 8 instead of 12 degC, and at 15
	if s.Curve.Index != (Bounds{want - 40, want + 30}) || s.Sum.Index != s.Curve.Index || s.Curve.Index.Known() {
		t.Errorf("curve %v, sum %v; want %v to %v", s.Curve.Index, s.Sum.Index, want-40, want+30)
	}
	if zero := want - 120; zero >= s.Curve.Index.Low {
		t.Errorf("low bound %v lets the gap pass as zero (%v)", s.Curve.Index.Low, zero)
	}
	if s.Missing != 10 || s.LongestGap != 10 || s.Observed != 355 || s.Complete() || !truth.Complete() {
		t.Errorf("missing %d, longest gap %d, observed %d, complete %t", s.Missing, s.LongestGap, s.Observed, s.Complete())
	}
	before := s.Days[from-w.First-1]
	if !before.CurveToDate.Known() || !before.Sum.Known() || !before.Running.Known() {
		t.Errorf("open before the gap: %+v", before)
	}
}

// A gap in the cold season, with bounds that stay below the base, leaves the
// index known to the last bit.
func TestGapInTheColdLeavesTheIndexKnown(t *testing.T) {
	w := window2031()
	days := year(t, w, "05-01", "10-01", 11.7, -15.3)
	truth := Build(pipeline.Thaw, w, "2031", 0, days, w.Last)
	lose(days, day(t, "2031-02-01"), day(t, "2031-02-20"), -41.3, -0.1)
	s := Build(pipeline.Thaw, w, "2031", 0, days, w.Last)
	if !s.Curve.Index.Known() || s.Curve.Index != truth.Curve.Index || s.Sum.Index != truth.Sum.Index {
		t.Errorf("curve %v, sum %v; want %v, %v", s.Curve.Index, s.Sum.Index, truth.Curve.Index, truth.Sum.Index)
	}
	if s.Complete() || s.Curve.EdgeProvisional {
		t.Errorf("complete %t, edge provisional %t; want neither", s.Complete(), s.Curve.EdgeProvisional)
	}
}

// No fixed end inside the window: a late autumn counts to 20 November.
func TestLateEnd(t *testing.T) {
	w := window2031()
	s := Build(pipeline.Thaw, w, "2031", 0, year(t, w, "04-20", "11-20", 4, -20), w.Last)
	if s.Curve.Last.String() != "2031-11-20" || s.Curve.First.String() != "2031-04-20" {
		t.Errorf("season %s to %s; want 2031-04-20 to 2031-11-20", s.Curve.First, s.Curve.Last)
	}
	if s.Curve.Index.Low != 4*215 || s.Curve.EdgeProvisional { // 215 days from 20 April to 20 November
		t.Errorf("index %v, edge provisional %t; want 860, false", s.Curve.Index, s.Curve.EdgeProvisional)
	}
}

func TestSeasonFlags(t *testing.T) {
	w := window2031()
	d := func(s string) pipeline.Day { return day(t, s) }
	cases := []struct {
		name                                     string
		change                                   func(days []DayMean)
		end                                      string
		over, complete, began, none, edge, onset bool
		longest                                  int
	}{
		{name: "whole", end: "2032-01-14", over: true, complete: true, began: true},
		{name: "record goes on", end: "2032-03-01", over: true, complete: true, began: true},
		{name: "one day short", end: "2032-01-13", began: true},
		{name: "winter", end: "2031-03-01", onset: true},
		{name: "risen to 50", end: "2031-05-05", began: true, onset: true},
		{name: "risen above 50", end: "2031-05-06", began: true},
		{name: "autumn: the running value is low again, the onset holds", end: "2031-12-31", began: true},
		{name: "no thaw", end: "2032-01-14", over: true, complete: true, none: true,
			change: func(days []DayMean) { copy(days, year(t, w, "05-01", "05-01", -1, -20)) }},
		{name: "no thaw so far", end: "2031-12-31", onset: true,
			change: func(days []DayMean) { copy(days, year(t, w, "05-01", "05-01", -1, -20)) }},
		{name: "a gap may hide a thaw", end: "2032-01-14", over: true, longest: 3,
			change: func(days []DayMean) {
				copy(days, year(t, w, "05-01", "05-01", -1, -20))
				lose(days, d("2031-07-01"), d("2031-07-03"), -9, 2)
			}},
		{name: "a gap hides none", end: "2032-01-14", over: true, none: true, longest: 3,
			change: func(days []DayMean) {
				copy(days, year(t, w, "05-01", "05-01", -1, -20))
				lose(days, d("2031-07-01"), d("2031-07-03"), -9, 0)
			}},
		{name: "low on the edge", end: "2032-01-14", over: true, complete: true, began: true, edge: true,
			change: func(days []DayMean) { copy(days, year(t, w, "01-15", "10-01", 10, -20)) }},
		{name: "high on the edge", end: "2032-01-14", over: true, complete: true, began: true, edge: true,
			change: func(days []DayMean) {
				days[len(days)-1] = DayMean{Day: w.Last, Origin: pipeline.Observed, MeanC: 4000, LowC: 4000, HighC: 4000}
			}},
		{name: "gap before the low", end: "2032-01-14", over: true, began: true, edge: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-04-30"), d("2031-04-30"), -30, -10) }},
		{name: "gap two days before the low", end: "2032-01-14", over: true, began: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-04-29"), d("2031-04-29"), -30, -10) }},
		{name: "gap on the first day", end: "2032-01-14", over: true, began: true, edge: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-05-01"), d("2031-05-01"), 1, 10) }},
		{name: "gap after the high", end: "2032-01-14", over: true, began: true, edge: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-10-02"), d("2031-10-02"), -30, -10) }},
		{name: "gap two days after the high", end: "2032-01-14", over: true, began: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-10-03"), d("2031-10-03"), -30, -10) }},
		{name: "gap on the last day", end: "2032-01-14", over: true, began: true, edge: true, longest: 1,
			change: func(days []DayMean) { lose(days, d("2031-10-01"), d("2031-10-01"), 1, 10) }},
		{name: "filled days count towards the longest gap", end: "2032-01-14", over: true, began: true, longest: 4,
			change: func(days []DayMean) {
				lose(days, d("2031-07-02"), d("2031-07-03"), 9, 11)
				for _, s := range []string{"2031-07-01", "2031-07-04", "2031-07-06"} {
					days[d(s)-w.First].Origin = pipeline.Interpolated
				}
			}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			days := year(t, w, "05-01", "10-01", 10, -20)
			if c.change != nil {
				c.change(days)
			}
			end := d(c.end)
			s := Build(pipeline.Thaw, w, "2031", 0, days[:min(end, w.Last)-w.First+1], end)
			got := fmt.Sprint(s.Over, s.Complete(), s.Curve.Began, s.Curve.NoSeason, s.Curve.EdgeProvisional, s.Curve.OnsetProvisional, s.LongestGap)
			want := fmt.Sprint(c.over, c.complete, c.began, c.none, c.edge, c.onset, c.longest)
			if got != want {
				t.Errorf("over, complete, began, no season, edge, onset, longest gap: %s; want %s", got, want)
			}
			if s.Sum.NoSeason != c.none || s.Sum.OnsetProvisional || s.Observed+s.Interpolated+s.Missing != len(s.Days) {
				t.Errorf("sum %+v, %d+%d+%d days of %d", s.Sum, s.Observed, s.Interpolated, s.Missing, len(s.Days))
			}
		})
	}
}

func TestBuildRefuses(t *testing.T) {
	w := window2031()
	cases := []struct {
		name, text string
		f          func(days []DayMean) Season
	}{
		{"kind", `kind "melt"`, func(days []DayMean) Season { return Build("melt", w, "", 0, days, w.First+2) }},
		{"no day", "0 days", func([]DayMean) Season { return Build(pipeline.Thaw, w, "", 0, nil, w.First-1) }},
		{"too few days", "3 days", func(days []DayMean) Season { return Build(pipeline.Thaw, w, "", 0, days, w.First+3) }},
		{"a day twice", "2031-01-15 in place of 2031-01-16", func(days []DayMean) Season {
			days[1].Day--
			return Build(pipeline.Thaw, w, "", 0, days, w.First+2)
		}},
		{"base", "base NaN", func(days []DayMean) Season { return Build(pipeline.Thaw, w, "", math.NaN(), days, w.First+2) }},
		{"mean", "mean NaN degC of 2031-01-17", func(days []DayMean) Season {
			days[2].MeanC = math.NaN()
			return Build(pipeline.Thaw, w, "", 0, days, w.First+2)
		}},
		{"no bound", "missing day 2031-01-16", func(days []DayMean) Season {
			days[1] = DayMean{Day: w.First + 1, LowC: math.Inf(-1)}
			return Build(pipeline.Thaw, w, "", 0, days, w.First+2)
		}},
		{"bounds the wrong way round", "missing day 2031-01-16", func(days []DayMean) Season {
			days[1] = DayMean{Day: w.First + 1, LowC: 1}
			return Build(pipeline.Thaw, w, "", 0, days, w.First+2)
		}},
		{"origin", "origin 9", func(days []DayMean) Season {
			days[0].Origin = 9
			return Build(pipeline.Thaw, w, "", 0, days, w.First+2)
		}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			mustPanic(t, c.text, func() { c.f(observed(w.First, []float64{1, 2, 3})) })
		})
	}
	// the mean of a missing day has no meaning and is not looked at
	days := []DayMean{{Day: w.First, MeanC: math.NaN(), LowC: -2, HighC: 3}}
	if s := Build(pipeline.Thaw, w, "", 0, days, w.First); s.Curve.Index != (Bounds{0, 3}) {
		t.Errorf("index %v; want 0 to 3", s.Curve.Index)
	}
}

func BenchmarkBuild(b *testing.B) {
	w := window2031()
	meanC := make([]float64, w.Days())
	for d := range meanC {
		meanC[d] = -5 + 20*math.Cos(2*math.Pi*(float64(d)+0.5-186)/365)
	}
	whole, gap := observed(w.First, meanC), observed(w.First, meanC)
	lose(gap, w.First+20, w.First+40, -40, -5)
	for _, c := range []struct {
		name string
		days []DayMean
	}{{"whole", whole}, {"with a gap", gap}} {
		b.Run(c.name, func(b *testing.B) {
			b.ReportAllocs()
			var s Season
			for b.Loop() {
				s.Build(pipeline.Thaw, w, "2031", 0, c.days, w.Last)
			}
		})
	}
}
