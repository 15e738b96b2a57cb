package degreeday

import (
	"math"
	"math/big"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// tenths draws temperatures as stations state them.
func tenths(low, high float64) *rapid.Generator[float64] {
	return rapid.Map(rapid.IntRange(int(low*10), int(high*10)), func(n int) float64 { return float64(n) / 10 })
}

func series(t *rapid.T, name string) []float64 {
	return rapid.SliceOfN(tenths(-60, 40), 1, 120).Draw(t, name)
}

func last(s []float64) float64 { return s[len(s)-1] }

func TestCurveIsTheLargestRise(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		// quarters are exact in binary, so that ties are ties
		x := rapid.SliceOfN(rapid.Map(rapid.IntRange(-12, 12), func(n int) float64 { return float64(n) / 4 }), 1, 60).Draw(t, "excess")
		c := make([]float64, len(x)+1)
		for i, v := range x {
			c[i+1] = c[i] + v
		}
		most, first, end := 0.0, -1, -1
		for j := 1; j < len(c); j++ {
			for i := range j {
				rise := c[j] - c[i]
				if rise > most || rise == most && rise > 0 && j-1 == end {
					most, first, end = rise, i, j-1 // earliest high, then latest low
				}
			}
		}
		got := Rise(x)
		if last(got.ToDate) != most || got.First != first || got.Last != end {
			t.Fatalf("rise %v from %d to %d; all pairs give %v from %d to %d", last(got.ToDate), got.First, got.Last, most, first, end)
		}
	})
}

func TestToDateNeverFallsAndCurveIsAtMostSum(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(rapid.Float64Range(-90, 60), 1, 120).Draw(t, "excess")
		got := Rise(x)
		for i := range x {
			if i > 0 && (got.ToDate[i] < got.ToDate[i-1] || got.Sum[i] < got.Sum[i-1]) {
				t.Fatalf("falls at %d: %v", i, got)
			}
			if got.Running[i] < 0 || got.Running[i] > got.ToDate[i] || got.ToDate[i] > got.Sum[i] {
				t.Fatalf("at %d: running %v, to date %v, sum %v", i, got.Running[i], got.ToDate[i], got.Sum[i])
			}
		}
	})
}

// Every figure is the exact one, rounded once: compensation loses nothing.
func TestSumsAreExact(t *testing.T) {
	exact := func() *big.Float { return new(big.Float).SetPrec(2000) }
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(tenths(-60, 40), 50, 366).Draw(t, "excess")
		got := Rise(x)
		running, sum := exact(), exact()
		for i, v := range x {
			if running.Add(running, big.NewFloat(v)); running.Sign() < 0 {
				running = exact()
			}
			sum.Add(sum, big.NewFloat(max(v, 0)))
			wantRunning, _ := running.Float64()
			wantSum, _ := sum.Float64()
			if got.Running[i] != wantRunning || got.Sum[i] != wantSum {
				t.Fatalf("at %d: running %v, sum %v; exactly %v and %v", i, got.Running[i], got.Sum[i], wantRunning, wantSum)
			}
		}
	})
}

// The window may start anywhere in the cold season: not a bit changes.
func TestStartInTheColdSeasonDoesNotMatter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		cold := rapid.SliceOfN(tenths(-60, 0), 1, 60).Draw(t, "cold")
		x := series(t, "excess")
		short, long := Rise(x), Rise(slices.Concat(cold, x))
		n := len(cold)
		if !slices.Equal(long.Running[n:], short.Running) || !slices.Equal(long.ToDate[n:], short.ToDate) || !slices.Equal(long.Sum[n:], short.Sum) {
			t.Fatalf("start moved by %d cold days: %v, was %v", n, long, short)
		}
		if short.First >= 0 && (long.First != short.First+n || long.Last != short.Last+n) {
			t.Fatalf("rise from %d to %d; want %d to %d", long.First, long.Last, short.First+n, short.Last+n)
		}
	})
}

// Cold days after the high lower the running value and leave the index.
func TestColdAfterTheHigh(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := append(series(t, "excess"), 30)
		cold := rapid.SliceOfN(tenths(-60, -0.1), 1, 60).Draw(t, "cold")
		before, after := Rise(x), Rise(slices.Concat(x, cold))
		if last(after.ToDate) != last(before.ToDate) || last(after.Sum) != last(before.Sum) || after.Last != before.Last {
			t.Fatalf("index %v, was %v", last(after.ToDate), last(before.ToDate))
		}
		if !(last(after.Running) < last(before.Running)) {
			t.Fatalf("running %v did not fall from %v", last(after.Running), last(before.Running))
		}
	})
}

func TestScalesWithTheUnit(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(tenths(-60, 40), 1, 366).Draw(t, "excess")
		inC, inF := Rise(x), Rise(scaled(x, 1.8))
		for i := range x {
			for _, p := range [][2]float64{{inF.Running[i], inC.Running[i]}, {inF.ToDate[i], inC.ToDate[i]}, {inF.Sum[i], inC.Sum[i]}} {
				if math.Abs(p[0]-1.8*p[1]) > 1e-9 {
					t.Fatalf("at %d: %v degF.d for %v degC.d", i, p[0], p[1])
				}
			}
		}
	})
}

