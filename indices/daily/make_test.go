package daily

import (
	"math"
	"slices"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// aDay is any day; start is when it begins at the station of stationBy.
var aDay = pipeline.DayOf(2031, time.January, 20)

// stationBy returns a station nine and a half hours west of Greenwich whose day
// begins at 06:00.
func stationBy(rule pipeline.MeanRule) *pipeline.Station {
	return &pipeline.Station{
		ID: "hill", UTCOffset: -9*time.Hour - 30*time.Minute, DayStarts: 6 * time.Hour, Mean: rule, MinHours: 18, MaxHole: 3,
	}
}

func start() int64 {
	return time.Date(2031, time.January, 20, 15, 30, 0, 0, time.UTC).Unix() // 06:00 at -09:30
}

func whole(v pipeline.Variable, c float64) Input {
	return Input{Feed: "post", Sensor: "air", Variable: v, SpanS: 86400, StartS: start(), ValueC: c}
}

// instants returns one value an hour.
func instants(c func(hour int) float64, hours ...int) []Input {
	var in []Input
	for _, h := range hours {
		in = append(in, Input{Feed: "post", Sensor: "air", Variable: pipeline.AirTemp, StartS: start() + int64(h)*3600, ValueC: c(h)})
	}
	return in
}

// allBut returns the hours of a day without some.
func allBut(left ...int) []int {
	var hours []int
	for h := range 24 {
		out := false
		for _, l := range left {
			out = out || l == h
		}
		if !out {
			hours = append(hours, h)
		}
	}
	return hours
}

func flat(c float64) func(int) float64 { return func(int) float64 { return c } }

func with(r Input, change func(*Input)) Input {
	change(&r)
	return r
}

func marked(r Input, q pipeline.Quality) Input { return with(r, func(r *Input) { r.Quality = q }) }

func TestMake(t *testing.T) {
	tx, tn, mean := pipeline.AirTempMax, pipeline.AirTempMin, pipeline.AirTempMean
	missing := Value{Origin: pipeline.Missing, LowC: -80, HighC: 60, Quality: pipeline.QualityMissing}
	observed := func(c float64) Value { return Value{Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c} }
	and := func(v Value, change func(*Value)) Value { change(&v); return v }
	extremes := func(high, low float64) func(*Value) {
		return func(v *Value) { v.MaxC, v.HasMax, v.MinC, v.HasMin = high, true, low, true }
	}
	cases := []struct {
		name string
		rule pipeline.MeanRule
		in   []Input
		want Value
	}{
		// January example of methods for the daily mean, Tx = -5, Tn = -14: (Tx + Tn)/2 = -9.500, by hand
		{"max and min", pipeline.MeanMaxMin, []Input{whole(tx, -5), whole(tn, -14)}, and(observed(-9.5), extremes(-5, -14))},
		{"max alone", pipeline.MeanMaxMin, []Input{whole(tx, -5)}, and(missing, func(v *Value) { v.MaxC, v.HasMax = -5, true })},
		{"min alone, and a mean that the rule does not ask for", pipeline.MeanMaxMin, []Input{whole(tn, -14), whole(mean, -9)},
			and(missing, func(v *Value) { v.MinC, v.HasMin = -14, true })},
		{"max of another day", pipeline.MeanMaxMin,
			[]Input{with(whole(tx, -5), func(r *Input) { r.StartS -= 86400 }), whole(tn, -14)},
			and(missing, func(v *Value) { v.MinC, v.HasMin = -14, true })},
		{"max of a day with another boundary", pipeline.MeanMaxMin,
			[]Input{with(whole(tx, -5), func(r *Input) { r.StartS += 3600 }), whole(tn, -14)},
			and(missing, func(v *Value) { v.MinC, v.HasMin = -14, true })},
		{"max of half a day", pipeline.MeanMaxMin,
			[]Input{with(whole(tx, -5), func(r *Input) { r.SpanS = 43200 }), whole(tn, -14)},
			and(missing, func(v *Value) { v.MinC, v.HasMin = -14, true })},
		{"max below min", pipeline.MeanMaxMin, []Input{whole(tx, -14), whole(tn, -5)},
			and(and(observed(-9.5), extremes(-14, -5)), func(v *Value) { v.Quality = pipeline.QualityInconsistent })},
		{"max equal to min", pipeline.MeanMaxMin, []Input{whole(tx, 0), whole(tn, 0)}, and(observed(0), extremes(0, 0))},
		{"no reading", pipeline.MeanMaxMin, nil, missing},
		{"reported", pipeline.MeanAsReported, []Input{whole(mean, -9)}, observed(-9)},
		{"reported, with max and min", pipeline.MeanAsReported, []Input{whole(mean, -9), whole(tx, -5), whole(tn, -14)},
			and(observed(-9), extremes(-5, -14))},
		{"nothing reported", pipeline.MeanAsReported, []Input{whole(tx, -5), whole(tn, -14)}, and(missing, extremes(-5, -14))},
		{"mean of an hour is not the day's", pipeline.MeanAsReported, []Input{with(whole(mean, -9), func(r *Input) { r.SpanS = 3600 })}, missing},
		{"24 hours", pipeline.MeanHourly, instants(func(h int) float64 { return float64(h) }, allBut()...),
			and(observed(11.5), func(v *Value) { v.Hours = 24 })}, // (0 + ... + 23)/24
		{"24 hours, with max and min", pipeline.MeanHourly, append(instants(flat(2), allBut()...), whole(tx, 4), whole(tn, 1)),
			and(and(observed(2), extremes(4, 1)), func(v *Value) { v.Hours = 24 })},
		{"24 hours, max below min", pipeline.MeanHourly, append(instants(flat(2), allBut()...), whole(tx, 1), whole(tn, 4)),
			and(and(observed(2), extremes(1, 4)), func(v *Value) { v.Hours, v.Quality = 24, pipeline.QualityInconsistent })},
		{"18 hours, hole of 3", pipeline.MeanHourly, instants(flat(2), allBut(0, 1, 2, 10, 12, 23)...),
			and(observed(2), func(v *Value) { v.Hours, v.LongestHole = 18, 3 })},
		{"17 hours", pipeline.MeanHourly, instants(flat(2), allBut(0, 1, 2, 10, 12, 14, 23)...),
			and(missing, func(v *Value) { v.Hours, v.LongestHole = 17, 3 })},
		{"hole of 4 at the end", pipeline.MeanHourly, instants(flat(2), allBut(20, 21, 22, 23)...),
			and(missing, func(v *Value) { v.Hours, v.LongestHole = 20, 4 })},
		{"no hour", pipeline.MeanHourly, nil, and(missing, func(v *Value) { v.LongestHole = 24 })},
		{"too few hours, max below min", pipeline.MeanHourly, []Input{whole(tx, 1), whole(tn, 4)},
			and(and(missing, extremes(1, 4)), func(v *Value) { v.LongestHole = 24 })},
		{"reported mean is no hour", pipeline.MeanHourly, []Input{whole(mean, 3)}, and(missing, func(v *Value) { v.LongestHole = 24 })},
		{"an hour with many values counts once", pipeline.MeanHourly,
			append(instants(flat(0), allBut(5)...),
				with(instants(flat(10), 5)[0], func(r *Input) { r.StartS += 600 }), with(instants(flat(14), 5)[0], func(r *Input) { r.StartS += 1200 }),
				with(instants(flat(24), 5)[0], func(r *Input) { r.StartS += 3599 })),
			and(observed(16.0/24), func(v *Value) { v.Hours = 24 })}, // (10 + 14 + 24)/3 = 16
		{"instants at the edges of the day", pipeline.MeanHourly,
			append(instants(flat(2), allBut(0)...), instants(flat(26), 0)[0],
				with(instants(flat(900), 0)[0], func(r *Input) { r.StartS-- }), with(instants(flat(900), 0)[0], func(r *Input) { r.StartS += 86400 })),
			and(observed(3), func(v *Value) { v.Hours = 24 })}, // (23 x 2 + 26)/24
		{"hourly means, one that runs into the next day", pipeline.MeanHourly,
			append(instants(flat(2), allBut(23)...), Input{Variable: mean, SpanS: 3601, StartS: start() + 23*3600, ValueC: 900}),
			and(observed(2), func(v *Value) { v.Hours, v.LongestHole = 23, 1 })},
		{"hourly means, the last ends with the day", pipeline.MeanHourly,
			append(instants(flat(2), allBut(23)...), Input{Variable: mean, SpanS: 3600, StartS: start() + 23*3600, ValueC: 26}),
			and(observed(3), func(v *Value) { v.Hours = 24 })},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			c.want.Day, c.want.Rule = aDay, c.rule
			if d := cmp.Diff(c.want, Make(stationBy(c.rule), aDay, c.in)); d != "" {
				t.Errorf("(-want +got):\n%s", d)
			}
		})
	}
}

