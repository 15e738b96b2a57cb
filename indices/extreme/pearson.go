package extreme

import (
	"fmt"
	"math"
)

// Pearson3 is the Pearson III distribution by mean, standard deviation and skew:
// a gamma distribution of shape 4/skew^2, shifted, and mirrored where the skew is
// negative. Skew 0 is the normal distribution, skew 2 the shifted exponential.
type Pearson3 struct{ Mean, SD, Skew float64 }

// Name returns NamePearson3.
func (Pearson3) Name() Name { return NamePearson3 }

// Parameters returns mean, standard deviation and skew.
func (d Pearson3) Parameters() []Parameter {
	return []Parameter{{"mean", d.Mean}, {"standard deviation", d.SD}, {"skew", d.Skew}}
}

// The gamma distribution is used in its standard form, z = (g - a)/sqrt(a).

// leastSkew is the skew below which the gamma distribution cannot be told from
// the normal in float64.
const leastSkew = 1e-8

// CDF is that of the Distribution.
func (d Pearson3) CDF(x float64) float64 {
	lower, _ := d.sides(x)
	return lower
}

// Above is that of the Distribution.
func (d Pearson3) Above(x float64) float64 {
	_, upper := d.sides(x)
	return upper
}

// sides returns the chances of at or below x and of above x.
func (d Pearson3) sides(x float64) (lower, upper float64) {
	if math.Abs(d.Skew) < leastSkew {
		n := Normal{d.Mean, d.SD}
		return n.CDF(x), n.Above(x)
	}
	shape, z := 4/(d.Skew*d.Skew), (x-d.Mean)/d.SD
	if d.Skew < 0 {
		upper, lower = gammaSides(shape, -z)
	} else {
		lower, upper = gammaSides(shape, z)
	}
	return lower, upper
}

// Quantile is that of the Distribution.
func (d Pearson3) Quantile(p float64) float64 {
	checkProbability(p)
	if math.Abs(d.Skew) < leastSkew {
		return Normal{d.Mean, d.SD}.Quantile(p)
	}
	shape := 4 / (d.Skew * d.Skew)
	if d.Skew < 0 {
		return d.Mean - float64(d.SD*gammaQuantile(shape, 1-p, p))
	}
	return d.Mean + float64(d.SD*gammaQuantile(shape, p, 1-p))
}

// fitPearson3 finds the shape a of the gamma distribution from T3 by Hosking's
// approximations, with a relative error below 5e-5, and then
//
//	skew = 2/sqrt(a) with the sign of T3,  SD = sqrt(pi) L2 sqrt(a) Gamma(a)/Gamma(a+1/2).
//
// Source: Hosking and Wallis 1997, appendix A.9, from memory; the approximations
// agree with T3 found by numerical integration (see the test).
func fitPearson3(m LMoments) (Distribution, error) {
	t := math.Abs(m.T3)
	if t > 0.999 {
		return nil, fmt.Errorf("fit Pearson III: L-skewness %.4f: %w", m.T3, errLopsided)
	}
	normal := Pearson3{Mean: m.L1, SD: math.Sqrt(math.Pi) * m.L2}
	if t < leastSkew {
		return normal, nil
	}
	var a float64
	if t < 1.0/3 {
		z := 3 * math.Pi * t * t
		a = (1 + 0.2906*z) / (z * (1 + z*(0.1882+0.0442*z)))
	} else {
		z := 1 - t
		a = z * (0.36067 + z*(-0.59567+0.25361*z)) / (1 + z*(-2.78861+z*(2.56096-0.77045*z)))
	}
	skew := math.Copysign(2/math.Sqrt(a), m.T3)
	return Pearson3{Mean: m.L1, SD: normal.SD * rootGammaRatio(a), Skew: skew}, nil
}

// rootGammaRatio returns sqrt(a) Gamma(a)/Gamma(a+1/2). For large a, where the
// difference of logarithms of Gamma would lose its digits, it is
// 1 + 1/(8a) + 1/(128a^2) - 5/(1024a^3), from the asymptotic series of that ratio.
func rootGammaRatio(a float64) float64 {
	if a > 1e3 {
		return 1 + (1+(1.0/16-5/(128*a))/a)/(8*a)
	}
	up, _ := math.Lgamma(a)
	down, _ := math.Lgamma(a + 0.5)
	return math.Sqrt(a) * math.Exp(up-down)
}
