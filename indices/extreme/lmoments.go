package extreme

import (
	"fmt"
	"math"
	"slices"

	"thawledger/indices/compensated"
)

// MinSample is the least number of seasons that a distribution is fitted to:
// judgement, no source. Interval and fit say how little even 30 are.
const MinSample = 10

// mostAbs is the largest magnitude of a value. No index comes near it, and
// nothing made of values up to it leaves the range of float64.
const mostAbs = 1e12

// LMoments are the first four sample L-moments, in the unit of the sample, and
// the ratios T3 = L3/L2 (L-skewness) and T4 = L4/L2 (L-kurtosis), without unit.
type LMoments struct {
	N              int
	L1, L2, L3, L4 float64
	T3, T4         float64
}

// SampleLMoments returns the L-moments of a sample in any order by the unbiased
// probability-weighted moments
//
//	b(r) = 1/n sum over j of (j-1)(j-2)...(j-r) / ((n-1)(n-2)...(n-r)) x(j),
//
// x(1) <= ... <= x(n), and L1 = b0, L2 = 2 b1 - b0, L3 = 6 b2 - 6 b1 + b0,
// L4 = 20 b3 - 30 b2 + 12 b1 - b0. Source: J. R. M. Hosking, 1990, "L-moments",
// J. R. Statist. Soc. B 52, from memory. |T3| <= 1 by construction. Accuracy: the
// sums are compensated and made of differences from the middle value, so that an
// offset common to all values costs no digits.
//
// It takes samples of 4 values or more, and refuses values that are not finite or
// beyond 1e12, and samples whose values are all the same.
func SampleLMoments(sample []float64) (LMoments, error) {
	if len(sample) < 4 {
		return LMoments{}, fmt.Errorf("%d values are too few for four L-moments", len(sample))
	}
	if err := finite(sample); err != nil {
		return LMoments{}, err
	}
	x := slices.Sorted(slices.Values(sample))
	if x[0] == x[len(x)-1] {
		return LMoments{}, fmt.Errorf("all %d values are %g: there is nothing to fit", len(x), x[0])
	}
	return sortedLMoments(x), nil
}

// sortedLMoments does the work for values that are in order and not all equal.
func sortedLMoments(x []float64) LMoments {
	n := float64(len(x))
	middle := x[len(x)/2]
	var b [4]compensated.Sum
	for i, v := range x {
		j := float64(i)
		w := 1.0
		for r := range b {
			b[r].Add(float64(w * (v - middle)))
			w *= (j - float64(r)) / (n - 1 - float64(r))
		}
	}
	b0, b1, b2, b3 := b[0].Value()/n, b[1].Value()/n, b[2].Value()/n, b[3].Value()/n
	m := LMoments{
		N: len(x), L1: middle + b0, L2: 2*b1 - b0, L3: 6*b2 - 6*b1 + b0,
		L4: 20*b3 - 30*b2 + 12*b1 - b0,
	}
	m.T3, m.T4 = m.L3/m.L2, m.L4/m.L2
	return m
}

// finite refuses values that are no numbers, or none that an index could be.
func finite(sample []float64) error {
	for i, v := range sample {
		if !(math.Abs(v) <= mostAbs) { // true for NaN too
			return fmt.Errorf("value %v at place %d is not a finite number of at most %g", v, i, mostAbs)
		}
	}
	return nil
}
