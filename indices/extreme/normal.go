package extreme

import "math"

// Normal is the normal distribution. By L-moments the mean is L1 and the
// standard deviation sqrt(pi) L2 (Hosking and Wallis 1997, appendix, from memory).
type Normal struct{ Mean, SD float64 }

// Name returns NameNormal.
func (Normal) Name() Name { return NameNormal }

// Parameters returns mean and standard deviation.
func (d Normal) Parameters() []Parameter {
	return []Parameter{{"mean", d.Mean}, {"standard deviation", d.SD}}
}

// CDF is that of the Distribution.
func (d Normal) CDF(x float64) float64 { return below((x - d.Mean) / d.SD) }

// Above is that of the Distribution.
func (d Normal) Above(x float64) float64 { return below((d.Mean - x) / d.SD) }

// Quantile is that of the Distribution.
func (d Normal) Quantile(p float64) float64 {
	checkProbability(p)
	return d.Mean + float64(d.SD*normalQuantile(p))
}

// below is the chance of a standard normal value at or below z.
func below(z float64) float64 { return math.Erfc(-z/math.Sqrt2) / 2 }

// normalQuantile inverts below.
func normalQuantile(p float64) float64 { return -math.Sqrt2 * math.Erfcinv(2*p) }
