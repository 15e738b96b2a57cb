package ground

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"
)

// near reports whether two values agree to a share of the second.
func near(got, want, relative float64) bool { return math.Abs(got-want) <= relative*math.Abs(want) }

// The table was computed independently with Python by bisection from the same
// published equation, and is given to five digits.
func TestLambdaTable(t *testing.T) {
	mus := []float64{0.05, 0.10, 0.20, 0.30, 0.40, 0.50, 0.60, 0.80, 1.00}
	table := []struct {
		alpha  float64
		lambda []float64
	}{
		{0.0, []float64{.99182, .98394, .96900, .95503, .94192, .92957, .91791, .89639, .87690}},
		{0.1, []float64{.98151, .96871, .94644, .92673, .90879, .89225, .87686, .84895, .82412}},
		{0.2, []float64{.97134, .95381, .92471, .89981, .87765, .85756, .83912, .80620, .77743}},
		{0.3, []float64{.96130, .93925, .90376, .87419, .84834, .82524, .80429, .76744, .73576}},
		{0.4, []float64{.95141, .92500, .88355, .84977, .82071, .79506, .77206, .73213, .69832}},
		{0.5, []float64{.94165, .91107, .86405, .82648, .79461, .76682, .74214, .69982, .66447}},
		{0.6, []float64{.93203, .89744, .84524, .80425, .76995, .74035, .71430, .67014, .63370}},
		{0.8, []float64{.91318, .87107, .80954, .76272, .72447, .69209, .66406, .61746, .57984}},
		{1.0, []float64{.89484, .84583, .77621, .72471, .68352, .64925, .61999, .57215, .53423}},
		{1.5, []float64{.85118, .78734, .70206, .64269, .59727, .56077, .53048, .48254, .44582}},
		{2.0, []float64{.81046, .73481, .63897, .57556, .52875, .49212, .46235, .41633, .38191}},
		{3.0, []float64{.73702, .64493, .53822, .47312, .42755, .39321, .36610, .32542, .29591}},
	}
	for _, row := range table {
		for i, want := range row.lambda {
			got, err := Lambda(row.alpha, mus[i])
			if err != nil || math.Abs(got-want) > 0.5000001e-5 {
				t.Errorf("lambda(%g, %g) = %.7f, %v; want %.5f", row.alpha, mus[i], got, err, want)
			}
		}
	}
	// computed independently with R 4.2 from the same equation: 0.8955892651
	if got, _ := Lambda(0.3328, 0.204355); !near(got, 0.8955892651, 1e-6) {
		t.Errorf("lambda(0.3328, 0.204355) = %.10f; want 0.8955892651", got)
	}
}

// gamma and X/Stefan's X, computed independently with Python by bisection.
func TestNeumannOnePhase(t *testing.T) {
	for _, c := range []struct{ ste, gamma, ratio float64 }{
		{0.01, 0.070593277, 0.998339691}, {0.02, 0.099669198, 0.996691976}, {0.05, 0.156820922, 0.991822599},
		{0.10, 0.220016273, 0.983942684}, {0.20, 0.306423905, 0.968997470}, {0.30, 0.369880217, 0.955026613},
		{0.50, 0.464785921, 0.929571841}, {0.75, 0.552092269, 0.901562900}, {1.00, 0.620062633, 0.876900986},
		{2.00, 0.800601363, 0.800601363},
	} {
		got, err := NeumannOnePhase(c.ste)
		if err != nil || math.Abs(got-c.gamma) > 1e-9 || math.Abs(got*math.Sqrt(2/c.ste)-c.ratio) > 1e-9 {
			t.Errorf("gamma(%g) = %.10f, %v; want %.9f", c.ste, got, err, c.gamma)
		}
		// the equation itself, Crank (1984), equation 3.14
		if back := math.Sqrt(math.Pi) * got * math.Exp(got*got) * math.Erf(got); !near(back, c.ste, 1e-11) {
			t.Errorf("the equation gives %g back for %g", back, c.ste)
		}
	}
}

// neumannCases were computed independently with Python by bisection; gamma of
// silt with R 4.2 too (0.3375021975).
var neumannCases = []struct {
	name          string
	step          Step
	gamma, depthM float64
	stefanM       float64
}{
	{"silt", Step{1.0, 2.8e6, 2.0, 2.0e6, 1.0e8, 10, 2}, 0.337502198, 1.298898, 1.440000},
	{"coarse", Step{2.0, 2.2e6, 2.6, 1.8e6, 5.0e7, 12, 5}, 0.405309506, 2.488674, 3.154882},
	{"icy peat", Step{0.5, 3.5e6, 1.6, 2.2e6, 2.4e8, 8, 3}, 0.219010996, 0.533082, 0.587878},
	{"equal properties", Step{1.5, 2.0e6, 1.5, 2.0e6, 8.0e7, 10, 4}, 0.306158478, 1.707475, 1.971801},
	{"ground at 0 degC", Step{1.0, 2.8e6, 2.0, 2.0e6, 1.0e8, 10, 0}, 0.358356710, 1.379158, 1.440000},
}

