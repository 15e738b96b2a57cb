package compensated

import (
	"math/big"
	"testing"

	"pgregory.net/rapid"
)

// The sum is 2, and adding up as it comes gives 0.
func TestSum(t *testing.T) {
	var s Sum
	for _, x := range []float64{1, 1e100, 1, -1e100} {
		s.Add(x)
	}
	if got := s.Value(); got != 2 {
		t.Errorf("%v; want 2", got)
	}
}

// A year of temperatures in hundredths is summed exactly, and rounded once.
func TestSumIsExact(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var s Sum
		exact := new(big.Float).SetPrec(500)
		for _, n := range rapid.SliceOfN(rapid.IntRange(-8000, 6000), 1, 366).Draw(t, "hundredths") {
			c := float64(n) / 100
			s.Add(c)
			exact.Add(exact, big.NewFloat(c))
		}
		if want, _ := exact.Float64(); s.Value() != want {
			t.Fatalf("%v; want %v", s.Value(), want)
		}
	})
}
