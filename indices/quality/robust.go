package quality

import (
	"math"
	"slices"
)

// enough is how many values it takes for a distribution: Durre et al. (2010),
// second-hand, for climatological outliers; taken for gaps and steps too.
const enough = 100

// biweight returns the biweight mean and standard deviation of sorted values,
// which do not follow a few wild ones as the usual two do. With the median M and
// the median D of |x - M|, u = (x - M) / (7.5 D), and sums over |u| < 1:
//
//	mean = M + sum (x - M)(1 - u^2)^2 / sum (1 - u^2)^2
//	sd   = sqrt(n sum (x - M)^2 (1 - u^2)^4) / |sum (1 - u^2)(1 - 5 u^2)|
//
// (J. R. Lanzante, 1996, "Resistant, robust and non-parametric techniques for
// the analysis of climate data", Int. J. Climatol. 16; formula from memory.) It
// is not ok with fewer than 100 values, or when half of them are the same.
func biweight(v []float64) (mean, sd float64, ok bool) {
	if len(v) < enough {
		return 0, 0, false
	}
	m := median(v)
	d := medianApart(v, m)
	if d == 0 {
		return 0, 0, false
	}
	scale := 1 / (7.5 * d)
	var up, down, square, bend float64
	for _, x := range v {
		e := x - m
		uu := float64(e*scale) * float64(e*scale)
		w := 1 - uu
		if w <= 0 {
			continue
		}
		ww := w * w
		up += float64(e * ww)
		down += ww
		square += float64(float64(e*e) * float64(ww*ww))
		bend += float64(w * (1 - float64(5*uu)))
	}
	return m + up/down, math.Sqrt(float64(len(v))*square) / math.Abs(bend), true
}

// sorted sorts v in place and returns it.
func sorted(v []float64) []float64 {
	slices.Sort(v)
	return v
}

// median returns the median of sorted values, of which there is at least one.
func median(v []float64) float64 {
	n := len(v)
	if n%2 == 1 {
		return v[n/2]
	}
	return v[n/2-1] + (v[n/2]-v[n/2-1])/2
}

// medianApart returns the median of |x - m| of sorted values, m their median.
// The nearest k values to m are a piece of the sorted ones: its place is sought
// by halving.
func medianApart(v []float64, m float64) float64 {
	n := len(v)
	nth := func(k int) float64 { // the k-th nearest, from 1
		low, high := 0, n-k
		for low < high {
			i := (low + high) / 2
			if m-v[i] > v[i+k]-m {
				low = i + 1
			} else {
				high = i
			}
		}
		return max(m-v[low], v[low+k-1]-m)
	}
	if n%2 == 1 {
		return nth(n/2 + 1)
	}
	a, b := nth(n/2), nth(n/2+1)
	return a + (b-a)/2
}

// window is a sorted set of values that moves on.
type window struct{ sorted, spare []float64 }

// move takes sorted values out, which the window has, and puts sorted values in.
func (w *window) move(out, in []float64) {
	next := w.spare[:0]
	for _, x := range w.sorted {
		if len(out) > 0 && out[0] == x {
			out = out[1:]
			continue
		}
		for len(in) > 0 && in[0] < x {
			next = append(next, in[0])
			in = in[1:]
		}
		next = append(next, x)
	}
	w.sorted, w.spare = append(next, in...), w.sorted
}