func TestMakeWithoutMinHours(t *testing.T) {
	st := stationBy(pipeline.MeanHourly)
	st.MinHours, st.MaxHole = 0, 24
	if v := Make(st, aDay, nil); v.Origin != pipeline.Missing {
		t.Errorf("mean %v of no hours", v.MeanC)
	}
	if v := Make(st, aDay, instants(flat(-3), 7)); v.Origin != pipeline.Observed || v.MeanC != -3 || v.LongestHole != 16 {
		t.Errorf("value %+v; want -3 of one hour, longest hole 16", v)
	}
}

func TestMakeMarks(t *testing.T) {
	order := []pipeline.Quality{
		pipeline.QualityGood, pipeline.QualityNotChecked, pipeline.QualityChanged, pipeline.QualityEstimated,
		pipeline.QualityDoubtful, pipeline.QualityInconsistent,
	}
	for i, a := range order {
		for j, b := range order {
			want := order[max(i, j)]
			in := []Input{marked(whole(pipeline.AirTempMax, 3), a), marked(whole(pipeline.AirTempMin, 1), b)}
			if v := Make(stationBy(pipeline.MeanMaxMin), aDay, in); v.Quality != want || v.Origin != pipeline.Observed {
				t.Errorf("%s and %s give %s; want %s", a, b, v.Quality, want)
			}
			hours := instants(flat(2), allBut()...)
			hours[4].Quality, hours[20].Quality = a, b
			if v := Make(stationBy(pipeline.MeanHourly), aDay, hours); v.Quality != want || v.Origin != pipeline.Observed {
				t.Errorf("hours %s and %s give %s; want %s", a, b, v.Quality, want)
			}
		}
	}
	for _, q := range []pipeline.Quality{pipeline.QualityWrong, pipeline.QualityMissing, 8, 255} {
		if v := Make(stationBy(pipeline.MeanAsReported), aDay, []Input{marked(whole(pipeline.AirTempMean, 3), q)}); v.Origin != pipeline.Missing {
			t.Errorf("%s used: %+v", q, v)
		}
	}
	for _, c := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e300} {
		if v := Make(stationBy(pipeline.MeanAsReported), aDay, []Input{whole(pipeline.AirTempMean, c)}); v.Origin != pipeline.Missing {
			t.Errorf("%v used: %+v", c, v)
		}
	}
	// the mark of a maximum that the mean was not made of does not count
	in := []Input{whole(pipeline.AirTempMean, 3), marked(whole(pipeline.AirTempMax, 5), pipeline.QualityDoubtful)}
	if v := Make(stationBy(pipeline.MeanAsReported), aDay, in); v.Quality != pipeline.QualityGood || v.MaxC != 5 {
		t.Errorf("value %+v; want good, maximum 5", v)
	}
}

