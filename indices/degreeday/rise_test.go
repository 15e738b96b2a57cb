package degreeday

import (
	"math"
	"slices"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// Hand-computable series; the cumulative curve was worked by hand.
var (
	handThaw = []float64{-6, -4, -2, 3, 2, -4, -5, -1, 1, 4, 6, 8, 9, 7, -3, 5, 6, 4, 2, -1, 3, -2, -5, -6, -8}
	// C of handThaw, from C(0).
	handThawC = []float64{0, -6, -10, -12, -9, -7, -11, -16, -17, -16, -12, -6, 2, 11, 18, 15, 20, 26, 30, 32, 31, 34, 32, 27, 21, 13}
	// C less its lowest so far, from day 0.
	handThawRunning = []float64{0, 0, 0, 3, 5, 1, 0, 0, 1, 5, 11, 19, 28, 35, 32, 37, 43, 47, 49, 48, 51, 49, 44, 38, 30}
	handFreeze      = []float64{5, 3, -1, 2, -4, -6, 1, -8, -10, -12, 3, 2, -9, -7, -2, -1, 1, -3, 2, 4, -1, 6}
	// max(C) - min(C) is 25 here, with the low after the high.
	handOrder = []float64{6, 4, -3, -8, -9, -5, 2, 7, 5, -1}
)

func scaled(in []float64, by float64) []float64 {
	out := make([]float64, len(in))
	for i, x := range in {
		out[i] = x * by
	}
	return out
}

func TestRiseOfHandSeries(t *testing.T) {
	cases := []struct {
		name        string
		excessC     []float64
		curve, sum  float64
		first, last int
	}{
		// hand-computable series; cumulative curve worked by hand: low after day 8, high after day 21
		{name: "thaw", excessC: handThaw, curve: 51, sum: 60, first: 8, last: 20},
		// the same: high after day 4, low after day 18
		{name: "freeze", excessC: scaled(handFreeze, -1), curve: 55, sum: 64, first: 4, last: 17},
		// the same; C is 0 6 10 7 -1 -10 -15 -13 -6 -1 -2
		{name: "thaw with the low after the high", excessC: handOrder, curve: 14, sum: 24, first: 6, last: 8},
		{name: "freeze with the low after the high", excessC: scaled(handOrder, -1), curve: 25, sum: 26, first: 2, last: 5},
		// by the definition
		{name: "no day", excessC: nil, first: -1, last: -1},
		{name: "no day above zero", excessC: []float64{-1, 0, -3}, first: -1, last: -1},
		{name: "a day at the base adds nothing", excessC: []float64{0, 2, 0}, curve: 2, sum: 2, first: 1, last: 1},
		{name: "warm from the first day", excessC: []float64{1, 2}, curve: 3, sum: 3, first: 0, last: 1},
		{name: "equal highs: the earliest", excessC: []float64{4, -1, 1}, curve: 4, sum: 5, first: 0, last: 0},
		{name: "equal lows: the latest", excessC: []float64{1, -1, 0, 3}, curve: 3, sum: 4, first: 3, last: 3},
		{name: "equal rises: the earliest", excessC: []float64{3, -5, 3}, curve: 3, sum: 6, first: 0, last: 0},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			got := Rise(c.excessC)
			var curve, sum float64
			if n := len(c.excessC); n > 0 {
				curve, sum = got.ToDate[n-1], got.Sum[n-1]
			}
			if curve != c.curve || sum != c.sum {
				t.Errorf("curve %v, sum %v; want %v, %v", curve, sum, c.curve, c.sum)
			}
			if got.First != c.first || got.Last != c.last {
				t.Errorf("rise from place %d to %d; want %d to %d", got.First, got.Last, c.first, c.last)
			}
		})
	}
}

func TestRiseDayByDay(t *testing.T) {
	got := Rise(handThaw)
	if d := cmp.Diff(handThawRunning, got.Running); d != "" {
		t.Errorf("running (-want +got):\n%s", d)
	}
	lowest := 0.0
	for i, c := range handThawC[1:] {
		lowest = min(lowest, c)
		if got.Running[i] != c-lowest {
			t.Errorf("day %d: running %v; the curve gives %v", i+1, got.Running[i], c-lowest)
		}
		if want := slices.Max(got.Running[:i+1]); got.ToDate[i] != want {
			t.Errorf("day %d: to date %v; want %v", i+1, got.ToDate[i], want)
		}
	}
	// 51 degC.d = 91.8 degF.d (1 degC.d = 1.8 degF.d, no offset of 32)
	inF := Rise(scaled(handThaw, 1.8))
	if got := inF.ToDate[len(handThaw)-1]; math.Abs(got-91.8) > 1e-12 {
		t.Errorf("index %v degF.d; want 91.8", got)
	}
}