func TestNeumann(t *testing.T) {
	const days = 120
	for _, c := range neumannCases {
		gamma, depth, err := Neumann(c.step, days)
		if err != nil || math.Abs(gamma-c.gamma) > 1e-9 || math.Abs(depth-c.depthM) > 1e-6 {
			t.Errorf("%s: gamma %.10f, depth %.7f m, %v; want %.9f, %.6f", c.name, gamma, depth, err, c.gamma, c.depthM)
		}
		stefan, err := Stefan(c.step.KBehindWMK, c.step.LatentJM3, days*c.step.SurfaceK)
		if err != nil || math.Abs(stefan-c.stefanM) > 1e-6 {
			t.Errorf("%s: Stefan %.7f m, %v; want %.6f", c.name, stefan, err, c.stefanM)
		}
	}
}

// Two code paths meet: for equal properties Neumann's depth is lambda times
// Stefan's, with alpha 0.4 and mu 0.25 here (0.865947, computed independently).
func TestLambdaIsNeumannOfEqualProperties(t *testing.T) {
	if got, _ := Lambda(0.4, 0.25); math.Abs(got-0.865947) > 0.5e-6 {
		t.Errorf("lambda(0.4, 0.25) = %.7f; want 0.865947", got)
	}
	rapid.Check(t, func(t *rapid.T) {
		s := Step{KBehindWMK: rapid.Float64Range(0.1, 4).Draw(t, "k"), CBehindJM3K: rapid.Float64Range(5e5, 4e6).Draw(t, "c"),
			LatentJM3: rapid.Float64Range(1e6, 3e8).Draw(t, "latent"), SurfaceK: rapid.Float64Range(0.1, 30).Draw(t, "surface"),
			GroundK: rapid.Float64Range(0, 20).Draw(t, "ground")}
		s.KAheadWMK, s.CAheadJM3K = s.KBehindWMK, s.CBehindJM3K
		_, depth, err := Neumann(s, 100)
		stefan, err2 := Stefan(s.KBehindWMK, s.LatentJM3, 100*s.SurfaceK)
		lambda, err3 := Lambda(s.GroundK/s.SurfaceK, s.SurfaceK*s.CBehindJM3K/s.LatentJM3)
		if err := errors.Join(err, err2, err3); err != nil || !near(depth, lambda*stefan, 1e-9) {
			t.Fatalf("%g m; lambda %g times Stefan's %g m: %v", depth, lambda, stefan, err)
		}
	})
}

// lambda is between 0 and 1, and falls as alpha or mu rise.
func TestLambdaFalls(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		alpha := rapid.Float64Range(0, 900).Draw(t, "alpha")
		mu := math.Pow(10, rapid.Float64Range(-12, 8).Draw(t, "log mu"))
		at := func(alpha, mu float64) float64 {
			v, err := Lambda(alpha, mu)
			if err != nil || !(v > 0 && v <= 1) {
				t.Fatalf("lambda(%g, %g) = %g, %v", alpha, mu, v, err)
			}
			return v
		}
		const slack = 1e-12
		if here := at(alpha, mu); at(alpha+rapid.Float64Range(0, 100).Draw(t, "more"), mu) > here+slack || at(alpha, mu*rapid.Float64Range(1, 10).Draw(t, "times")) > here+slack {
			t.Fatalf("lambda(%g, %g) = %g rises", alpha, mu, here)
		}
	})
}

// The two ways meet, and the second is close to sqrt(pi) (x + 1/(2x)).
func TestExpOverErfc(t *testing.T) {
	for _, x := range []float64{5, 6, 8, 12, 20, 25} {
		if direct := math.Exp(-x*x) / math.Erfc(x); !near(expOverErfc(x), direct, 1e-12) {
			t.Errorf("at %g: %.15g; direct %.15g", x, expOverErfc(x), direct)
		}
	}
	if got := expOverErfc(1e4); !near(got, math.Sqrt(math.Pi)*(1e4+0.5e-4), 1e-14) {
		t.Errorf("at 1e4: %g", got)
	}
}

func BenchmarkLambda(b *testing.B) {
	for b.Loop() {
		if _, err := Lambda(0.4, 0.25); err != nil {
			b.Fatal(err)
		}
	}
}
