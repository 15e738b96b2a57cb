package surface

import (
	"cmp"
	"errors"
	"fmt"
	"slices"

	"thawledger/pipeline"
)

// Factor is an n-factor of a surface, with its range, in force from a date.
type Factor struct {
	Kind pipeline.Kind // Thaw for n_t, Freeze for n_f

	// From is when it takes effect: with the first season that starts on From or
	// later; MidSeason: on From itself.
	From      pipeline.Day
	MidSeason bool

	// Low, Central and High are the range of n: 0 < Low <= Central <= High <=
	// MostN. All three are the same where no range is known.
	Low, Central, High float64

	// Definition is that of the indices whose ratio it is; empty or NotStated
	// where the source does not say.
	Definition pipeline.Definition
	Source     string
}

// MostN is above all published n-factors (bituminous pavement "2+"): judgement,
// to catch a slip of the pen.
const MostN = 5

// Check says what is wrong with the factor; nil if nothing is.
func (f *Factor) Check() error {
	switch {
	case f.Kind != pipeline.Thaw && f.Kind != pipeline.Freeze:
		return fmt.Errorf("n-factor from %s: kind %q is neither thaw nor freeze", f.From, f.Kind)
	case !(0 < f.Low && f.Low <= f.Central && f.Central <= f.High && f.High <= MostN): // true for NaN
		return fmt.Errorf("n-factor from %s: low %v, central %v, high %v must be in this order, above 0 and at most %d",
			f.From, f.Low, f.Central, f.High, MostN)
	}
	switch f.Definition {
	case "", pipeline.NotStated, pipeline.Curve, pipeline.Sum, pipeline.Monthly:
		return nil
	}
	return fmt.Errorf("n-factor from %s: definition %q is unknown", f.From, f.Definition)
}

// ErrNoFactor is wrapped by the error for a season at whose start no n-factor of
// its kind is in force.
var ErrNoFactor = errors.New("no n-factor in force")

// piece is a factor and the first day on which it holds.
type piece struct {
	from pipeline.Day
	*Factor
}

// inForce returns the factors of a kind that hold in a season from first to
// last, in order: the one at its start, then those that take over within it.
func inForce(kind pipeline.Kind, first, last pipeline.Day, factors []Factor) ([]piece, error) {
	of := make([]*Factor, 0, len(factors))
	for i := range factors {
		if err := factors[i].Check(); err != nil {
			return nil, err
		}
		if factors[i].Kind == kind {
			of = append(of, &factors[i])
		}
	}
	slices.SortStableFunc(of, func(a, b *Factor) int { return cmp.Compare(a.From, b.From) })
	var out []piece
	for i, f := range of {
		if i > 0 && of[i-1].From == f.From {
			return nil, fmt.Errorf("two %s n-factors from %s; one must go", kind, f.From)
		}
		switch {
		case f.From <= first:
			out = append(out[:0], piece{first, f})
		case len(out) > 0 && f.MidSeason && f.From <= last:
			out = append(out, piece{f.From, f})
		}
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("%w for the %s season from %s", ErrNoFactor, kind, first)
	}
	return out, nil
}

// FactorsOf returns the n-factors of a surface as settings state them. A range
// that is not stated is no range.
func FactorsOf(stated []pipeline.NFactor) []Factor {
	out := make([]Factor, len(stated))
	for i, n := range stated {
		out[i] = Factor{Kind: n.Kind, From: n.From, Low: n.Low, Central: n.Value, High: n.High, Source: n.Source}
		if n.Low == 0 {
			out[i].Low = n.Value
		}
		if n.High == 0 {
			out[i].High = n.Value
		}
	}
	return out
}