// The order of low and high matters: the highest less the lowest of C is another
// number, and so is the running value at the end.
func TestRiseIsNotTheNaiveRange(t *testing.T) {
	c, high, low := 0.0, 0.0, 0.0
	for _, x := range handOrder {
		c += x
		high, low = max(high, c), min(low, c)
	}
	if high-low != 25 { // hand-computable series; cumulative curve worked by hand
		t.Fatalf("naive range %v; want 25", high-low)
	}
	if got := Rise(handOrder).ToDate[len(handOrder)-1]; got != 14 {
		t.Errorf("index %v; want 14, not the naive 25", got)
	}
	got := Rise(handThaw)
	if end := len(handThaw) - 1; got.Running[end] != 30 || got.ToDate[end] != 51 {
		t.Errorf("after the high: running %v, to date %v; want 30 and 51", got.Running[end], got.ToDate[end])
	}
}

// A relapse in spring moves the onset; it does not lower the index to date.
func TestRelapseInSpring(t *testing.T) {
	upTo := Rise(handThaw[:5])
	if upTo.First != 3 || upTo.Running[4] != 5 {
		t.Fatalf("false start: first %d, running %v; want 3 and 5", upTo.First, upTo.Running[4])
	}
	after := Rise(handThaw[:8])
	if after.Running[7] != 0 || after.ToDate[7] != 5 || after.First != 3 {
		t.Errorf("after the relapse: running %v, to date %v, first %d; want 0, 5, 3", after.Running[7], after.ToDate[7], after.First)
	}
	if whole := Rise(handThaw); whole.First != 8 {
		t.Errorf("onset at place %d; want 8", whole.First)
	}
}

// Sinusoid T = M + A cos(2 pi (d + 0.5 - 200)/365), d = 0..364. Sums by an
// independent program; closed form TDD = (365/pi) [A sin phi + M phi],
// FDD = (365/pi) [A sin phi - M (pi - phi)], phi = arccos(-M/A), by integration
// of the sinusoid; TDD - FDD = sum of T.
func TestSinusoid(t *testing.T) {
	cases := []struct {
		name                               string
		m, a                               float64
		tdd, tddAnalytic, fdd, fddAnalytic float64
		seasonDays                         float64
	}{
		{"mean -5, amplitude 20", -5, 20, 1484.128669, 1484.162108, 3309.128669, 3309.162108, 153.1428},
		{"mean -10, amplitude 18", -10, 18, 598.245229, 598.224035, 4248.245229, 4248.224035, 114.0646},
		{"mean -2.7, amplitude 20.5", -2.7, 20.5, 1909.658121, 1909.691666, 2895.158121, 2895.191666, 167.1532},
		{"mean -11, amplitude 16", -11, 16, 311.220030, 311.212590, 4326.220030, 4326.212590, 94.4285},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			meanC := make([]float64, 365)
			total := 0.0
			for d := range meanC {
				meanC[d] = c.m + c.a*math.Cos(2*math.Pi*(float64(d)+0.5-200)/365)
				total += meanC[d]
			}
			thaw, freeze := Rise(meanC), Rise(scaled(meanC, -1))
			tdd, fdd := thaw.Sum[364], freeze.Sum[364]
			near(t, "thaw sum", tdd, c.tdd, 1e-6)
			near(t, "freeze sum", fdd, c.fdd, 1e-6)
			near(t, "sum of T", tdd-fdd, total, 1e-9)
			// one warm season, low before high: both definitions agree
			near(t, "thaw curve", thaw.ToDate[364], c.tdd, 1e-6)
			near(t, "length of the thaw season", float64(thaw.Last-thaw.First+1), c.seasonDays, 1)

			phi := math.Acos(-c.m / c.a)
			near(t, "analytic thaw", 365/math.Pi*(c.a*math.Sin(phi)+c.m*phi), c.tddAnalytic, 1e-6)
			near(t, "analytic freeze", 365/math.Pi*(c.a*math.Sin(phi)-c.m*(math.Pi-phi)), c.fddAnalytic, 1e-6)
			near(t, "analytic length", 365*phi/math.Pi, c.seasonDays, 1e-4)
			// daily sums stand for an integral: midpoint rule, one day a step
			near(t, "thaw sum against its integral", tdd, c.tddAnalytic, 0.05)
			near(t, "freeze sum against its integral", fdd, c.fddAnalytic, 0.05)
		})
	}
}

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within) {
		t.Errorf("%s: %.9f; want %.9f within %g", what, got, want, within)
	}
}

func TestRiseInTheSameMemory(t *testing.T) {
	track := Rise(handThaw)
	if n := testing.AllocsPerRun(10, func() { track.Rise(handFreeze) }); n != 0 {
		t.Errorf("%v allocations; want none", n)
	}
	if d := cmp.Diff(Rise(handFreeze), track); d != "" {
		t.Errorf("made in used memory (-fresh +reused):\n%s", d)
	}
}

func TestRiseRefuses(t *testing.T) {
	for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 2e6} {
		mustPanic(t, "place 1", func() { Rise([]float64{0, x}) })
	}
}

func BenchmarkRise(b *testing.B) {
	excessC := make([]float64, 365)
	for d := range excessC {
		excessC[d] = -5 + 20*math.Cos(2*math.Pi*(float64(d)+0.5-200)/365)
	}
	var track Track
	b.ReportAllocs()
	for b.Loop() {
		track.Rise(excessC)
	}
}
