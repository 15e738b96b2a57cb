package trend

import (
	"cmp"
	"math"
	"slices"
)

// Kendall is the outcome of the test of H. B. Mann (1945) and M. G. Kendall for a
// trend in either direction.
type Kendall struct {
	N    int
	S    int     // pairs that rise less pairs that fall
	Var  float64 // variance of S if there is no trend, ties allowed for
	Z    float64 // (S-1)/sqrt(Var) for S > 0, (S+1)/sqrt(Var) for S < 0, else 0
	P    float64 // chance of a Z so far from 0 in either direction if there is no trend
	TauB float64 // S over the pairs that are not tied, -1 to 1; 0 if all values are the same
}

// MannKendall tests points, in any order, for a trend:
//
//	S = sum over i < j of sign(x(j) - x(i))
//	Var = (n(n-1)(2n+5) - sum over groups of ties of t(t-1)(2t+5)) / 18
//
// Source: R. O. Gilbert, 1987, "Statistical Methods for Environmental Pollution
// Monitoring", section 16.4, p. 208-212. P is that of the normal approximation:
// Gilbert advises it above 10 points, and below it is a rough guide only. Years
// that go together (see LagOne) make P too small. Where all values are the same Z
// is 0 and P is 1.
func MannKendall(points []Point) (Kendall, error) {
	x, err := ordered(points)
	if err != nil {
		return Kendall{}, err
	}
	n := len(x)
	k := Kendall{N: n, P: 1}
	for j := range x {
		for i := range j {
			k.S += cmp.Compare(x[j].Value, x[i].Value)
		}
	}
	values := make([]float64, n)
	for i := range x {
		values[i] = x[i].Value
	}
	slices.Sort(values)
	eighteen, tied := n*(n-1)*(2*n+5), 0
	for i := 0; i < n; {
		j := i + 1
		for j < n && values[j] == values[i] {
			j++
		}
		t := j - i
		eighteen -= t * (t - 1) * (2*t + 5)
		tied += t * (t - 1) / 2
		i = j
	}
	k.Var = float64(eighteen) / 18
	if k.Var == 0 {
		return k, nil
	}
	switch {
	case k.S > 0:
		k.Z = float64(k.S-1) / math.Sqrt(k.Var)
	case k.S < 0:
		k.Z = float64(k.S+1) / math.Sqrt(k.Var)
	}
	k.P = math.Erfc(math.Abs(k.Z) / math.Sqrt2)
	pairs := float64(n * (n - 1) / 2)
	k.TauB = float64(k.S) / math.Sqrt((pairs-float64(tied))*pairs) // no two times are tied
	return k, nil
}
