package trend

import (
	"fmt"
	"math"
	"slices"

	"thawledger/indices/compensated"
)

// Line is a straight line through a record, and how sure its slope is.
type Line struct {
	N         int
	Slope     float64 // of the unit of the values, a year
	Intercept float64 // at time 0

	// Low and High are the bounds of the slope, with Confidence, if Bounded: with
	// few points, or many ties, the ranks lie outside the pairs and there are none.
	Low, High  float64
	Confidence float64
	Bounded    bool
	Pairs      int // slopes that the median is of
}

// At returns the line's value at a time.
func (l Line) At(time float64) float64 { return l.Intercept + float64(l.Slope*time) }

// TheilSen returns the line whose slope is the median of the slopes between all
// pairs of points, by their true difference of time, slopes of zero included
// (H. Theil, 1950; P. K. Sen, 1968). The intercept is the median of the residuals
// Value - Slope Time (and not the one of W. J. Conover, which goes through the
// medians of time and value).
//
// The bounds are those of Gilbert 1987, p. 218: with C = z sqrt(Var), Var that of
// MannKendall, the slopes of the ranks (Pairs-C)/2 and (Pairs+C)/2 + 1, between
// neighbouring ranks in proportion. They take the years to be independent, as
// MannKendall does. confidence is between 0.5 and 0.999, else TheilSen panics.
func TheilSen(points []Point, confidence float64) (Line, error) {
	if !(confidence >= 0.5 && confidence <= 0.999) {
		panic(fmt.Sprintf("trend: confidence %v is not between 0.5 and 0.999", confidence))
	}
	x, err := ordered(points)
	if err != nil {
		return Line{}, err
	}
	k, err := MannKendall(x)
	if err != nil {
		return Line{}, err
	}
	slopes := make([]float64, 0, len(x)*(len(x)-1)/2)
	for j := range x {
		for i := range j {
			slopes = append(slopes, (x[j].Value-x[i].Value)/(x[j].Time-x[i].Time))
		}
	}
	slices.Sort(slopes)
	l := Line{N: len(x), Slope: median(slopes), Confidence: confidence, Pairs: len(slopes)}
	residuals := make([]float64, len(x))
	for i, p := range x {
		residuals[i] = p.Value - float64(l.Slope*p.Time)
	}
	slices.Sort(residuals)
	l.Intercept = median(residuals)
	c := math.Sqrt2 * math.Erfinv(confidence) * math.Sqrt(k.Var)
	low, okLow := atRank(slopes, (float64(l.Pairs)-c)/2)
	high, okHigh := atRank(slopes, (float64(l.Pairs)+c)/2+1)
	if okLow && okHigh && k.Var > 0 {
		l.Low, l.High, l.Bounded = low, high, true
	}
	return l, nil
}

// median returns the middle of values in order.
func median(x []float64) float64 {
	m := len(x) / 2
	if len(x)%2 == 1 {
		return x[m]
	}
	return x[m-1] + (x[m]-x[m-1])/2
}

// atRank returns the value of a rank, from 1, in values in order, between
// neighbouring ranks in proportion; not ok where there is no such rank.
func atRank(x []float64, rank float64) (v float64, ok bool) {
	if !(rank >= 1 && rank <= float64(len(x))) {
		return 0, false
	}
	whole := math.Floor(rank)
	i := int(whole) - 1
	if i == len(x)-1 {
		return x[i], true
	}
	return x[i] + float64((rank-whole)*(x[i+1]-x[i])), true
}

// Residuals returns Value less the line at Time for each point, in the order of
// the points.
func (l Line) Residuals(points []Point) []float64 {
	out := make([]float64, len(points))
	for i, p := range points {
		out[i] = p.Value - l.At(p.Time)
	}
	return out
}

// LagOne returns the lag-one autocorrelation of what is left of the points when
// the line is taken away: the sum over pairs of points one year apart of the
// product of their deviations from the mean, over the sum of squares of all, and
// times (n-1)/pairs where years are missing (G. E. P. Box and G. M. Jenkins, 1970,
// for years without gaps). It is within -1 and 1. pairs is how many such pairs there
// are; ok is false with fewer than 3, or if the line leaves nothing. For
// independent years it lies within some 2/sqrt(pairs) of 0.
//
// A caution: a positive value makes the p of MannKendall too small and the bounds
// of TheilSen too narrow. It is not corrected for, only shown: 30 years say little
// of it, and taking it out takes out a part of the trend.
func LagOne(points []Point, l Line) (r float64, pairs int, ok bool) {
	x, err := ordered(points)
	if err != nil {
		return 0, 0, false
	}
	e := l.Residuals(x)
	var sum, squares, products compensated.Sum
	for _, v := range e {
		sum.Add(v)
	}
	mean := sum.Value() / float64(len(e))
	for i, v := range e {
		squares.Add(float64((v - mean) * (v - mean)))
		if i > 0 && x[i].Time-x[i-1].Time == 1 {
			products.Add(float64((v - mean) * (e[i-1] - mean)))
			pairs++
		}
	}
	if pairs < 3 || !(squares.Value() > 1e-18*(1+mean*mean)) {
		return 0, pairs, false
	}
	r = products.Value() / squares.Value() * float64(len(e)-1) / float64(pairs)
	return min(max(r, -1), 1), pairs, true
}
