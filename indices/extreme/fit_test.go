package extreme

import (
	"math"
	"testing"

	"pgregory.net/rapid"
)

// Source of the figures: the record of CRREL Report 96-14, table 20; fits and
// levels computed independently with R 4.2 and Python, by bisection on the
// relation of T3 to k.
func TestFitsOfCRREL(t *testing.T) {
	gumbel := fitted(t, NameGumbel, crrel()).(Gumbel)
	near(t, "Gumbel xi", gumbel.Location, 884.393514, 5e-7)
	near(t, "Gumbel alpha", gumbel.Scale, 216.122587, 5e-7)
	gev := fitted(t, NameGEV, crrel()).(GEV)
	near(t, "GEV xi", gev.Location, 933.830819, 5e-7)
	near(t, "GEV alpha", gev.Scale, 281.635301, 5e-7)
	near(t, "GEV k", gev.Shape, 0.425703774, 5e-10)
	for _, tc := range []struct{ years, gumbel, gev float64 }{
		{10, 1370.749, 1341.584}, {25, 1575.669, 1425.882}, {50, 1727.691, 1469.750}, {100, 1878.590, 1502.060},
	} {
		near(t, "Gumbel level", ReturnLevel(gumbel, Upper, tc.years), tc.gumbel, 5e-4)
		near(t, "GEV level", ReturnLevel(gev, Upper, tc.years), tc.gev, 5e-4)
	}
}

// Source of the figures: the record of Coles 2001, p. 4; computed independently
// with R 4.2.
func TestFitsOfPortPirie(t *testing.T) {
	gev := fitted(t, NameGEV, portPirie()).(GEV)
	near(t, "GEV k", gev.Shape, 0.0512119174, 5e-11)
	near(t, "GEV alpha", gev.Scale, 0.203222286, 5e-10)
	near(t, "GEV xi", gev.Location, 3.87314762, 5e-9)
	gumbel := fitted(t, NameGumbel, portPirie()).(Gumbel)
	near(t, "Gumbel alpha", gumbel.Scale, 0.194250564, 5e-10)
	near(t, "Gumbel xi", gumbel.Location, 3.86849092, 5e-9)
	near(t, "GEV of 100 years", ReturnLevel(gev, Upper, 100), 4.706044, 5e-7)
	near(t, "Gumbel of 100 years", ReturnLevel(gumbel, Upper, 100), 4.762073, 1e-6)
}

// Source of the figures: computed independently with R 4.2, the shape of the gamma
// distribution found by numerical integration of its L-skewness and uniroot, levels
// by qgamma and qnorm. Hosking's approximation of the shape is good to 5e-5 of
// itself, which is the tolerance. Ozone: R's data set airquality.
func TestPearson3AndNormalAgainstR(t *testing.T) {
	for _, tc := range []struct {
		name           string
		m              LMoments
		sd, skew       float64
		q90, q98, q99  float64
		levelTolerance float64
	}{
		{"CRREL 96-14", moments(t, crrel()), 267.335699623175, -0.466757649397508, 1335.62718373492, 1489.27091984010, 1538.33775844643, 5e-3},
		{"Port Pirie", moments(t, portPirie()), 0.243927114589569, 0.837067221310127, 4.30685269776020, 4.58307694991638, 4.69183989885068, 1e-5},
		{"ozone", LMoments{L1: 42.1293103448276, L2: 17.6384557721139, L3: 5.00843131066046, T3: 5.00843131066046 / 17.6384557721139},
			34.17860660321159, 1.70569679206268, 87.3624577312825, 138.3994654099422, 159.9616672246821, 3e-3},
	} {
		d, err := FitLMoments(NamePearson3, tc.m)
		if err != nil {
			t.Fatal(err)
		}
		p := d.(Pearson3)
		near(t, tc.name+" sd", p.SD, tc.sd, 1e-5*tc.sd)
		near(t, tc.name+" skew", p.Skew, tc.skew, 2.5e-5*math.Abs(tc.skew))
		near(t, tc.name+" 10 years", p.Quantile(0.9), tc.q90, tc.levelTolerance)
		near(t, tc.name+" 50 years", p.Quantile(0.98), tc.q98, tc.levelTolerance)
		near(t, tc.name+" 100 years", p.Quantile(0.99), tc.q99, tc.levelTolerance)
	}
	n := fitted(t, NameNormal, crrel())
	near(t, "normal sd", n.(Normal).SD, 265.522027122079, 1e-9)
	near(t, "normal of 10 years", ReturnLevel(n, Upper, 10), 1349.42302668773, 1e-9)
	near(t, "normal of 100 years", ReturnLevel(n, Upper, 100), 1626.83946044932, 1e-9)
	near(t, "normal of 100 years, low", ReturnLevel(n, Lower, 100), 2*1009.142857142857-1626.83946044932, 1e-9)
}

