package extreme

import "fmt"

// Fitted is a distribution fitted to a sample, with how well it fits and how sure
// it is. Where Err is not nil there is nothing else but Name.
type Fitted struct {
	Name         Name
	Distribution Distribution
	Correlation  float64 // of the probability plot, by Cunnane's positions
	Statistic    float64 // Anderson-Darling
	PValue       float64 // of Statistic, by parametric bootstrap
	Resampled    *Resampled
	Err          error
}

// Rejected is the p-value below which a fit is called poor (common practice).
const Rejected = 0.05

// Poor says that the sample does not look like one of this distribution.
func (f *Fitted) Poor() bool { return f.Err != nil || f.PValue < Rejected }

// FitAll fits the four distributions, in the order of Names. It is an error if
// the sample will do for none (see Fit).
func FitAll(sample []float64, b Bootstrap) ([]Fitted, error) {
	if _, err := Fit(NameNormal, sample); err != nil {
		return nil, err
	}
	out := make([]Fitted, len(Names))
	for i, name := range Names {
		out[i] = fitOne(name, sample, b)
	}
	return out, nil
}

func fitOne(name Name, sample []float64, b Bootstrap) Fitted {
	f := Fitted{Name: name}
	if f.Distribution, f.Err = Fit(name, sample); f.Err != nil {
		return f
	}
	if f.Resampled, f.Err = Resample(f.Distribution, sample, b); f.Err != nil {
		return f
	}
	f.Correlation = Correlation(f.Distribution, sample, Cunnane())
	f.Statistic, f.PValue = f.Resampled.Statistic(), f.Resampled.PValue()
	return f
}

// Best returns the place of the fit to go by: of those that are not poor (of all,
// if all are) the one with the highest correlation of its probability plot, the
// earlier of Names if two are equal. This choice is judgement, without a source: a
// shape that is fitted has an advantage, and the rest lies within the interval. It
// panics if there is no fit at all.
func Best(fits []Fitted) int {
	best := -1
	for i := range fits {
		switch {
		case fits[i].Err != nil:
		case best < 0, fits[best].Poor() && !fits[i].Poor():
			best = i
		case fits[best].Poor() == fits[i].Poor() && fits[i].Correlation > fits[best].Correlation:
			best = i
		}
	}
	if best < 0 {
		panic(fmt.Sprintf("extreme: none of %d fits is one", len(fits)))
	}
	return best
}
