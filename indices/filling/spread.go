package filling

import "thawledger/pipeline"

// MostLag is the longest lag, in days, for which the likeness of errors is
// estimated. What errors further apart have in common is their year's bias.
const MostLag = 30

// Spread is how far estimates of one month were off on days that were observed,
// each estimate made without the days of its own year.
type Spread struct {
	Days, Years int     // days of the month, and the years that they are of
	BiasC       float64 // mean error over all years: estimate less observation, degC
	SDC         float64 // s: standard deviation of a day's error about its year's bias, degC
	BiasSDC     float64 // standard deviation of the years' biases, degC
	// R are the correlations of errors k days apart, about the years' biases; R[0]
	// is 1. From the first that is not above 0 on, all are 0.
	R [MostLag + 1]float64
}

// SEC returns the standard error of a single day, degC.
func (s *Spread) SEC() float64 { return standard(square(s.SDC) + square(s.BiasSDC)) }

// residual is an error on an observed day; year as counted around a month.
type residual struct {
	day         pipeline.Day
	month, year int
	errorC      float64
}

// spreadOf works the spread of a month out from the errors in it and in the
// months beside it, in order of date.
//
// The mean square of errors is that of the month itself. Their likeness is that
// of all three months, each month's errors in units of its own root mean square:
// with z such errors, the products z(i) z(j) of one year are averaged by lag,
// about zero, so that no mean is taken away which few years would know badly.
// The average over all pairs further apart than MostLag is the share f of
// variance that is the year's bias; (average at lag k - f) / (1 - f) is R[k].
func spreadOf(all []residual, month int) Spread {
	s := Spread{}
	s.R[0] = 1
	var n, squares [12]float64
	bias, years := 0.0, map[int]bool{}
	for _, r := range all {
		n[r.month]++
		squares[r.month] += square(r.errorC)
		if r.month == month {
			bias += r.errorC
			years[r.year] = true
		}
	}
	s.Days, s.Years = int(n[month]), len(years)
	if s.Days == 0 || squares[month] == 0 {
		return s
	}
	s.BiasC = bias / n[month]
	mean := squares[month] / n[month]
	z := make([]float64, len(all))
	for i, r := range all {
		if squares[r.month] > 0 {
			z[i] = r.errorC / standard(squares[r.month]/n[r.month])
		}
	}
	var products, pairs [MostLag + 1]float64
	far, farPairs := 0.0, 0.0
	for i := range all {
		for j := i; j < len(all) && all[j].year == all[i].year; j++ {
			if lag := all[j].day - all[i].day; lag <= MostLag {
				products[lag] += z[i] * z[j]
				pairs[lag]++
			} else {
				far += z[i] * z[j]
				farPairs++
			}
		}
	}
	share := 0.0
	if farPairs > 0 {
		share = min(max(far/farPairs, 0), mostShare)
	}
	s.SDC, s.BiasSDC = standard(mean*(1-share)), standard(mean*share)
	for k := 1; k <= MostLag && pairs[k] > 0; k++ {
		r := (products[k]/pairs[k] - share) / (1 - share)
		if r <= 0 {
			break
		}
		s.R[k] = min(r, 1)
	}
	return s
}

// mostShare keeps some of the variance for the days.
const mostShare = 0.9

// spreads are those of all months, with the root mean square of errors by date:
// within 15 days of it, of errors in the date's own month.
type spreads struct {
	months [12]Spread
	se     [places]float64
}

// byDate works the errors by date out.
func (s *spreads) byDate(errors []residual) {
	var raw sums
	for _, r := range errors {
		place, _, _ := placeOf(r.day)
		raw.n[place]++
		raw.y[place] += square(r.errorC)
	}
	all := raw.around()
	for p := range s.se {
		_, y, _ := all.normal(p, nil)
		s.se[p] = standard(y)
	}
}

// covariance returns that of the errors of two days, degC squared.
func (s *spreads) covariance(a, b *Filled) float64 {
	place, month, _ := placeOf(a.Day)
	otherPlace, otherMonth, _ := placeOf(b.Day)
	p, q := &s.months[month], &s.months[otherMonth]
	lag := b.Day - a.Day
	if lag < 0 {
		lag = -lag
	}
	r := 0.0
	if lag <= MostLag {
		r = (p.R[lag] + q.R[lag]) / 2
	}
	f, g := p.share(), q.share()
	return s.se[place] * s.se[otherPlace] * (r*standard((1-f)*(1-g)) + standard(f*g))
}

// share is that of the years' biases in the variance.
func (s *Spread) share() float64 {
	all := square(s.SDC) + square(s.BiasSDC)
	if all == 0 {
		return 0
	}
	return square(s.BiasSDC) / all
}
