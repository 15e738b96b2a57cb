package daily

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
)

func on(t *testing.T, s string) pipeline.Day {
	t.Helper()
	d, err := pipeline.ParseDay(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// obs is an observed day.
func obs(d pipeline.Day, c float64) Value {
	return Value{Day: d, Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c, Rule: pipeline.MeanMaxMin}
}

func mustPanic(t *testing.T, text string, f func()) {
	t.Helper()
	defer func() {
		t.Helper()
		if got := fmt.Sprint(recover()); !strings.Contains(got, text) || !strings.HasPrefix(got, "daily: ") {
			t.Errorf("panic %q; want one of this package with %q", got, text)
		}
	}()
	f()
}

func TestComplete(t *testing.T) {
	d := aDay
	filled := func(d pipeline.Day, c float64) Value {
		return Value{Day: d, Origin: pipeline.Interpolated, MeanC: c, LowC: c, HighC: c, Rule: pipeline.MeanMaxMin, Quality: pipeline.QualityEstimated}
	}
	gap := func(d pipeline.Day, low, high float64) Value {
		return Value{Day: d, Origin: pipeline.Missing, LowC: low, HighC: high, Rule: pipeline.MeanMaxMin, Quality: pipeline.QualityMissing}
	}
	part := Value{ // a day with too little, as Make returns it
		Day: d + 1, Rule: pipeline.MeanMaxMin, MaxC: 4, HasMax: true, Hours: 7, LongestHole: 9, LowC: -80, HighC: 60, Quality: pipeline.QualityMissing,
	}
	and := func(v Value, change func(*Value)) Value { change(&v); return v }
	keptPart := func(v *Value) { v.MaxC, v.HasMax, v.Hours, v.LongestHole = 4, true, 7, 9 }
	hourly := func(v *Value) { v.Rule = pipeline.MeanHourly }
	cases := []struct {
		name     string
		in, want []Value
		fillDays int
	}{
		{name: "nothing", fillDays: 2},
		{name: "nothing observed", fillDays: 2, in: []Value{part}},
		{name: "one day", fillDays: 2, in: []Value{obs(d, 1)}, want: []Value{obs(d, 1)}},
		{name: "no gap", fillDays: 2, in: []Value{obs(d, 1), obs(d+1, 5)}, want: []Value{obs(d, 1), obs(d+1, 5)}},
		{name: "gap of two", fillDays: 2, in: []Value{obs(d, 1), obs(d+3, 7)},
			want: []Value{obs(d, 1), filled(d+1, 3), filled(d+2, 5), obs(d+3, 7)}},
		{name: "gap of three", fillDays: 2, in: []Value{obs(d, 1), obs(d+4, 7)},
			want: []Value{obs(d, 1), gap(d+1, -80, 60), gap(d+2, -80, 60), gap(d+3, -80, 60), obs(d+4, 7)}},
		{name: "nothing is to be filled", fillDays: 0, in: []Value{obs(d, 1), obs(d+2, 7)},
			want: []Value{obs(d, 1), gap(d+1, -80, 60), obs(d+2, 7)}},
		{name: "filled day keeps what it has", fillDays: 1, in: []Value{obs(d, 1), part, obs(d+2, 7)},
			want: []Value{obs(d, 1), and(filled(d+1, 4), keptPart), obs(d+2, 7)}},
		{name: "missing day keeps what it has", fillDays: 0, in: []Value{obs(d, 1), part, obs(d+2, 7)},
			want: []Value{obs(d, 1), and(gap(d+1, -80, 60), keptPart), obs(d+2, 7)}},
		{name: "a day filled before, no longer", fillDays: 0, in: []Value{obs(d, 1), and(filled(d+1, 4), keptPart), obs(d+2, 7)},
			want: []Value{obs(d, 1), and(gap(d+1, -80, 60), keptPart), obs(d+2, 7)}},
		{name: "bounds of an observed day are its mean", fillDays: 0,
			in: []Value{and(obs(d, 1), func(v *Value) { v.LowC, v.HighC = -80, 60 })}, want: []Value{obs(d, 1)}},
		{name: "a day without readings, given or not", fillDays: 1,
			in: []Value{obs(d, 1), Make(stationBy(pipeline.MeanMaxMin), d+1, nil), obs(d+2, 7)}, want: []Value{obs(d, 1), filled(d+1, 4), obs(d+2, 7)}},
		{name: "the hourly rule, a day given", fillDays: 1,
			in:   []Value{and(obs(d, 1), hourly), Make(stationBy(pipeline.MeanHourly), d+1, nil), and(obs(d+2, 7), hourly)},
			want: []Value{and(obs(d, 1), hourly), and(filled(d+1, 4), func(v *Value) { hourly(v); v.LongestHole = 24 }), and(obs(d+2, 7), hourly)}},
		{name: "the hourly rule, a day not given", fillDays: 1,
			in:   []Value{and(obs(d, 1), hourly), and(obs(d+2, 7), hourly)},
			want: []Value{and(obs(d, 1), hourly), and(filled(d+1, 4), func(v *Value) { hourly(v); v.LongestHole = 24 }), and(obs(d+2, 7), hourly)}},
		{name: "days before and after", fillDays: 2,
			in:   []Value{and(part, func(v *Value) { v.Day = d - 2 }), obs(d, 1), and(part, func(v *Value) { v.Day = d + 2 })},
			want: []Value{obs(d, 1)}},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got, _ := Complete(c.in, c.fillDays)
			if d := cmp.Diff(c.want, got); d != "" {
				t.Errorf("(-want +got):\n%s", d)
			}
		})
	}
}

