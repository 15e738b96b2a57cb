package extreme

import (
	"fmt"
	"math"
)

// Name names a distribution, as settings, commands and reports do.
type Name string

// The distributions that are fitted.
const (
	NameGEV      Name = "gev"
	NameGumbel   Name = "gumbel"
	NameNormal   Name = "normal"
	NamePearson3 Name = "pearson3"
)

// Names lists the distributions in the order in which reports show them.
var Names = []Name{NameGEV, NameGumbel, NameNormal, NamePearson3}

// String returns the name as prose has it.
func (n Name) String() string {
	switch n {
	case NameGEV:
		return "GEV"
	case NameGumbel:
		return "Gumbel"
	case NameNormal:
		return "normal"
	case NamePearson3:
		return "Pearson III"
	}
	return "unknown"
}

// Distribution is a fitted distribution of a season's index.
type Distribution interface {
	Name() Name
	// CDF returns the chance that an index is at or below x; 0 or 1 beyond the
	// bounds of the distribution.
	CDF(x float64) float64
	// Above returns the chance that an index is above x: 1 - CDF(x), without the
	// loss of digits where that is small.
	Above(x float64) float64
	// Quantile returns the x with CDF(x) = p, for 0 < p < 1; it panics for other p.
	Quantile(p float64) float64
	// Parameters returns the parameters with their names, in a fixed order.
	Parameters() []Parameter
}

// Parameter is a parameter of a distribution. Locations and scales have the unit
// of the sample; shape and skew have none.
type Parameter struct {
	Name  string
	Value float64
}

// Fit fits a distribution by L-moments. It refuses samples of fewer than
// MinSample values, of one value only, with values that are not finite, and for
// the three-parameter distributions those in which all values but one are equal.
func Fit(name Name, sample []float64) (Distribution, error) {
	if len(sample) < MinSample {
		return nil, fmt.Errorf("%d values are too few to fit a distribution: at least %d are needed", len(sample), MinSample)
	}
	m, err := SampleLMoments(sample)
	if err != nil {
		return nil, err
	}
	return FitLMoments(name, m)
}

// FitLMoments fits a distribution to L-moments, whatever they are from. It panics
// if the name is unknown, or if L2 is not positive.
func FitLMoments(name Name, m LMoments) (Distribution, error) {
	if !(m.L2 > 0) {
		panic(fmt.Sprintf("extreme: L2 is %v; it is positive for any sample of more than one value", m.L2))
	}
	switch name {
	case NameGEV:
		return fitGEV(m)
	case NameGumbel:
		return fitGumbel(m), nil
	case NameNormal:
		return Normal{Mean: m.L1, SD: math.Sqrt(math.Pi) * m.L2}, nil
	case NamePearson3:
		return fitPearson3(m)
	}
	panic(fmt.Sprintf("extreme: there is no distribution %q", string(name)))
}

// Tail says which end of the distribution is the dangerous one.
type Tail uint8

// The tails: Upper for warm summers and for severe winters, Lower for what must
// freeze enough and may not (direction not_below).
const (
	Upper Tail = iota
	Lower
)

// Chance returns the chance that a season passes x: that its index is above x
// (Upper), or at or below x (Lower). All four distributions are continuous, so
// that "at or above" and "below" have the same chance.
func Chance(d Distribution, tail Tail, x float64) float64 {
	if tail == Lower {
		return d.CDF(x)
	}
	return d.Above(x)
}

// ReturnLevel returns the index that a season passes with the chance 1/years: the
// value of so many years. It panics unless 1 < years <= 1e9.
func ReturnLevel(d Distribution, tail Tail, years float64) float64 {
	if !(years > 1 && years <= 1e9) {
		panic(fmt.Sprintf("extreme: %v years are no return period; above 1, at most 1e9", years))
	}
	if tail == Lower {
		return d.Quantile(1 / years)
	}
	return d.Quantile(1 - 1/years)
}

// ReturnPeriod returns in how many years on average one season passes x: the
// reciprocal of Chance. ok is false where the distribution gives no chance of
// it, or one so small that the reciprocal says nothing (less than 1e-12). What a
// record may say of it is for PeriodOf.
func ReturnPeriod(d Distribution, tail Tail, x float64) (years float64, ok bool) {
	c := Chance(d, tail, x)
	if c < leastChance {
		return 0, false
	}
	return 1 / c, true
}

const leastChance = 1e-12

func checkProbability(p float64) {
	if !(p > 0 && p < 1) {
		panic(fmt.Sprintf("extreme: probability %v is not between 0 and 1", p))
	}
}
