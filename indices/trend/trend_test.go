package trend

import (
	"math"
	"math/rand/v2"
	"testing"

	"pgregory.net/rapid"
)

func years(first int, values ...float64) []Point {
	out := make([]Point, len(values))
	for i, v := range values {
		out[i] = Point{float64(first + i), v}
	}
	return out
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s: %.10g; want %.10g, within %g", what, got, want, tolerance)
	}
}

func kendallOf(t *testing.T, p []Point) Kendall {
	t.Helper()
	k, err := MannKendall(p)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func lineOf(t *testing.T, p []Point) Line {
	t.Helper()
	l, err := TheilSen(p, 0.95)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

var gilbert = []float64{20, 20, 20, 20, 15, 20, 20, 30, 27, 26, 23, 35, 25, 28, 70, 26, 24, 34, 32, 23, 50, 30}

// Gilbert 1987, p. 212: Z = 3.1. All else computed independently with R 4.2 and
// Python from the same formulas.
func TestGilbert(t *testing.T) {
	p := years(1, gilbert...)
	k, l := kendallOf(t, p), lineOf(t, p)
	near(t, "published Z", k.Z, 3.1, 0.05)
	if k.S != 111 || k.N != 22 || l.Pairs != 231 || !l.Bounded {
		t.Errorf("%+v %+v", k, l)
	}
	near(t, "Var", k.Var, 1226.333333, 5e-7)
	near(t, "Z", k.Z, 3.141148, 5e-7)
	near(t, "p", k.P, .0016828689, 5e-11)
	near(t, "tau-b", k.TauB, .50041139, 5e-9)
	near(t, "slope", l.Slope, 0.666667, 5e-7)
	near(t, "low", l.Low, .253033, 5e-7)
	near(t, "high", l.High, 1.139608, 5e-7)
}

// Wisconsin Administrative Code, worked table A: S = -5. Variance computed
// independently.
func TestWisconsin(t *testing.T) {
	k := kendallOf(t, years(1, 100, 50, 85, 75, 50))
	if k.S != -5 {
		t.Errorf("S %d; want -5", k.S)
	}
	near(t, "Var", k.Var, 15.666667, 5e-7)
	near(t, "Z", k.Z, -4/math.Sqrt(15.666667), 1e-6)
}

// Flow of the Nile, 1871 to 1970 (R's data set Nile). Computed independently with
// R 4.2.
func TestNile(t *testing.T) {
	p := years(1871, nile...)
	k, l := kendallOf(t, p), lineOf(t, p)
	if k.S != -1387 {
		t.Errorf("S %d; want -1387", k.S)
	}
	near(t, "Var", k.Var, 112728.3, 0.05)
	near(t, "Z", k.Z, -4.1280665, 5e-8)
	near(t, "p", k.P, 3.658263e-05, 5e-12)
	near(t, "tau-b", k.TauB, -.28074133, 5e-9)
	near(t, "slope", l.Slope, -2.6, 1e-12)
	near(t, "intercept", l.Intercept, 5890.3, 1e-9)
	r, pairs, ok := LagOne(p, l)
	near(t, "lag one", r, 0.374943522119703, 1e-12)
	if !ok || pairs != 99 {
		t.Errorf("%d pairs, %v", pairs, ok)
	}
}

// Freezing indices of CRREL Report 96-14, table 20. Computed independently with R 4.2.
func TestCRREL(t *testing.T) {
	p := years(1969, 1191, 1152, 1274, 839, 923, 968, 931, 1256, 1331, 1477, 903, 666, 1227, 589, 1179, 942, 1197,
		467, 898, 1032, 750)
	k, l := kendallOf(t, p), lineOf(t, p)
	if k.S != -48 {
		t.Errorf("S %d; want -48", k.S)
	}
	near(t, "Var", k.Var, 1096.667, 5e-4)
	near(t, "Z", k.Z, -1.419255, 5e-7)
	near(t, "p", k.P, .155825, 5e-7)
	near(t, "slope", l.Slope, -14.6, 1e-12)
	near(t, "intercept", l.Intercept, 29908.4, 1e-9)
	r, _, _ := LagOne(p, l)
	near(t, "lag one", r, -0.17215444708346, 1e-12)
}

// On an exact line every slope is the line's, with years missing and in any order;
// there is nothing left to correlate.
func TestExactLineWithMissingYears(t *testing.T) {
	p := []Point{{1990, 10}, {2005, 40}, {1995, 20}, {1991, 12}, {2020, 70}, {1992, 14}}
	l := lineOf(t, p)
	near(t, "slope", l.Slope, 2, 0)
	near(t, "at", l.At(2000), 30, 1e-9)
	if !l.Bounded || l.Low != 2 || l.High != 2 {
		t.Errorf("%+v", l)
	}
	if _, pairs, ok := LagOne(p, l); ok || pairs != 2 {
		t.Errorf("%d pairs, %v", pairs, ok)
	}
	k := kendallOf(t, p)
	if k.S != 15 || k.TauB != 1 {
		t.Errorf("%+v", k)
	}
}

// With four points the ranks of 95 % lie outside the six slopes.
func TestFewPointsHaveNoBounds(t *testing.T) {
	if l := lineOf(t, years(1, 3, 1, 4, 2)); l.Bounded || l.Low != 0 || l.High != 0 {
		t.Errorf("%+v", l)
	}
}

func TestRefuses(t *testing.T) {
	for name, p := range map[string][]Point{
		"three": years(1, 1, 2, 3), "none": nil, "not a number": years(1, 1, 2, math.NaN(), 3),
		"infinite time": {{math.Inf(1), 1}, {1, 2}, {2, 3}, {3, 4}}, "same time": {{1, 1}, {2, 2}, {1, 3}, {4, 4}},
	} {
		if k, err := MannKendall(p); err == nil {
			t.Errorf("%s: %+v", name, k)
		}
		if l, err := TheilSen(p, 0.95); err == nil {
			t.Errorf("%s: %+v", name, l)
		}
	}
	if k := kendallOf(t, years(1, 5, 5, 5, 5, 5)); k.Z != 0 || k.P != 1 || k.TauB != 0 || k.Var != 0 {
		t.Errorf("all the same: %+v", k)
	}
}

// Order does not matter; turning the values over turns the answer over; a straight
// line added is found in the slope.
func TestProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(MinPoints, 15).Draw(t, "n")
		p := make([]Point, n)
		year := 1950
		for i := range p {
			year += rapid.IntRange(1, 3).Draw(t, "gap")
			p[i] = Point{float64(year), float64(rapid.IntRange(-8, 8).Draw(t, "value"))}
		}
		slope := float64(rapid.IntRange(-4, 4).Draw(t, "slope"))
		turned, over, tilted := make([]Point, n), make([]Point, n), make([]Point, n)
		for i, q := range p {
			turned[n-1-i], over[i], tilted[i] = q, Point{q.Time, -q.Value}, Point{q.Time, q.Value + slope*q.Time}
		}
		k, _ := MannKendall(p)
		if k2, _ := MannKendall(turned); k2 != k {
			t.Fatalf("%+v; %+v in another order", k, k2)
		}
		if k2, _ := MannKendall(over); k2.S != -k.S || k2.Z != -k.Z || k2.P != k.P {
			t.Fatalf("%+v; %+v turned over", k, k2)
		}
		if math.Abs(k.TauB) > 1 || !(k.P > 0 && k.P <= 1) {
			t.Fatalf("%+v", k)
		}
		l, err := TheilSen(p, 0.9)
		if err != nil {
			t.Fatal(err)
		}
		if l2, _ := TheilSen(tilted, 0.9); math.Abs(l2.Slope-l.Slope-slope) > 1e-9 {
			t.Fatalf("slope %v; %v with %v added", l.Slope, l2.Slope, slope)
		}
		if l.Bounded && !(l.Low <= l.Slope && l.Slope <= l.High) {
			t.Fatalf("%+v", l)
		}
		if r, _, ok := LagOne(p, l); ok && math.Abs(r) > 1 {
			t.Fatalf("lag one %v", r)
		}
	})
}

func BenchmarkTheilSen(b *testing.B) {
	random := rand.New(rand.NewPCG(1, 1))
	p := make([]Point, 100)
	for i := range p {
		p[i] = Point{float64(i), random.NormFloat64()}
	}
	for b.Loop() {
		if _, err := TheilSen(p, 0.95); err != nil {
			b.Fatal(err)
		}
	}
}

var nile = []float64{
	1120, 1160, 963, 1210, 1160, 1160, 813, 1230, 1370, 1140, 995, 935, 1110, 994, 1020, 960, 1180, 799, 958, 1140,
	1100, 1210, 1150, 1250, 1260, 1220, 1030, 1100, 774, 840, 874, 694, 940, 833, 701, 916, 692, 1020, 1050, 969,
	831, 726, 456, 824, 702, 1120, 1100, 832, 764, 821, 768, 845, 864, 862, 698, 845, 744, 796, 1040, 759,
	781, 865, 845, 944, 984, 897, 822, 1010, 771, 676, 649, 846, 812, 742, 801, 1040, 860, 874, 848, 890,
	744, 749, 838, 1050, 918, 986, 797, 923, 975, 815, 1020, 906, 901, 1170, 912, 746, 919, 718, 714, 740,
}
