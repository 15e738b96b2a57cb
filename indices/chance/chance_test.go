package chance

import (
	"fmt"
	"math"
	"reflect"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"thawledger/indices/extreme"
	"thawledger/pipeline"
)

func seasons(first int, values ...float64) []Season {
	out := make([]Season, len(values))
	for i, v := range values {
		out[i] = Season{Year: first + i, Label: fmt.Sprint(first + i), CDays: v}
	}
	return out
}

// crrel is the record of freezing indices, winters 1969-70 to 1989-90, degC.d, of
// CRREL Report 96-14, table 20.
func crrel() []Season {
	return seasons(1969, 1191, 1152, 1274, 839, 923, 968, 931, 1256, 1331, 1477, 903, 666, 1227, 589, 1179, 942,
		1197, 467, 898, 1032, 750)
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.10g; want %.10g, within %g", what, got, want, tolerance)
	}
}

func ask(t *testing.T, q Question) Answer {
	t.Helper()
	a, err := Of(q)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// Source of the record: CRREL Report 96-14, table 20. The figures were computed
// independently with R 4.2: Latest's with pgamma by a Pearson III fitted by
// numerical integration (our fit is good to 5e-5), Trend's with a GEV fitted to the
// residuals by uniroot; the interval of the count by prop.test.
func TestCRREL(t *testing.T) {
	a := ask(t, Question{1300, pipeline.NotAbove, crrel(), 1990, 10, extreme.Usual()})
	if a.Seasons != 21 || len(a.Passed) != 2 || a.Passed[0].Label != "1977" || a.Passed[1].Label != "1978" || a.Rank != 3 {
		t.Errorf("%+v", a)
	}
	l := a.Latest
	if l.Seasons != 21 || l.First != 1969 || l.Last != 1989 || l.Passed != 2 || l.Fitted.Name != extreme.NamePearson3 {
		t.Fatalf("%+v %+v", l, l.Fitted)
	}
	near(t, "counted", l.Empirical, 2.5/22, 1e-15)
	near(t, "its low", l.EmpiricalInterval.Low, 0.0320334020639696, 1e-9)
	near(t, "its high", l.EmpiricalInterval.High, 0.2508347577434762, 1e-9)
	near(t, "fitted", l.Fitted.Chance, 0.131991316846133, 1e-5)
	near(t, "in 10 years", l.Life, 0.757204464464973, 1e-5)

	m := a.Trend
	if m.Seasons != 21 || m.Passed != 1 || m.Fitted.Name != extreme.NameGEV {
		t.Fatalf("%+v %+v", m, m.Fitted)
	}
	near(t, "moved, counted", m.Empirical, 1.5/22, 1e-15)
	near(t, "moved, fitted", m.Fitted.Chance, 0.0269332108778298, 1e-12)
	near(t, "moved, in 10 years", m.Life, 0.110655681171987, 1e-12)
	if i := m.Fitted.Interval; !(i.Low <= m.Fitted.Chance && m.Fitted.Chance <= i.High) || i.High > 0.5 {
		t.Errorf("interval %+v", i)
	}
	if got := m.Period().String(); got != "37 years" {
		t.Errorf("returns in %s", got)
	}
	near(t, "slope", a.Change.Line.Slope, -14.6, 1e-12)
	near(t, "p", a.Change.Kendall.P, .155825, 5e-7)
	if a.Change.Significant() {
		t.Error("a trend of p 0.156 is significant")
	}

	// What must freeze enough, on the other side.
	b := ask(t, Question{700, pipeline.NotBelow, crrel(), 1990, 30, extreme.Usual()})
	if len(b.Passed) != 3 || b.Trend.Passed != 5 {
		t.Errorf("%d below 700, %d of them moved; 3 and 5 by R", len(b.Passed), b.Trend.Passed)
	}
	near(t, "below 700", b.Trend.Fitted.Chance, 0.276572524850793, 1e-12)
	near(t, "below 700 in 30 years", b.Trend.Life, 0.999999999999782, 1e-12)
}

// At the design value a season has passed what it must not reach, and has not
// fallen below what it must.
func TestAtTheDesignValue(t *testing.T) {
	record := seasons(2000, 90, 100, 110, 120)
	for direction, want := range map[pipeline.Direction][]int{
		pipeline.NotAbove: {2001, 2002, 2003}, pipeline.NotBelow: {2000},
	} {
		a := ask(t, Question{100, direction, record, 2004, 1, extreme.Usual()})
		var got []int
		for _, s := range a.Passed {
			got = append(got, s.Year)
		}
		if !slices.Equal(got, want) || a.Rank != len(want)+1 {
			t.Errorf("%s: %v, rank %d; want %v", direction, got, a.Rank, want)
		}
	}
}

// A record without a trend gives the same both ways but for the noise; with a
// steady warming the latest 30 years lag behind by half of their length, which the
// line makes good. The chances are those of the normal distribution drawn from.
func TestWarmingIsMadeGood(t *testing.T) {
	// 60 seasons of mean 1000 + 8 a year, whose deviations are normal quantiles of
	// standard deviation 100, shuffled by a fixed step so that they have no trend.
	normal := extreme.Normal{Mean: 0, SD: 100}
	record := seasons(1970, make([]float64, 60)...)
	for i := range record {
		record[i].CDays = 1000 + 8*float64(i) + normal.Quantile((float64(i*23%60)+0.5)/60)
	}
	design := 1000 + 8*60 + 128.155 // the value of 10 years in 2030
	a := ask(t, Question{design, pipeline.NotAbove, record, 2030, 30, extreme.Usual()})
	near(t, "by the trend", a.Trend.Fitted.Chance, 0.10, 0.02)
	if a.Latest.Seasons != 30 || a.Latest.First != 2000 || a.Latest.Chance() > 0.04 {
		t.Errorf("by the latest 30 years %+v", a.Latest)
	}
	near(t, "slope", a.Change.Line.Slope, 8, 0.5)
	if !a.Change.Significant() || a.Trend.Seasons != 60 {
		t.Errorf("%+v", a.Change)
	}
	if i := a.Trend.Fitted.Interval; !(i.Low < 0.1 && 0.1 < i.High) {
		t.Errorf("interval %+v", i)
	}
	// 1 - product of normal chances over 30 years of 8 more each
	spared := 1.0
	for m := range 30 {
		spared *= 1 - normal.Above(128.155-8*float64(m))
	}
	near(t, "in 30 years", a.Trend.Life, 1-spared, 0.01)
}

// With few seasons the count stands alone, and there is no line.
func TestFewSeasons(t *testing.T) {
	a := ask(t, Question{1000, pipeline.NotAbove, crrel()[:3], 1990, 30, extreme.Usual()})
	if a.Latest.Fitted != nil || a.Trend != nil || a.NoTrend == "" || a.Change != nil || a.Latest.Passed != 3 {
		t.Errorf("%+v", a)
	}
	near(t, "counted", a.Latest.Chance(), 3.5/4, 0)
	near(t, "life", a.Latest.Life, 1, 1e-15)
	a = ask(t, Question{1000, pipeline.NotAbove, crrel()[:12], 1990, 30, extreme.Usual()})
	if a.Latest.Fitted == nil || a.Trend != nil || a.Change == nil {
		t.Errorf("%+v", a)
	}
	a = ask(t, Question{100, pipeline.NotAbove, seasons(1950, slices.Repeat([]float64{7}, 25)...), 1990, 30, extreme.Usual()})
	if a.Latest.Fitted != nil || a.Trend == nil || a.Trend.Fitted != nil || a.Latest.Passed != 0 {
		t.Errorf("all the same: %+v", a)
	}
	near(t, "never counted", a.Trend.Chance(), 0.5/26, 1e-15)
}

// Gaps in the record: the latest 30 years are years, not seasons.
func TestLatestAreYears(t *testing.T) {
	record := append(seasons(1950, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12), seasons(2001, 5, 6, 7)...)
	a := ask(t, Question{6, pipeline.NotAbove, record, 2005, 1, extreme.Usual()})
	if a.Latest.Seasons != 3 || a.Latest.First != 2001 || a.Latest.Passed != 2 || a.Seasons != 15 || len(a.Passed) != 9 {
		t.Errorf("%+v", a)
	}
}

func TestRefuses(t *testing.T) {
	for name, record := range map[string][]Season{
		"none": nil, "twice": append(seasons(2000, 1), seasons(2000, 2)...), "this year": seasons(2005, 1),
		"not a number": seasons(2000, math.NaN()),
	} {
		if a, err := Of(Question{1, pipeline.NotAbove, record, 2005, 1, extreme.Usual()}); err == nil {
			t.Errorf("%s: %+v", name, a)
		}
	}
}

// Order does not matter; a higher limit is passed no more often; all chances are
// chances.
func TestProperties(t *testing.T) {
	quick := extreme.Bootstrap{Replicates: 50, Confidence: 0.9, Seed: 1}
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.SampledFrom([]int{1, 2, 3, 4, 9, 10, 12, 20}).Draw(t, "n")
		values := make([]float64, n) // in tenths, as an index may well be
		for i, tenths := range rapid.SliceOfN(rapid.IntRange(0, 20000), n, n).Draw(t, "values") {
			values[i] = float64(tenths) / 10
		}
		record := seasons(1990, values...)
		direction := rapid.SampledFrom([]pipeline.Direction{pipeline.NotAbove, pipeline.NotBelow}).Draw(t, "direction")
		q := Question{rapid.Float64Range(1, 2500).Draw(t, "design"), direction, record, 1990 + n, 20, quick}
		a, err := Of(q)
		if err != nil {
			t.Fatal(err)
		}
		for _, e := range []*Estimate{&a.Latest, a.Trend} {
			if e == nil {
				continue
			}
			if !(e.Empirical > 0 && e.Empirical < 1 && e.Chance() >= 0 && e.Chance() <= 1 && e.Life >= 0 && e.Life <= 1) {
				t.Fatalf("%+v", e)
			}
			if i := e.EmpiricalInterval; !(i.Low <= i.High && i.Low >= 0 && i.High <= 1) {
				t.Fatalf("%+v", i)
			}
		}
		slices.Reverse(record)
		b, err := Of(q)
		if err != nil || !reflect.DeepEqual(a, b) {
			t.Fatalf("another order: %+v; %+v, %v", a, b, err)
		}
		higher := q
		higher.DesignCDays *= 1.1
		c := higher.counted(values)
		more := c.Passed - len(a.Passed)
		if direction == pipeline.NotAbove && more > 0 || direction == pipeline.NotBelow && more < 0 {
			t.Fatalf("%d more pass a higher design value", more)
		}
	})
}

// R 4.2, prop.test without correction, 90 %.
func TestWilson(t *testing.T) {
	three, none := Wilson(3, 30, 0.9), Wilson(0, 30, 0.9)
	near(t, "3 of 30, low", three.Low, 0.0406769670092309, 1e-9)
	near(t, "3 of 30, high", three.High, 0.2255024794908485, 1e-9)
	near(t, "none of 30, low", none.Low, 0, 0)
	near(t, "none of 30, high", none.High, 0.0827243081250992, 1e-9)
	near(t, "all of 30, low", Wilson(30, 30, 0.9).Low, 1-0.0827243081250992, 1e-9)
}

func BenchmarkOf(b *testing.B) {
	record := seasons(1930, make([]float64, 95)...)
	for i := range record {
		record[i].CDays = 1500 + 3*float64(i) + 200*math.Sin(float64(i*i))
	}
	for b.Loop() {
		if _, err := Of(Question{2000, pipeline.NotAbove, record, 2025, 30, extreme.Usual()}); err != nil {
			b.Fatal(err)
		}
	}
}
