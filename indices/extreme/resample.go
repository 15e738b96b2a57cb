package extreme

import (
	"fmt"
	"math/rand/v2"
	"slices"
)

// Bootstrap says how samples are drawn from a fitted distribution.
type Bootstrap struct {
	Replicates int     // samples drawn; at least 50
	Confidence float64 // share of the replicates within an interval, 0.5 to 0.99
	Seed       uint64  // same seed, same figures
}

// Usual is what reports use: 500 samples, 90 % intervals.
func Usual() Bootstrap { return Bootstrap{Replicates: 500, Confidence: 0.9, Seed: 1} }

func (b Bootstrap) check() {
	if b.Replicates < 50 || b.Replicates > 1e6 || !(b.Confidence >= 0.5 && b.Confidence <= 0.99) {
		panic(fmt.Sprintf("extreme: %d replicates and confidence %v; at least 50, and 0.5 to 0.99", b.Replicates, b.Confidence))
	}
}

// Interval is a range that holds a number with a confidence.
type Interval struct{ Low, High, Confidence float64 }

// Resampled is what refitting a distribution to samples drawn from itself says of
// it (parametric bootstrap: B. Efron and R. J. Tibshirani, 1993, "An Introduction
// to the Bootstrap", sections 6.5 and 13.3).
//
// It takes the distribution to be right and the seasons to be independent and of
// one climate. What is wrong with that is not in the intervals: where several
// distributions fit as well, the difference between them is to be looked at too.
type Resampled struct {
	bootstrap Bootstrap
	fits      []Distribution
	statistic []float64 // Anderson-Darling, of each replicate about its own fit
	observed  float64
}

// Resample draws samples as long as the sample from the distribution that was
// fitted to it, and fits each again. The few samples that cannot be fitted are
// drawn anew; if more than a tenth cannot be, it is an error. It panics if the
// bootstrap is out of its ranges.
func Resample(d Distribution, sample []float64, b Bootstrap) (*Resampled, error) {
	b.check()
	r := &Resampled{bootstrap: b, observed: AndersonDarling(d, sample)}
	random := rand.New(rand.NewPCG(b.Seed, uint64(len(sample))))
	x := make([]float64, len(sample))
	for failed := 0; len(r.fits) < b.Replicates; {
		Draw(d, random, x)
		fit, err := Fit(d.Name(), x)
		if err != nil {
			if failed++; failed > b.Replicates/10 {
				return nil, fmt.Errorf("resample %s: more than %d samples cannot be fitted: %w", d.Name(), b.Replicates/10, err)
			}
			continue
		}
		r.fits = append(r.fits, fit)
		r.statistic = append(r.statistic, AndersonDarling(fit, x))
	}
	return r, nil
}

// Draw fills x with values drawn from a distribution.
func Draw(d Distribution, random *rand.Rand, x []float64) {
	for i := range x {
		// 53 bits, the middle of their cell: never 0 or 1.
		p := (float64(random.Uint64()>>11) + 0.5) / (1 << 53)
		x[i] = d.Quantile(min(p, 1-1e-16))
	}
}

// PValue returns the share of the replicates that fit their own distribution no
// better than the sample fits its: (1 + those with a statistic at or above the
// sample's) / (1 + replicates). Small: the sample does not look like one of this
// distribution. It allows for the parameters having been fitted.
func (r *Resampled) PValue() float64 {
	worse := 1
	for _, a := range r.statistic {
		if a >= r.observed {
			worse++
		}
	}
	return float64(worse) / float64(len(r.statistic)+1)
}

// Statistic returns the Anderson-Darling statistic of the sample.
func (r *Resampled) Statistic() float64 { return r.observed }

// LevelInterval returns the percentile interval of a return level.
func (r *Resampled) LevelInterval(tail Tail, years float64) Interval {
	return r.interval(func(d Distribution) float64 { return ReturnLevel(d, tail, years) })
}

// ChanceInterval returns the percentile interval of the chance of passing x.
func (r *Resampled) ChanceInterval(tail Tail, x float64) Interval {
	return r.interval(func(d Distribution) float64 { return Chance(d, tail, x) })
}

func (r *Resampled) interval(of func(Distribution) float64) Interval {
	v := make([]float64, len(r.fits))
	for i, d := range r.fits {
		v[i] = of(d)
	}
	return Percentile(v, r.bootstrap.Confidence)
}

// Percentile returns the range of the middle share confidence of values, at least
// two, between neighbouring ranks in proportion.
func Percentile(values []float64, confidence float64) Interval {
	if len(values) < 2 {
		panic("extreme: fewer than two values have no interval")
	}
	v := slices.Sorted(slices.Values(values))
	at := func(p float64) float64 {
		place := float64(p * float64(len(v)-1))
		i := min(int(place), len(v)-2)
		return v[i] + float64((place-float64(i))*(v[i+1]-v[i]))
	}
	return Interval{Low: at((1 - confidence) / 2), High: at((1 + confidence) / 2), Confidence: confidence}
}
