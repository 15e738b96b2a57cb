package outlook

import (
	"cmp"
	"math"
	"slices"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Range is what 10, 50 and 90 % of outcomes are at most.
type Range[T any] struct{ P10, P50, P90 T }

// Passing is the outlook for one threshold.
type Passing struct {
	ThresholdCDays float64

	// Probability is that of the season's index coming to the threshold or past
	// it, (k + 1/2)/(n + 1) with k of n members doing so: never 0 or 1, since that
	// no past year did it does not say that none will. (k + 1/2)/(n + 1) is the
	// mean of the posterior of a proportion with a prior of Jeffreys, beta(1/2,
	// 1/2). A range where missing days leave the path open.
	Probability degreeday.Bounds

	// Passed reports that the index to date is there already, whatever the
	// missing days were: it never falls.
	Passed bool

	// Passes is the number of members that pass, on the high path.
	Passes int

	// On is when it comes to the threshold if it does: the quantiles among the
	// members that pass, rounded to whole days; false if none does. Where missing
	// days leave the path open, P10 is of the high path, P90 of the low one if any
	// passes there, and P50 of the high.
	On    Range[pipeline.Day]
	HasOn bool
}

// FallsShort returns the probability of the season's index staying below the
// threshold: 1 less the probability of passing. It is what a direction of
// not_below fears.
func (p *Passing) FallsShort() degreeday.Bounds {
	return degreeday.Bounds{Low: 1 - p.Probability.High, High: 1 - p.Probability.Low}
}

// Adverse returns the probability of ending on the wrong side of the threshold:
// of passing it if the index must stay below (not_above), of falling short of it
// if the index must come to it (not_below).
func (p *Passing) Adverse(d pipeline.Direction) degreeday.Bounds {
	if d == pipeline.NotBelow {
		return p.FallsShort()
	}
	return p.Probability
}

// Passing returns the outlook for a threshold in degC.d of the air index.
func (o *Outlook) Passing(thresholdCDays float64) Passing {
	p := Passing{ThresholdCDays: thresholdCDays, Passed: o.ToDate.Low >= thresholdCDays}
	low, high := o.low.days(thresholdCDays), o.high.days(thresholdCDays)
	n := len(o.high.ends)
	p.Probability = degreeday.Bounds{Low: plotted(len(low), n), High: plotted(len(high), n)}
	p.Passes, p.HasOn = len(high), len(high) > 0
	if !p.HasOn {
		return p
	}
	latest := high
	if len(low) > 0 {
		latest = low
	}
	on := func(days []float64, share float64) pipeline.Day {
		return o.Window.First + pipeline.Day(math.Round(Quantile(days, share)))
	}
	p.On = Range[pipeline.Day]{on(high, 0.1), on(high, 0.5), on(latest, 0.9)}
	return p
}

// End returns the season's end index, degC.d: bounds that are equal unless
// missing days leave the path open.
func (o *Outlook) End() Range[degreeday.Bounds] {
	at := func(share float64) degreeday.Bounds {
		return degreeday.Bounds{Low: Quantile(o.low.ends, share), High: Quantile(o.high.ends, share)}
	}
	return Range[degreeday.Bounds]{at(0.1), at(0.5), at(0.9)}
}

// days returns the places in the window, from 0 and sorted, of the days on which
// members come to a threshold; those that do not are left out.
func (e *ensemble) days(thresholdCDays float64) []float64 {
	var out []float64
	for _, path := range e.paths {
		// an index to date never falls
		i, _ := slices.BinarySearchFunc(path, thresholdCDays, cmp.Compare[float64])
		if i < len(path) {
			out = append(out, float64(i))
		}
	}
	slices.Sort(out)
	return out
}

func plotted(k, n int) float64 { return (float64(k) + 0.5) / (float64(n) + 1) }

// share returns the probability that values come to a threshold, by the same
// rule as Passing.Probability.
func share(sortedValues []float64, threshold float64) float64 {
	i, _ := slices.BinarySearch(sortedValues, threshold)
	return plotted(len(sortedValues)-i, len(sortedValues))
}

// Quantile returns the value that a share of a population is at most, from a
// sorted sample: definition 6 of R. J. Hyndman and Y. Fan (1996, "Sample
// quantiles in statistical packages", American Statistician 50), a straight line
// between order statistics at i/(n + 1), and the extremes beyond them. It is the
// one by which a new value, exchangeable with the sample, falls below the i-th
// with a probability of exactly i/(n + 1): with definition 7 the range from 10 to
// 90 % of twenty members would hold 72 % of outcomes, not 80. It panics if the
// sample is empty.
func Quantile(sortedSample []float64, share float64) float64 {
	n := len(sortedSample)
	if n == 0 {
		panic("outlook: quantile of nothing")
	}
	at := share * float64(n+1)
	i := int(math.Floor(at))
	switch {
	case i < 1:
		return sortedSample[0]
	case i >= n:
		return sortedSample[n-1]
	}
	low, high := sortedSample[i-1], sortedSample[i]
	return low + float64((at-float64(i))*(high-low))
}

// sorted sorts in place.
func sorted(s []float64) []float64 {
	slices.Sort(s)
	return s
}

func same(a, b []float64) bool { return slices.Equal(a, b) }