// A fortnight lost in July is neither skipped nor zero, and no single figure
// stands in for it.
func TestGapIsNeitherSkippedNorZero(t *testing.T) {
	var in []Value
	for d := on(t, "2031-06-01"); d <= on(t, "2031-08-31"); d++ {
		if d < on(t, "2031-07-10") || d > on(t, "2031-07-23") {
			in = append(in, obs(d, 9+float64(d%7))) // 9 to 15 degC
		}
	}
	got, _ := Complete(in, 2)
	if len(got) != 92 {
		t.Fatalf("%d days; want 92", len(got))
	}
	missing := 0
	for _, v := range got {
		if v.Origin != pipeline.Missing {
			continue
		}
		missing++
		if v.LowC != 9 || v.HighC != 15 {
			t.Errorf("%s: bounds %v to %v; want 9 to 15", v.Day, v.LowC, v.HighC)
		}
	}
	if missing != 14 {
		t.Errorf("%d days missing; want 14", missing)
	}
}

func TestExtremes(t *testing.T) {
	cases := []struct {
		name      string
		in        []Value
		at        string
		low, high float64
	}{
		{"nothing known", nil, "2031-07-01", -80, 60}, // WMO guidelines for automatic weather stations, as quoted elsewhere
		{"15 days before, another year", []Value{obs(on(t, "2012-06-16"), 8)}, "2031-07-01", 8, 8},
		{"16 days before", []Value{obs(on(t, "2012-06-15"), 8)}, "2031-07-01", -80, 60},
		{"15 days after, later year", []Value{obs(on(t, "2045-07-16"), 8)}, "2031-07-01", 8, 8},
		{"16 days after", []Value{obs(on(t, "2045-07-17"), 8)}, "2031-07-01", -80, 60},
		{"the same year too", []Value{obs(on(t, "2030-07-01"), 8), obs(on(t, "2031-07-03"), 11)}, "2031-07-01", 8, 11},
		{"over the new year", []Value{obs(on(t, "2020-12-24"), -30), obs(on(t, "2021-01-20"), -9)}, "2031-01-08", -30, -9},
		{"before the new year", []Value{obs(on(t, "2020-01-09"), -30)}, "2031-12-25", -30, -30},
		{"16 days over the new year", []Value{obs(on(t, "2020-01-10"), -30)}, "2031-12-25", -80, 60},
		{"over 29 February, leap year", []Value{obs(on(t, "2020-03-06"), -3)}, "2031-02-20", -3, -3},
		{"over 29 February, leap year, 16 days", []Value{obs(on(t, "2020-03-07"), -3)}, "2031-02-20", -80, 60},
		{"over 29 February, other year", []Value{obs(on(t, "2021-03-07"), -3)}, "2032-02-20", -3, -3},
		{"for 29 February, other year: 1 March", []Value{obs(on(t, "2021-03-16"), -3)}, "2032-02-29", -3, -3},
		{"for 29 February, other year: 14 February", []Value{obs(on(t, "2021-02-14"), -3)}, "2032-02-29", -3, -3},
		{"for 29 February, other year: 13 February", []Value{obs(on(t, "2021-02-13"), -3)}, "2032-02-29", -80, 60},
		{"of 29 February", []Value{obs(on(t, "2020-02-29"), -3)}, "2031-03-15", -3, -3},
		{"for 1 March, leap year: 15 February", []Value{obs(on(t, "2020-02-15"), -3)}, "2031-03-01", -3, -3},
		{"for 1 March, leap year: 14 February", []Value{obs(on(t, "2020-02-14"), -3)}, "2031-03-01", -80, 60},
		{"century years have no 29 February", []Value{obs(on(t, "1900-03-07"), -3)}, "2031-03-22", -3, -3},
		{"every fourth has", []Value{obs(on(t, "2000-02-14"), -3)}, "2031-03-01", -80, 60},
		{"filled days do not count", []Value{{Day: on(t, "2031-07-01"), Origin: pipeline.Interpolated, MeanC: 5}}, "2031-07-01", -80, 60},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			// Ten times over, 400 years apart: then the calendar is the same.
			var in []Value
			for n := range pipeline.Day(10) {
				for _, v := range c.in {
					v.Day += n * 146097
					in = append(in, v)
				}
			}
			_, e := Complete(in, 2)
			if low, high := e.Bounds(on(t, c.at)); low != c.low || high != c.high {
				t.Errorf("%v to %v; want %v to %v", low, high, c.low, c.high)
			}
		})
	}
	var few []Value
	for n := range 9 {
		few = append(few, obs(on(t, "2031-07-01")+pipeline.Day(n), float64(n)))
	}
	_, e := Complete(few, 2)
	if low, high := e.Bounds(on(t, "2031-07-05")); low != -80 || high != 60 {
		t.Errorf("nine values: %v to %v", low, high)
	}
	_, e = Complete(append(few, obs(on(t, "2031-07-10"), 9)), 2)
	if low, high := e.Bounds(on(t, "2031-07-05")); low != 0 || high != 9 {
		t.Errorf("ten values: %v to %v", low, high)
	}
	var zero Extremes
	if low, high := zero.Bounds(aDay); low != -80 || high != 60 {
		t.Errorf("zero value: %v to %v", low, high)
	}
}

