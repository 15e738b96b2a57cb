package extreme

import (
	"fmt"
	"math"
	"slices"

	"thawledger/indices/compensated"
)

// Plotting is a plotting position: the chance (m-A)/(n+1-2A) that the value of
// rank m of n is taken to have.
type Plotting struct {
	Name string
	A    float64
}

// Plottings lists the positions in common use.
func Plottings() []Plotting {
	return []Plotting{{"Weibull", 0}, {"Blom", 0.375}, {"Cunnane", 0.4}, {"Gringorten", 0.44}, {"Hazen", 0.5}}
}

// Cunnane is the position that reports use: a compromise that suits all four
// distributions (C. Cunnane, 1978, J. Hydrology 37, from memory).
func Cunnane() Plotting { return Plotting{"Cunnane", 0.4} }

// At returns the position of rank m, from 1, of n. It panics unless 1 <= m <= n.
func (p Plotting) At(m, n int) float64 {
	if m < 1 || m > n {
		panic(fmt.Sprintf("extreme: there is no rank %d of %d", m, n))
	}
	return (float64(m) - p.A) / (float64(n) + 1 - 2*p.A)
}

// Correlation returns the correlation between the values of a sample in order and
// the quantiles of the distribution at their plotting positions: 1 if all points
// of the probability plot lie on a straight line (J. J. Filliben, 1975,
// Technometrics 17, for the normal distribution; R. M. Vogel, 1986, Water Resources
// Research 22, for Gumbel). A distribution with a shape that was fitted to the same
// sample has an advantage over one without. The sample has 2 values or more, not
// all the same.
func Correlation(d Distribution, sample []float64, position Plotting) float64 {
	x := slices.Sorted(slices.Values(sample))
	n := len(x)
	q := make([]float64, n)
	var sumX, sumQ compensated.Sum
	for i := range x {
		q[i] = d.Quantile(position.At(i+1, n))
		sumX.Add(x[i])
		sumQ.Add(q[i])
	}
	meanX, meanQ := sumX.Value()/float64(n), sumQ.Value()/float64(n)
	var xx, qq, xq compensated.Sum
	for i := range x {
		dx, dq := x[i]-meanX, q[i]-meanQ
		xx.Add(float64(dx * dx))
		qq.Add(float64(dq * dq))
		xq.Add(float64(dx * dq))
	}
	r := xq.Value() / math.Sqrt(xx.Value()*qq.Value())
	if !(r <= 1) {
		return 1
	}
	return r
}

// AndersonDarling returns the statistic of T. W. Anderson and D. A. Darling (1952)
//
//	A2 = -n - 1/n sum of (2i-1) (ln F(x(i)) + ln(1 - F(x(n+1-i)))),
//
// which weighs both tails. 0 would be a perfect fit. A value beyond the bounds of
// the distribution, which a fit by L-moments allows, counts as one of chance
// 1e-10, so that the statistic is large and finite. What is large depends on the
// distribution and on that it was fitted to the same sample: see Resampled.PValue.
func AndersonDarling(d Distribution, sample []float64) float64 {
	x := slices.Sorted(slices.Values(sample))
	n := float64(len(x))
	var sum compensated.Sum
	for i := range x {
		below, above := max(d.CDF(x[i]), beyond), max(d.Above(x[len(x)-1-i]), beyond)
		sum.Add(float64(float64(2*i+1) * (math.Log(below) + math.Log(above))))
	}
	return -n - sum.Value()/n
}

const beyond = 1e-10