// A warmer day never lowers any of the three, not by a bit.
func TestMonotoneInEachDay(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(rapid.Float64Range(-90, 60), 1, 120).Draw(t, "excess")
		warmer := slices.Clone(x)
		warmer[rapid.IntRange(0, len(x)-1).Draw(t, "day")] += rapid.Float64Range(0, 20).Draw(t, "by")
		a, b := Rise(x), Rise(warmer)
		for i := range x {
			if b.Running[i] < a.Running[i] || b.ToDate[i] < a.ToDate[i] || b.Sum[i] < a.Sum[i] {
				t.Fatalf("at %d: fell from %v, %v, %v to %v, %v, %v", i, a.Running[i], a.ToDate[i], a.Sum[i], b.Running[i], b.ToDate[i], b.Sum[i])
			}
		}
	})
}

// days draws a record of days with gaps.
func days(t *rapid.T, w Window) []DayMean {
	out := observed(w.First, series(t, "mean"))
	for i := range out {
		switch rapid.IntRange(0, 3).Draw(t, "what") {
		case 0:
			low := rapid.Float64Range(-60, 40).Draw(t, "low")
			out[i] = DayMean{Day: out[i].Day, Origin: pipeline.Missing, LowC: low, HighC: low + rapid.Float64Range(0, 30).Draw(t, "range")}
		case 1:
			out[i].Origin = pipeline.Interpolated
		}
	}
	return out
}

func end(days []DayMean) pipeline.Day { return days[len(days)-1].Day }

// Freezing is thawing of the mirrored temperatures, to the last bit.
func TestFreezeMirrorsThaw(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w := window2031()
		baseC := tenths(-5, 5).Draw(t, "base")
		in := days(t, w)
		mirrored := slices.Clone(in)
		for i, m := range in {
			mirrored[i].MeanC, mirrored[i].LowC, mirrored[i].HighC = -m.MeanC, -m.HighC, -m.LowC
		}
		thaw := Build(pipeline.Thaw, w, "", baseC, in, end(in))
		freeze := Build(pipeline.Freeze, w, "", -baseC, mirrored, end(in))
		if thaw.Curve != freeze.Curve || thaw.Sum != freeze.Sum || !slices.Equal(thaw.Days, freeze.Days) {
			t.Fatalf("thaw %+v, freeze %+v", thaw, freeze)
		}
	})
}

// Whatever the missing days were, within their bounds, the truth is within the
// bounds of every index on every day; and the bounds are reached.
func TestBoundsHoldForEveryFilling(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		w := window2031()
		kind := rapid.SampledFrom([]pipeline.Kind{pipeline.Thaw, pipeline.Freeze}).Draw(t, "kind")
		baseC := tenths(-5, 5).Draw(t, "base")
		in := days(t, w)
		got := Build(kind, w, "", baseC, in, end(in))
		filled := func(fill func(m DayMean) float64) Season {
			out := slices.Clone(in)
			for i, m := range in {
				if m.Origin == pipeline.Missing {
					c := fill(m)
					out[i] = DayMean{Day: m.Day, Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
				}
			}
			return Build(kind, w, "", baseC, out, end(out))
		}
		truth := filled(func(m DayMean) float64 { return rapid.Float64Range(m.LowC, m.HighC).Draw(t, "true mean") })
		low := filled(func(m DayMean) float64 { return m.LowC })
		high := filled(func(m DayMean) float64 { return m.HighC })
		if kind == pipeline.Freeze {
			low, high = high, low
		}
		for i, d := range got.Days {
			for _, p := range [][4]Bounds{
				{d.Running, truth.Days[i].Running, low.Days[i].Running, high.Days[i].Running},
				{d.CurveToDate, truth.Days[i].CurveToDate, low.Days[i].CurveToDate, high.Days[i].CurveToDate},
				{d.Sum, truth.Days[i].Sum, low.Days[i].Sum, high.Days[i].Sum},
			} {
				if p[0].Low > p[1].Low || p[1].Low > p[0].High {
					t.Fatalf("%s: truth %v outside %v", d.Day, p[1].Low, p[0])
				}
				if p[0] != (Bounds{p[2].Low, p[3].High}) {
					t.Fatalf("%s: bounds %v; the fillings give %v and %v", d.Day, p[0], p[2].Low, p[3].High)
				}
			}
		}
		if got.Curve.Began != low.Curve.Began || got.Curve.First != low.Curve.First || got.Curve.Last != low.Curve.Last {
			t.Fatalf("rise from %s to %s; the low filling has %s to %s", got.Curve.First, got.Curve.Last, low.Curve.First, low.Curve.Last)
		}
	})
}
