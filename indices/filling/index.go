package filling

import (
	"fmt"
	"slices"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// IndexError works out a season's index and its standard error. meanC are the
// daily means from the season window's first day on, observed or filled, every
// day once; fills are those of them that were filled, in order of date; others
// are left out of account. The model must have the rungs that they were filled by.
//
// With e(i) the error of a filled day, the variance of a sum of m such days of
// one rung (of one neighbour) is the sum of all their covariances: for one gap
// within a month
//
//	s^2 [m + 2 sum (m-k) R(k)] + m^2 b^2,  k from 1 to m-1,
//
// with s, R and b those of Spread. Days of different gaps go in likewise, by
// their distance and by the bias that they have in common.
//
// By the curve a filled day counts as far as it is likely to lie between the
// season's low and high; where these are in question, index and error are mean and
// standard deviation over drawn errors (see weigher.rise), and the index is above
// that of the estimates.
//
// By the sum a filled day adds the expected positive part (see Positive) and not
// the positive part of its estimate.
//
// It panics if kind is unknown or fills are not among the days, in order.
func (m *Model) IndexError(kind pipeline.Kind, baseC float64, first pipeline.Day, meanC []float64, fills []Filled) SeasonError {
	sign := 1.0
	switch kind {
	case pipeline.Thaw:
	case pipeline.Freeze:
		sign = -1
	default:
		panic(fmt.Sprintf("filling: kind %q is neither thaw nor freeze", kind))
	}
	excess := make([]float64, len(meanC))
	for i, c := range meanC {
		excess[i] = sign * (c - baseC)
	}
	w := weigher{fills: inside(fills, first, len(meanC))}
	track := degreeday.Rise(excess)
	var out SeasonError
	if n := len(excess); n > 0 {
		out.CurveC, out.SumC = track.ToDate[n-1], track.Sum[n-1]
	}
	if len(w.fills) == 0 {
		return out
	}
	w.prepare(m, first)
	sum, shift := 0.0, 0.0
	means, sds := make([]float64, len(w.fills)), make([]float64, len(w.fills))
	for i, at := range w.at {
		means[i], sds[i] = Positive(excess[at], w.se[i])
		shift += means[i] - max(0, excess[at])
	}
	for i := range w.fills {
		for j := range w.fills {
			if c := w.cov[i][j]; c != 0 {
				sum += positiveCovariance(excess[w.at[i]], w.se[i], sds[i], excess[w.at[j]], w.se[j], sds[j], c/(w.se[i]*w.se[j]))
			}
		}
	}
	out.SumC += shift
	out.SumSEC = standard(sum)
	out.CurveC, out.CurveSEC = w.rise(excess, track)
	return out
}

// inside returns the fills that lie in the n days from first on.
func inside(fills []Filled, first pipeline.Day, n int) []Filled {
	for i := range fills {
		if i > 0 && fills[i].Day <= fills[i-1].Day {
			panic(fmt.Sprintf("filling: filled day %s after %s; days must be in order, each at most once", fills[i].Day, fills[i-1].Day))
		}
	}
	from, _ := slices.BinarySearchFunc(fills, first, func(f Filled, d pipeline.Day) int { return int(f.Day) - int(d) })
	to, _ := slices.BinarySearchFunc(fills, first+pipeline.Day(n), func(f Filled, d pipeline.Day) int { return int(f.Day) - int(d) })
	return fills[from:to]
}

// weigher knows the errors of a season's filled days.
type weigher struct {
	fills []Filled
	at    []int       // places in the season
	se    []float64   // standard errors
	cov   [][]float64 // covariances
	upTo  [][]float64 // upTo[i][j]: sum of cov over the first i and the first j
}

func (w *weigher) prepare(m *Model, first pipeline.Day) {
	n := len(w.fills)
	w.at, w.se = make([]int, n), make([]float64, n)
	w.cov, w.upTo = make([][]float64, n), make([][]float64, n+1)
	w.upTo[0] = make([]float64, n+1)
	for i := range w.fills {
		w.at[i], w.cov[i], w.upTo[i+1] = int(w.fills[i].Day-first), make([]float64, n), make([]float64, n+1)
		for j := range i {
			w.cov[i][j] = w.cov[j][i]
		}
		for j := i; j < n; j++ {
			w.cov[i][j] = m.covariance(&w.fills[i], &w.fills[j])
		}
		w.se[i] = standard(w.cov[i][i])
	}
	for i := range n {
		for j := range n {
			w.upTo[i+1][j+1] = w.cov[i][j] + w.upTo[i][j+1] + w.upTo[i+1][j] - w.upTo[i][j]
		}
	}
}