func TestMakePrecedence(t *testing.T) {
	r := func(feed string, rank int, sensor string, c float64, q pipeline.Quality) Input {
		return Input{Feed: feed, Rank: rank, Sensor: sensor, Variable: pipeline.AirTempMean, SpanS: 86400, StartS: start(), ValueC: c, Quality: q}
	}
	good, wrong, gone := pipeline.QualityGood, pipeline.QualityWrong, pipeline.QualityMissing
	cases := []struct {
		name string
		in   []Input
		want float64 // NaN: missing
	}{
		{"higher rank", []Input{r("a", 1, "air", 1, good), r("z", 2, "air", 2, good)}, 2},
		{"higher rank of worse mark", []Input{r("a", 1, "air", 1, good), r("z", 2, "air", 2, pipeline.QualityDoubtful)}, 2},
		{"feed by name", []Input{r("b", 1, "a", 1, good), r("a", 1, "z", 2, good)}, 2},
		{"sensor by name", []Input{r("a", 1, "z", 1, good), r("a", 1, "b", 2, good)}, 2},
		{"the same key twice: the better mark", []Input{r("a", 1, "air", 1, pipeline.QualityDoubtful), r("a", 1, "air", 2, good)}, 2},
		{"the same key twice: the lower value", []Input{r("a", 1, "air", 1, good), r("a", 1, "air", 2, good)}, 1},
		{"struck out by a higher rank", []Input{r("raw", 1, "air", 1, good), r("edit", 9, "air", 1, wrong)}, math.NaN()},
		{"another sensor is struck out", []Input{r("raw", 1, "spare", 1, good), r("edit", 9, "air", 2, wrong)}, 1},
		{"struck out, then edited higher still", []Input{r("raw", 1, "air", 1, good), r("check", 2, "air", 1, wrong), r("edit", 9, "air", 3, good)}, 3},
		{"wrong at the same rank", []Input{r("a", 1, "air", 1, wrong), r("b", 1, "air", 2, good)}, 2},
		{"wrong at a lower rank", []Input{r("a", 1, "air", 1, wrong), r("b", 2, "air", 2, good)}, 2},
		{"nothing sent at the higher rank", []Input{r("a", 1, "air", 1, good), r("b", 2, "air", 0, gone)}, 1},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			for range 2 {
				v := Make(stationBy(pipeline.MeanAsReported), aDay, c.in)
				if math.IsNaN(c.want) != (v.Origin == pipeline.Missing) || v.Origin == pipeline.Observed && v.MeanC != c.want {
					t.Errorf("%s, mean %v; want %v", v.Origin, v.MeanC, c.want)
				}
				c.in[0], c.in[1] = c.in[1], c.in[0]
			}
		})
	}
}

