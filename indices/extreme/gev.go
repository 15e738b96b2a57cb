package extreme

import (
	"errors"
	"fmt"
	"math"
)

// GEV is the generalised extreme value distribution in Hosking's form:
//
//	F(x) = exp(-(1 - k (x-xi)/alpha)^(1/k)),  k = 0: exp(-exp(-(x-xi)/alpha))
//
// Shape k > 0: bounded above by xi + alpha/k; k < 0: bounded below, with a heavy
// upper tail. The shape of Coles (2001) is -k.
type GEV struct{ Location, Scale, Shape float64 }

// Name returns NameGEV.
func (GEV) Name() Name { return NameGEV }

// Parameters returns location, scale and Hosking's shape.
func (d GEV) Parameters() []Parameter {
	return []Parameter{{"location", d.Location}, {"scale", d.Scale}, {"shape k (Hosking; Coles's is -k)", d.Shape}}
}

// CDF is that of the Distribution.
func (d GEV) CDF(x float64) float64 { return math.Exp(-d.hazard(x)) }

// Above is that of the Distribution.
func (d GEV) Above(x float64) float64 { return -math.Expm1(-d.hazard(x)) }

// hazard returns -ln F(x); +Inf below a lower bound, 0 above an upper one.
func (d GEV) hazard(x float64) float64 {
	z := (x - d.Location) / d.Scale
	if d.Shape == 0 {
		return math.Exp(-z)
	}
	inside := -d.Shape * z
	switch {
	case inside > -1:
		return math.Exp(math.Log1p(inside) / d.Shape)
	case d.Shape > 0:
		return 0
	}
	return math.Inf(1)
}

// Quantile is that of the Distribution: xi + alpha/k (1 - (-ln p)^k).
func (d GEV) Quantile(p float64) float64 {
	checkProbability(p)
	y := math.Log(-math.Log(p)) // minus the reduced variate
	if d.Shape == 0 {
		return d.Location - d.Scale*y
	}
	return d.Location - d.Scale*math.Expm1(d.Shape*y)/d.Shape
}

// Gumbel is the GEV of shape 0: F(x) = exp(-exp(-(x-xi)/alpha)).
type Gumbel struct{ Location, Scale float64 }

// Name returns NameGumbel.
func (Gumbel) Name() Name { return NameGumbel }

// Parameters returns location and scale.
func (d Gumbel) Parameters() []Parameter {
	return []Parameter{{"location", d.Location}, {"scale", d.Scale}}
}

// CDF is that of the Distribution.
func (d Gumbel) CDF(x float64) float64 { return GEV{d.Location, d.Scale, 0}.CDF(x) }

// Above is that of the Distribution.
func (d Gumbel) Above(x float64) float64 { return GEV{d.Location, d.Scale, 0}.Above(x) }

// Quantile is that of the Distribution.
func (d Gumbel) Quantile(p float64) float64 { return GEV{d.Location, d.Scale, 0}.Quantile(p) }

// euler is Euler's constant.
const euler = 0.57721566490153286060651209008240243

// fitGumbel: alpha = L2/ln 2, xi = L1 - euler alpha.
func fitGumbel(m LMoments) Gumbel {
	alpha := m.L2 / math.Ln2
	return Gumbel{Location: m.L1 - float64(euler*alpha), Scale: alpha}
}

// errLopsided says that no distribution has such a sample's skewness.
var errLopsided = errors.New("the sample is too lopsided (all values but one are the same, or nearly so)")

// fitGEV solves the exact relation
//
//	T3 = 2 (1 - 3^-k)/(1 - 2^-k) - 3
//
// for k, from Hosking's approximation k = 7.8590 c + 2.9554 c^2,
// c = 2/(3+T3) - ln 2/ln 3, which is good to 9e-4 for |T3| < 0.5; then
//
//	alpha = L2 k / ((1 - 2^-k) Gamma(1+k)),  xi = L1 - alpha (1 - Gamma(1+k))/k.
//
// Source: Hosking and Wallis 1997, appendix A.7, the relation also in the
// documentation of R's package lmomco (lmomgev). k is exact to some 1e-13.
func fitGEV(m LMoments) (Distribution, error) {
	k, ok := gevShape(m.T3)
	if !ok {
		return nil, fmt.Errorf("fit GEV: L-skewness %.4f: %w", m.T3, errLopsided)
	}
	alpha := m.L2 / (overPower(k) * math.Gamma(1+k))
	return GEV{Location: m.L1 - float64(alpha*gammaLack(k)), Scale: alpha, Shape: k}, nil
}

// gevT3 is the L-skewness of a GEV; it falls from 1 at k = -1 to -1 at k = infinity.
func gevT3(k float64) float64 {
	if k == 0 {
		return 2*math.Log(3)/math.Ln2 - 3
	}
	return 2*math.Expm1(-k*math.Log(3))/math.Expm1(-k*math.Ln2) - 3
}

// gevShape inverts gevT3: steps of the secant, kept within a bracket that
// closes by halving where they would leave it.
func gevShape(t3 float64) (k float64, ok bool) {
	low, high := -0.999, 30.0
	if !(gevT3(low) > t3 && t3 > gevT3(high)) {
		return 0, false
	}
	c := 2/(3+t3) - math.Ln2/math.Log(3)
	k = min(max(7.8590*c+2.9554*c*c, low), high)
	last, lastF := low, gevT3(low)-t3
	for range 200 {
		f := gevT3(k) - t3
		if f == 0 {
			return k, true
		}
		if f > 0 {
			low = k
		} else {
			high = k
		}
		next := k - f*(k-last)/(f-lastF)
		if !(next > low && next < high) {
			next = low + (high-low)/2
		}
		last, lastF = k, f
		if math.Abs(next-k) <= 1e-15*(1+math.Abs(k)) {
			return next, true
		}
		k = next
	}
	return k, true // the bracket has closed as far as it can
}

// overPower returns (1 - 2^-k)/k, ln 2 at k = 0.
func overPower(k float64) float64 {
	if k == 0 {
		return math.Ln2
	}
	return -math.Expm1(-k*math.Ln2) / k
}

// gammaLack returns (1 - Gamma(1+k))/k. Near k = 0 the difference would lose all
// digits; there it is the Taylor series of Gamma about 1, good to k^3.
func gammaLack(k float64) float64 {
	if math.Abs(k) > 1e-4 {
		return (1 - math.Gamma(1+k)) / k
	}
	const zeta3 = 1.2020569031595942854
	second := euler*euler/2 + math.Pi*math.Pi/12
	third := euler*euler*euler/6 + euler*math.Pi*math.Pi/12 + zeta3/3
	return euler - k*(second-k*third)
}