func moments(t *testing.T, sample []float64) LMoments {
	t.Helper()
	m, err := SampleLMoments(sample)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// Source of the figures: L-skewness and L-kurtosis of the GEV, computed
// independently with R 4.2 and Python; Gumbel's is log2(9/8).
func TestGEVShape(t *testing.T) {
	for _, tc := range []struct{ k, t3 float64 }{
		{-0.2, 0.3050929}, {-0.1, 0.2358248}, {0.1, 0.1072477}, {0.2, 0.0476523}, {0.5, -0.1139671},
	} {
		near(t, "T3", gevT3(tc.k), tc.t3, 5e-8)
		k, ok := gevShape(gevT3(tc.k))
		if !ok {
			t.Fatalf("no k for %v", tc.k)
		}
		near(t, "k", k, tc.k, 1e-13)
	}
	near(t, "Gumbel's T3", gevT3(0), math.Log2(9.0/8), 1e-15)
	k, ok := gevShape(math.Log2(9.0 / 8))
	if !ok || math.Abs(k) > 1e-14 {
		t.Errorf("k %v, %v for Gumbel's T3", k, ok)
	}
	rapid.Check(t, func(t *rapid.T) {
		t3 := rapid.Float64Range(-0.99, 0.99).Draw(t, "t3")
		k, ok := gevShape(t3)
		if !ok || math.Abs(gevT3(k)-t3) > 1e-13 {
			t.Fatalf("k %v, %v: T3 %v for %v", k, ok, gevT3(k), t3)
		}
	})
}

// Gumbel's reduced variates -ln(-ln(1-1/T)): computed independently with R 4.2 and
// Python.
func TestReducedVariates(t *testing.T) {
	for years, y := range map[float64]float64{
		2: .366513, 5: 1.499940, 10: 2.250367, 20: 2.970195, 25: 3.198534, 30: 3.384294, 50: 3.901939, 100: 4.600149,
	} {
		near(t, "y", ReturnLevel(Gumbel{0, 1}, Upper, years), y, 5e-7)
	}
}

// A fit by the L-moments of a distribution gives that distribution back: those of
// the GEV by its closed forms, of the exponential 1, 1/2, 1/6.
func TestClosedForms(t *testing.T) {
	d, err := FitLMoments(NamePearson3, LMoments{L1: 1, L2: 0.5, L3: 1.0 / 6, T3: 1.0 / 3})
	if err != nil {
		t.Fatal(err)
	}
	p := d.(Pearson3)
	near(t, "skew of the exponential", p.Skew, 2, 5e-5)
	near(t, "its standard deviation", p.SD, 1, 5e-5)
	exponential := Pearson3{1, 1, 2}
	for _, x := range []float64{0.001, 0.3, 1, 5, 25} {
		near(t, "exponential", exponential.CDF(x), -math.Expm1(-x), 1e-14)
		near(t, "exponential above", exponential.Above(x)/math.Exp(-x), 1, 1e-12)
		near(t, "its mirror", Pearson3{-1, 1, -2}.CDF(-x)/math.Exp(-x), 1, 1e-12)
	}
	if exponential.CDF(-1e-9) != 0 || exponential.Above(-1e-9) != 1 {
		t.Error("an exponential value below 0")
	}
	d, err = FitLMoments(NamePearson3, LMoments{L1: 7, L2: 2})
	if err != nil {
		t.Fatal(err)
	}
	n := Normal{7, 2 * math.Sqrt(math.Pi)}
	for _, x := range []float64{0, 7, 20} {
		near(t, "skew 0 is normal", d.CDF(x), n.CDF(x), 0)
		// the limit of small skews; cubic term of the Edgeworth series below 1e-7
		near(t, "small skew", Pearson3{7, n.SD, 1e-7}.CDF(x), n.CDF(x), 1e-7)
	}
	for _, g := range []GEV{{933, 281, 0.43}, {933, 281, -0.2}, {933, 281, 1e-6}, {933, 281, -3e-5}} {
		m := LMoments{L2: g.Scale * overPower(g.Shape) * math.Gamma(1+g.Shape), T3: gevT3(g.Shape)}
		m.L1 = g.Location + g.Scale*(1-math.Gamma(1+g.Shape))/g.Shape
		d, err := FitLMoments(NameGEV, m)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "k", d.(GEV).Shape, g.Shape, 1e-12)
		near(t, "xi", d.(GEV).Location, g.Location, 1e-6)
		near(t, "alpha", d.(GEV).Scale, g.Scale, 1e-9)
	}
}

// Approximation and exact relation: Port Pirie's k is 0.0512119 and not the
// 0.0514771 of the approximation (computed independently with R 4.2).
func TestShapeIsNotTheApproximation(t *testing.T) {
	c := 2/(3+0.137433135) - math.Ln2/math.Log(3)
	near(t, "approximation", 7.8590*c+2.9554*c*c, 0.0514771259, 1e-9)
	k, _ := gevShape(0.137433135)
	near(t, "k", k, 0.0512119174, 2e-9)
}
