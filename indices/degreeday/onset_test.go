package degreeday

import (
	"testing"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// By hand: C is 2 5 1 -1 3 2 8 4 after the days.
func TestLargestFall(t *testing.T) {
	excess := []float64{2, 3, -4, -2, 4, -1, 6, -4}
	for _, tc := range []struct {
		from, to int
		want     float64
	}{
		{0, 7, 6}, // 5 to -1
		{1, 6, 6},
		{2, 6, 2}, // 1 to -1
		{4, 6, 1}, // 3 to 2
		{6, 6, 0},
		{6, 7, 4},
		{0, 99, 6},
	} {
		if got := LargestFall(excess, tc.from, tc.to); got != tc.want {
			t.Errorf("from %d to %d: %g; want %g", tc.from, tc.to, got, tc.want)
		}
	}
}

// The definition, spelt out.
func TestLargestFallByDefinition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(rapid.IntRange(-9, 9), 1, 40).Draw(t, "excess")
		from, to := rapid.IntRange(0, len(x)-1).Draw(t, "from"), rapid.IntRange(0, len(x)-1).Draw(t, "to")
		excess, c, sum := make([]float64, len(x)), make([]int, len(x)), 0
		for i, v := range x {
			sum += v
			excess[i], c[i] = float64(v), sum
		}
		want := 0
		for i := from; i <= to; i++ {
			for j := i + 1; j <= to; j++ {
				want = max(want, c[i]-c[j])
			}
		}
		if got := LargestFall(excess, from, to); got != float64(want) {
			t.Fatalf("%g; want %d", got, want)
		}
	})
}

func TestSettle(t *testing.T) {
	w := window2031()
	meanC := []float64{-5, 30, 30} // a rise of 60
	ten := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 59.9}
	settled := func(relapses []float64, end pipeline.Day) bool {
		days := make([]float64, end-w.First+1)
		copy(days, meanC)
		s := Build(pipeline.Thaw, w, "2031", 0, observed(w.First, days), end)
		s.Settle(relapses)
		return !s.Curve.OnsetProvisional
	}
	if !settled(ten[:9], w.First+2) || !settled(ten, w.First+2) {
		t.Error("60 degC.d are above 50, and above the largest relapse of 59.9")
	}
	ten[3] = 60
	if settled(ten, w.First+2) {
		t.Error("a past season has lost 60 degC.d from this date on, and the onset is taken to hold")
	}
	if !settled(ten, w.Last) {
		t.Error("the season is over, and its onset is provisional")
	}
}
