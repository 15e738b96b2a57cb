package ground

import "math"

// Lambda returns the coefficient of the modified Berggren formula, 0 to 1, by
// which Stefan's depth is multiplied. It is gamma sqrt(2/mu) with the gamma that
// solves
//
//	exp(-g2)/erf(g) - alpha exp(-g2)/erfc(g) = sqrt(pi) g / mu,  g2 = g g
//
// (H. P. Aldrich and H. M. Paynter, 1953, "Analytical studies of freezing and
// thawing of soils", ACFEL Technical Report 42; a step at the surface, equal
// properties of both phases). alpha = v0/vs is how far the ground was from 0 degC
// at the start, over the surface's mean distance in the season; mu = vs C/L.
// Range: alpha 0 to 1000, mu above 0 to 1e9. Accuracy 1e-12.
func Lambda(alpha, mu float64) (float64, error) {
	if err := within("alpha", alpha, 0, 1000); err != nil {
		return 0, err
	}
	if err := within("mu", mu, 1e-12, 1e9); err != nil {
		return 0, err
	}
	// Multiplied by erf the left side falls from 1 and the right rises from 0:
	// one root, and below sqrt(mu/2), since erf(g) exp(g2) >= 2 g / sqrt(pi).
	// exp(-64) is below anything that mu <= 1e9 asks for.
	scale := math.Sqrt(2 / mu)
	g := bisect(0, min(8, 1/scale), func(g float64) float64 {
		return math.Exp(-g*g) - math.Erf(g)*(alpha*expOverErfc(g)+math.Sqrt(math.Pi)*g/mu)
	})
	return min(1, g*scale), nil
}

// NeumannOnePhase returns the gamma of Neumann's solution where the ground was at
// 0 degC: sqrt(pi) g exp(g2) erf(g) = Ste, with the Stefan number Ste = C Ts/L of
// the zone between surface and front (J. Crank, 1984, "Free and moving boundary
// problems", equation 3.14). Range: Ste above 0 to 1e9. Accuracy 1e-12.
func NeumannOnePhase(ste float64) (float64, error) {
	lambda, err := Lambda(0, ste)
	if err != nil {
		return 0, err
	}
	return lambda * math.Sqrt(ste/2), nil
}

// Step is a half-space at one temperature whose surface is put at another, on the
// other side of 0 degC, and kept there: the problem that F. Neumann solved
// exactly (lectures of about 1860; H. S. Carslaw and J. C. Jaeger, 1959,
// "Conduction of heat in solids", section 11.2).
type Step struct {
	// Behind the front (between it and the surface), and ahead of it: for thaw
	// thawed and frozen, for frost the other way about.
	KBehindWMK, CBehindJM3K float64
	KAheadWMK, CAheadJM3K   float64
	LatentJM3               float64

	// Distances from 0 degC, both positive or zero, in K: of the surface, on the
	// front's side; of the ground, on the other side.
	SurfaceK, GroundK float64
}

// Neumann returns gamma and the depth X = 2 gamma sqrt(a t) of the front in m after
// a number of days, a = k/C behind the front.
func Neumann(s Step, days float64) (gamma, depthM float64, err error) {
	for _, v := range []struct {
		what      string
		v         float64
		low, high float64
	}{
		{"conductivity behind the front in W/(m K)", s.KBehindWMK, 0.005, 20},
		{"conductivity ahead of the front in W/(m K)", s.KAheadWMK, 0.005, 20},
		{"heat capacity behind the front in J/(m3 K)", s.CBehindJM3K, 1e4, 1e7},
		{"heat capacity ahead of the front in J/(m3 K)", s.CAheadJM3K, 1e4, 1e7},
		{"latent heat in J/m3", s.LatentJM3, 1, 3.4e8},
		{"surface's distance from 0 degC in K", s.SurfaceK, 1e-9, 200},
		{"ground's distance from 0 degC in K", s.GroundK, 0, 200},
		{"time in days", days, 0, 1e6},
	} {
		if err := within(v.what, v.v, v.low, v.high); err != nil {
			return 0, 0, err
		}
	}
	a, ahead := s.KBehindWMK/s.CBehindJM3K, s.KAheadWMK/s.CAheadJM3K
	root := math.Sqrt(a / ahead)
	other := s.KAheadWMK / s.KBehindWMK * root * s.GroundK / s.SurfaceK
	ste := s.CBehindJM3K * s.SurfaceK / s.LatentJM3
	// exp(-g2 a/ahead)/erfc(g root) is expOverErfc(g root)
	g := bisect(0, min(8, math.Sqrt(ste/2)), func(g float64) float64 {
		return math.Exp(-g*g) - math.Erf(g)*(other*expOverErfc(g*root)+math.Sqrt(math.Pi)*g/ste)
	})
	return g, 2 * g * math.Sqrt(a*days*secondsPerDay), nil
}

// bisect returns where f, which falls through zero between low and high, is zero,
// as closely as float64 allows.
func bisect(low, high float64, f func(float64) float64) float64 {
	for {
		mid := low + (high-low)/2
		if mid <= low || mid >= high {
			return high
		}
		if f(mid) > 0 {
			low = mid
		} else {
			high = mid
		}
	}
}

// expOverErfc is exp(-x2)/erfc(x) for x >= 0. Both become too small for float64
// from about 26 on, so that from 5 on their ratio is taken from the continued
// fraction of erfc (Abramowitz and Stegun, 1964, 7.1.14); there its error is below
// 1e-15.
func expOverErfc(x float64) float64 {
	if x < 5 {
		return math.Exp(-x*x) / math.Erfc(x)
	}
	rest := x
	for n := 40; n > 0; n-- {
		rest = x + float64(n)/2/rest
	}
	return math.Sqrt(math.Pi) * rest
}