// record draws values, of which some are observed and some partly known.
func record(t *rapid.T) []Value {
	d := pipeline.Day(rapid.IntRange(-2000, 22000).Draw(t, "first"))
	var values []Value
	for range rapid.OneOf(rapid.IntRange(0, 60), rapid.IntRange(200, 400)).Draw(t, "n") {
		d += pipeline.Day(rapid.OneOf(rapid.IntRange(1, 4), rapid.IntRange(1, 500)).Draw(t, "step"))
		v := obs(d, float64(rapid.IntRange(-500, 300).Draw(t, "tenths"))/10)
		if rapid.IntRange(0, 4).Draw(t, "part") == 0 {
			v = Value{Day: d, Rule: v.Rule, MinC: v.MeanC, HasMin: rapid.Bool().Draw(t, "has min"), LowC: -80, HighC: 60, Quality: pipeline.QualityMissing}
		}
		values = append(values, v)
	}
	return values
}

func TestBoundsAreThoseOfEveryYear(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		values := record(t)
		_, e := Complete(values, 2)
		d := pipeline.Day(rapid.IntRange(-2000, 22000).Draw(t, "day"))
		_, month, dayOfMonth := d.Date()
		low, high, n := math.Inf(1), math.Inf(-1), 0
		for _, v := range values {
			year, _, _ := v.Day.Date()
			for y := year - 1; y <= year+1; y++ {
				at := pipeline.MonthDay{Month: month, Day: dayOfMonth}.In(y)
				if v.Origin == pipeline.Observed && v.Day-15 <= at && at <= v.Day+15 {
					low, high, n = min(low, v.MeanC), max(high, v.MeanC), n+1
				}
			}
		}
		if n < 10 {
			low, high = -80, 60
		}
		if gotLow, gotHigh := e.Bounds(d); gotLow != low || gotHigh != high {
			t.Fatalf("%s: %v to %v; want %v to %v", d, gotLow, gotHigh, low, high)
		}
	})
}