func TestMakeRefusesAnUnknownRule(t *testing.T) {
	mustPanic(t, `station hill has no rule for the mean: "noon"`, func() { Make(stationBy("noon"), aDay, nil) })
}

// The order of readings never matters, and they are left as they were.
func TestMakeInAnyOrder(t *testing.T) {
	one := rapid.Custom(func(t *rapid.T) Input {
		return Input{
			Feed: rapid.SampledFrom([]string{"a", "b"}).Draw(t, "feed"), Rank: rapid.IntRange(1, 2).Draw(t, "rank"),
			Sensor:   rapid.SampledFrom([]string{"air", "spare"}).Draw(t, "sensor"),
			Variable: pipeline.Variable(rapid.IntRange(1, 4).Draw(t, "variable")),
			SpanS:    rapid.SampledFrom([]int32{0, 600, 3600, 86400}).Draw(t, "span"),
			StartS:   start() + rapid.SampledFrom([]int64{-86400, 0, 600, 3600, 7200, 82800, 86400}).Draw(t, "start"),
			ValueC:   float64(rapid.IntRange(-500, 300).Draw(t, "tenths")) / 10,
			Quality:  pipeline.Quality(rapid.IntRange(0, 7).Draw(t, "quality")),
		}
	})
	rapid.Check(t, func(t *rapid.T) {
		in := rapid.SliceOfN(one, 0, 50).Draw(t, "readings")
		st := stationBy(rapid.SampledFrom(pipeline.MeanRules).Draw(t, "rule"))
		st.MinHours, st.MaxHole = 1, 23
		was := append([]Input(nil), in...)
		want := Make(st, aDay, in)
		if !slices.Equal(was, in) {
			t.Fatalf("readings changed from %v to %v", was, in)
		}
		if got := Make(st, aDay, rapid.Permutation(in).Draw(t, "order")); got != want {
			t.Fatalf("%+v; in another order %+v", got, want)
		}
		if want.Origin == pipeline.Observed && (want.LowC != want.MeanC || want.HighC != want.MeanC || severity(want.Quality) < 0) {
			t.Fatalf("observed day %+v", want)
		}
	})
}

func TestMakeNeedsNoMemory(t *testing.T) {
	st, in := stationBy(pipeline.MeanHourly), append(instants(flat(2), allBut()...), whole(pipeline.AirTempMax, 4))
	if n := testing.AllocsPerRun(10, func() { Make(st, aDay, in) }); n != 0 {
		t.Errorf("%v allocations; want none", n)
	}
}

func BenchmarkMake(b *testing.B) {
	hours := instants(flat(2), allBut()...)
	for _, c := range []struct {
		name string
		rule pipeline.MeanRule
		in   []Input
	}{
		{"max and min", pipeline.MeanMaxMin, []Input{whole(pipeline.AirTempMax, -5), whole(pipeline.AirTempMin, -14)}},
		{"hourly", pipeline.MeanHourly, hours},
	} {
		b.Run(c.name, func(b *testing.B) {
			st := stationBy(c.rule)
			b.ReportAllocs()
			for b.Loop() {
				Make(st, aDay, c.in)
			}
		})
	}
}
