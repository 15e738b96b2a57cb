package outlook

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

var tenMembers = []float64{1450, 1520, 1580, 1610, 1700, 1755, 1820, 1900, 1990, 2100}

// Computed independently with Python and R 4.2 from the same published formulas.
func TestCRPSOfTenMembers(t *testing.T) {
	for _, c := range []struct{ outcome, crps, fair float64 }{
		{1400, 228.25, 215.555555555556}, {1640, 68.25, 55.555555555556}, {2200, 343.25, 330.555555555556},
	} {
		if got := CRPS(tenMembers, c.outcome); math.Abs(got-c.crps) > 1e-9 {
			t.Errorf("CRPS at %v: %v; want %v", c.outcome, got, c.crps)
		}
		if got := FairCRPS(tenMembers, c.outcome); math.Abs(got-c.fair) > 1e-9 {
			t.Errorf("fair CRPS at %v: %v; want %v", c.outcome, got, c.fair)
		}
	}
}

// Computed independently with Python and R 4.2 from the same published formulas.
func TestBrierOfTenForecasts(t *testing.T) {
	f := []float64{.1, .1, .1, .4, .4, .4, .4, .7, .7, .9}
	o := []bool{false, false, true, false, true, false, false, true, true, true}
	d := Decompose(f, o)
	skill, ok := d.Skill()
	if !ok {
		t.Fatal("no skill")
	}
	for _, c := range []struct {
		what      string
		got, want float64
	}{
		{"score", Brier(f, o), .186}, {"reliability", d.Reliability, .044333}, {"resolution", d.Resolution, .108333},
		{"uncertainty", d.Uncertainty, .25}, {"skill", skill, .256},
	} {
		if math.Abs(c.got-c.want) > 5e-7 {
			t.Errorf("%s %v; want %v", c.what, c.got, c.want)
		}
	}
	if _, ok := Decompose([]float64{.1, .2}, []bool{true, true}).Skill(); ok {
		t.Error("skill over a climatology that is certain")
	}
}

// Definition 6; computed independently with R 4.2, quantile(x, p, type = 6).
func TestQuantileOfTenMembers(t *testing.T) {
	for _, c := range []struct{ share, want float64 }{{.1, 1457}, {.33, 1598.9}, {.5, 1727.5}, {.9, 2089}} {
		if got := Quantile(tenMembers, c.share); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("%v: %v; want %v", c.share, got, c.want)
		}
	}
	if got := Quantile([]float64{3}, .9); got != 3 {
		t.Errorf("of one: %v", got)
	}
}

// Slope of the freezing indices of winters 1969-70 to 1989-90 in CRREL Report
// 96-14, table 20; computed independently with R 4.2: -14.6 degC.d a year.
func TestTheilSenOfFreezingIndices(t *testing.T) {
	y := []float64{1191, 1152, 1274, 839, 923, 968, 931, 1256, 1331, 1477, 903, 666, 1227, 589, 1179, 942, 1197, 467, 898, 1032, 750}
	x := make([]float64, len(y))
	for i := range x {
		x[i] = float64(1969 + i)
	}
	if got := theilSen(x, y); math.Abs(got - -14.6) > 1e-9 {
		t.Errorf("%v", got)
	}
}

// 22 values of R. O. Gilbert (1987, "Statistical methods for environmental
// pollution monitoring", p. 212); slope computed independently with R and Python.
func TestTheilSenOfGilbert(t *testing.T) {
	y := []float64{20, 20, 20, 20, 15, 20, 20, 30, 27, 26, 23, 35, 25, 28, 70, 26, 24, 34, 32, 23, 50, 30}
	x := make([]float64, len(y))
	for i := range x {
		x[i] = float64(i)
	}
	if got := theilSen(x, y); math.Abs(got-0.666667) > 5e-7 {
		t.Errorf("%v", got)
	}
}

// The scores against their definitions, written out.
func TestScoresByDefinition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		members := rapid.SliceOfN(rapid.Float64Range(0, 3000), 2, 40).Draw(t, "members")
		y := rapid.Float64Range(0, 3000).Draw(t, "outcome")
		slices.Sort(members)
		var far, apart float64
		for _, a := range members {
			far += math.Abs(a - y)
			for _, b := range members {
				apart += math.Abs(a - b)
			}
		}
		n := float64(len(members))
		if got, want := CRPS(members, y), far/n-apart/(2*n*n); math.Abs(got-want) > 1e-8 {
			t.Fatalf("CRPS %v; want %v", got, want)
		}
		if got, want := FairCRPS(members, y), far/n-apart/(2*n*(n-1)); math.Abs(got-want) > 1e-8 {
			t.Fatalf("fair CRPS %v; want %v", got, want)
		}
		f := rapid.SliceOfN(rapid.SampledFrom([]float64{.05, .2, .5, .75, .99}), 1, 30).Draw(t, "forecasts")
		o := rapid.SliceOfN(rapid.Bool(), len(f), len(f)).Draw(t, "happened")
		var sum float64
		for i := range f {
			if o[i] {
				sum += square(1 - f[i])
			} else {
				sum += square(f[i])
			}
		}
		if got, want := Brier(f, o), sum/float64(len(f)); math.Abs(got-want) > 1e-12 {
			t.Fatalf("Brier %v; want %v", got, want)
		}
	})
}

// The quantile of a population has the least expected pinball score: here, of a
// sample, no other value scores better than one of its own quantiles.
func TestPinballIsLeastAtTheQuantile(t *testing.T) {
	total := func(q float64) (sum float64) {
		for _, y := range tenMembers {
			sum += Pinball(q, .25, y)
		}
		return sum
	}
	least := total(1580) // the third of ten: at least a quarter are at most it, at least three quarters at least
	for q := 1400.0; q < 2200; q += 5 {
		if total(q) < least {
			t.Errorf("%v at %v, %v at the quantile", total(q), q, least)
		}
	}
	if got := Pinball(1600, .9, 1500); math.Abs(got-10) > 1e-12 { // (1 - 0.9) * 100, by hand
		t.Errorf("%v", got)
	}
}