func TestCompleteRecord(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		values := record(t)
		fillDays := rapid.IntRange(0, 5).Draw(t, "fill days")
		got, extremes := Complete(values, fillDays)
		again, _ := Complete(got, fillDays)
		if !slices.Equal(got, again) {
			t.Fatalf("completed again (-once +twice):\n%s", cmp.Diff(got, again))
		}
		own := slices.DeleteFunc(slices.Clone(values), func(v Value) bool { return !v.Own() })
		if less, _ := Complete(own, fillDays); !slices.Equal(got, less) {
			t.Fatalf("without days that hold nothing of their own (-with +without):\n%s", cmp.Diff(got, less))
		}
		byDay := map[pipeline.Day]Value{}
		for _, v := range values {
			byDay[v.Day] = v
		}
		gap := 0
		for i, v := range got {
			if i > 0 && v.Day != got[i-1].Day+1 {
				t.Fatalf("%s after %s", v.Day, got[i-1].Day)
			}
			in := byDay[v.Day]
			if (v.Origin == pipeline.Observed) != (in.Origin == pipeline.Observed) || v.HasMin != in.HasMin {
				t.Fatalf("%+v made of %+v", v, in)
			}
			if v.Origin == pipeline.Observed {
				gap = 0
				if v != in {
					t.Fatalf("observed day changed from %+v to %+v", in, v)
				}
				continue
			}
			gap++
			if v.Origin == pipeline.Interpolated && gap > fillDays {
				t.Fatalf("%s filled, %d days into a gap", v.Day, gap)
			}
			if low, high := extremes.Bounds(v.Day); v.Origin == pipeline.Missing && (v.LowC != low || v.HighC != high || low > high) {
				t.Fatalf("%s: bounds %v to %v; the record's are %v to %v", v.Day, v.LowC, v.HighC, low, high)
			}
		}
	})
}

func TestCompleteRefuses(t *testing.T) {
	mustPanic(t, "day 2031-01-20 after 2031-01-20", func() { Complete([]Value{obs(aDay, 1), obs(aDay, 2)}, 2) })
	mustPanic(t, "mean NaN degC of 2031-01-20", func() { Complete([]Value{obs(aDay, math.NaN())}, 2) })
}

func BenchmarkComplete(b *testing.B) {
	var values []Value
	first := pipeline.DayOf(1995, time.January, 1)
	for i := range pipeline.Day(11000) {
		if i%97 > 2 && i%1000 > 20 { // a gap of three days each quarter, and some of three weeks
			values = append(values, obs(first+i, -5+20*math.Cos(2*math.Pi*(float64(i)-200)/365.25)))
		}
	}
	b.ReportAllocs()
	for b.Loop() {
		Complete(values, 2)
	}
}
