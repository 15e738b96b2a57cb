package extreme

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// Source of the figures: R 4.2, pgamma.
func TestGammaAgainstR(t *testing.T) {
	for _, tc := range []struct{ a, z, lower, upper float64 }{
		{0.3, 0, 0.726957343710366, 0.273042656289634},
		{0.3, 0.5, 0.836155434742002, 0.163844565257998},
		{0.3, 5, 0.993800479269142, 0.00619952073085814},
		{1, 2, 0.950212931632136, 0.0497870683678639},
		{4, -1, 0.142876539501453, 0.857123460498547},
		{4, 0, 0.566529879633291, 0.433470120366709},
		{4, 5, 0.999525751453871, 0.000474248546128735},
		{100, -3, 0.000430372594979891, 0.99956962740502},
		{100, 0.5, 0.700245342391156, 0.299754657608844},
		{100, 5, 0.999994075459665, 5.92454033548392e-06},
		{9999, -3, 0.00123416992205302, 0.998765830077947},
		{9999, 0, 0.501329874835433, 0.498670125164567},
		{9999, 5, 0.999999572404513, 4.27595486597907e-07},
		{10001, -3, 0.0012341812460472, 0.998765818753953},
		{10001, 0, 0.501329741854451, 0.498670258145549},
		{10001, 5, 0.999999572420994, 4.27579005779183e-07},
		{1e6, -3, 0.0013381041673136, 0.998661895832686},
		{1e6, 2, 0.97719590410123, 0.0228040958987699},
		{4e10, 0.5, 0.691462901355626, 0.308537098644374},
		{4e10, 5, 0.999999713288954, 2.86711045708652e-07},
	} {
		lower, upper := gammaSides(tc.a, tc.z)
		near(t, "lower", lower/tc.lower, 1, 1e-10)
		near(t, "upper", upper/tc.upper, 1, 1e-10)
		p, q := lower, upper
		if math.Abs(gammaQuantile(tc.a, p, q)-tc.z) > 1e-8 {
			t.Errorf("quantile of %v by %v: %v; want %v", p, tc.a, gammaQuantile(tc.a, p, q), tc.z)
		}
	}
}

func anyDistribution(t *rapid.T) Distribution {
	location, scale := rapid.Float64Range(-500, 4000).Draw(t, "location"), rapid.Float64Range(10, 500).Draw(t, "scale")
	switch rapid.SampledFrom(Names).Draw(t, "name") {
	case NameGEV:
		return GEV{location, scale, rapid.Float64Range(-0.9, 1).Draw(t, "k")} // beyond 1 the density grows without limit at the upper end
	case NameGumbel:
		return Gumbel{location, scale}
	case NameNormal:
		return Normal{location, scale}
	}
	return Pearson3{location, scale, rapid.Float64Range(-2, 2).Draw(t, "skew")}
}

// Quantile inverts CDF, both tails add up to 1, and both rise and fall.
func TestDistributions(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := anyDistribution(t)
		p := rapid.Float64Range(0.001, 0.999).Draw(t, "p")
		x := d.Quantile(p)
		if got := d.CDF(x); math.Abs(got-p) > 1e-9 {
			t.Fatalf("%v: CDF of quantile %v is %v", d, p, got)
		}
		if got := d.CDF(x) + d.Above(x); math.Abs(got-1) > 1e-12 {
			t.Fatalf("%v at %v: the two sides add up to %v", d, x, got)
		}
		step := rapid.Float64Range(0, 1000).Draw(t, "step")
		if d.CDF(x+step) < d.CDF(x)-1e-12 || d.Above(x+step) > d.Above(x)+1e-12 {
			t.Fatalf("%v is not monotone from %v to %v", d, x, x+step)
		}
		for _, far := range []float64{-1e12, 1e12} {
			if v := d.CDF(far) + d.Above(far); v != 1 {
				t.Fatalf("%v at %v: %v", d, far, v)
			}
		}
	})
}

// The upper tail of an index is the lower tail of its mirror, for the two
// symmetric families; and a level returns in the years it was made for.
func TestTails(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := anyDistribution(t)
		years := rapid.Float64Range(1.01, 1000).Draw(t, "years")
		for _, tail := range []Tail{Upper, Lower} {
			got, ok := ReturnPeriod(d, tail, ReturnLevel(d, tail, years))
			if !ok || math.Abs(got/years-1) > 1e-6 {
				t.Fatalf("%v, tail %d: the level of %v years returns in %v, %v", d, tail, years, got, ok)
			}
		}
		if p, ok := d.(Pearson3); ok {
			mirror := Pearson3{-p.Mean, p.SD, -p.Skew}
			if a, b := ReturnLevel(p, Upper, years), -ReturnLevel(mirror, Lower, years); math.Abs(a-b) > 1e-6*(1+math.Abs(a)) {
				t.Fatalf("%v: %v; the mirror's %v", p, a, b)
			}
		}
	})
}

// A bounded distribution gives no chance beyond its bound, and that is no infinity.
func TestBeyondTheBound(t *testing.T) {
	d := GEV{900, 280, 0.43} // bound 900 + 280/0.43 = 1551.2
	if years, ok := ReturnPeriod(d, Upper, 1552); ok || years != 0 {
		t.Errorf("%v, %v years for what cannot come", years, ok)
	}
	if _, ok := ReturnPeriod(d, Upper, 1551); !ok {
		t.Error("no return period just below the bound")
	}
	if got := PeriodOf(Chance(d, Upper, 1552), 21).String(); got != "> 42 years" {
		t.Errorf("stated as %q", got)
	}
}

// Twice the record's length is the longest return period stated.
func TestPeriod(t *testing.T) {
	for _, tc := range []struct {
		chance float64
		n      int
		want   string
	}{
		{0.5, 30, "2.0 years"}, {1, 30, "1.0 years"}, {0.04, 30, "25 years"}, {1.0 / 60, 30, "60 years"},
		{1.0 / 61, 30, "> 60 years"}, {0, 12, "> 24 years"}, {0.100999, 30, "9.9 years"}, {0.1001, 30, "10 years"},
	} {
		if got := PeriodOf(tc.chance, tc.n).String(); got != tc.want {
			t.Errorf("chance %v, %d seasons: %q; want %q", tc.chance, tc.n, got, tc.want)
		}
	}
}

// Chance in 30 years: computed independently with R 4.2 and Python.
func TestChanceInLife(t *testing.T) {
	near(t, "100 years", ChanceInLife(1.0/100, 30), .260300, 5e-7)
	near(t, "30 years", ChanceInLife(1.0/30, 30), .638339, 1e-6)
	near(t, "never", ChanceInLife(0, 30), 0, 0)
	near(t, "always", ChanceInLife(1, 1), 1, 0)
	near(t, "no years", ChanceInLife(1, 0), 0, 0)
}

// Plotting positions of the first of ten: by their definition, computed
// independently.
func TestPlottingPositions(t *testing.T) {
	want := []float64{.090909, .060976, .058824, .055336, .050000}
	for i, p := range Plottings() {
		near(t, p.Name, p.At(1, 10), want[i], 5e-7)
		near(t, p.Name+", both ends", p.At(1, 10)+p.At(10, 10), 1, 1e-15)
	}
}

func BenchmarkGammaQuantile(b *testing.B) {
	for b.Loop() {
		gammaQuantile(18.36, 0.99, 0.01)
	}
}
