package filling

import (
	"fmt"
	"math"

	"thawledger/pipeline"
)

// Model is what Fit found.
type Model struct {
	opt        Options
	neighbours []*regression
	climate    *regression
	lines      *lines
}

// Fit learns how to fill the target's record from the record itself and from
// its neighbours'. All series are in order of date, each day at most once.
//
// It panics if a series is not in order, a value is no temperature, a station
// comes twice, or a limit makes no sense.
func Fit(target []Point, neighbours []Neighbour, opt Options) *Model {
	if opt.LineDays < 0 || opt.LineDays > MostLine || opt.LeastDays < 1 || opt.LeastYears < 2 || !(opt.LeastR >= -1 && opt.LeastR <= 1) {
		panic(fmt.Sprintf("filling: limits %+v; line 0 to %d days, at least 1 day of 2 years, correlation -1 to 1", opt, MostLine))
	}
	checkSeries("target", target)
	m := &Model{opt: opt, climate: regress("", commonDays(target, nil, true), true, opt), lines: linesOf(target, opt.LineDays)}
	for i, n := range neighbours {
		checkSeries(n.Station, n.Points)
		for _, o := range neighbours[:i] {
			if o.Station == n.Station {
				panic(fmt.Sprintf("filling: neighbour %q comes twice", n.Station))
			}
		}
		m.neighbours = append(m.neighbours, regress(n.Station, commonDays(target, n.Points, false), false, opt))
	}
	return m
}

func checkSeries(name string, points []Point) {
	for i, p := range points {
		if i > 0 && p.Day <= points[i-1].Day {
			panic(fmt.Sprintf("filling: %s: day %s after %s; days must be in order, each at most once", name, p.Day, points[i-1].Day))
		}
		if !isTemperature(p.MeanC) {
			panic(fmt.Sprintf("filling: %s: mean %v degC of %s is not a temperature", name, p.MeanC, p.Day))
		}
	}
}

// isTemperature is false for NaN too.
func isTemperature(c float64) bool { return math.Abs(c) <= 1e6 }

// Months returns a neighbour's regression by month, January first; ok is false
// for a station that is not one of the model's neighbours.
func (m *Model) Months(station string) (months [12]Month, ok bool) {
	for _, g := range m.neighbours {
		if g.station == station {
			return g.months, true
		}
	}
	return months, false
}

// ClimateMonths returns the climate's errors by month, January first.
func (m *Model) ClimateMonths() [12]Month { return m.climate.months }

// Fill estimates a day by the neighbour whose error in that month has been the
// smallest, of those with a mean. ok is false if none of them may be used: one
// may not that has too few common days or too low a correlation in the month, or
// does no better there than the climate.
func (m *Model) Fill(d pipeline.Day, means []NeighbourMean) (meanC, seC float64, station string, ok bool) {
	place, month, _ := placeOf(d)
	limit := math.Inf(1)
	if _, se, ok := m.climate.estimate(place, month, 0); ok {
		limit = se
	}
	for _, n := range means {
		if !isTemperature(n.MeanC) {
			panic(fmt.Sprintf("filling: %s: mean %v degC of %s is not a temperature", n.Station, n.MeanC, d))
		}
		for _, g := range m.neighbours {
			if g.station != n.Station {
				continue
			}
			if c, se, can := g.estimate(place, month, n.MeanC); can && se < limit {
				meanC, seC, station, ok, limit = c, se, n.Station, true, se
			}
		}
	}
	return meanC, seC, station, ok
}

// FillClimate estimates a day by the record's own mean within 15 days of the
// date. ok is false if the record has too few years there.
func (m *Model) FillClimate(d pipeline.Day) (meanC, seC float64, ok bool) {
	place, month, _ := placeOf(d)
	return m.climate.estimate(place, month, 0)
}

// FillLine estimates a day on the straight line between two observed days. ok is
// false if more than Options.LineDays days lie between them, or the record has too
// few stretches like it to tell the error.
func (m *Model) FillLine(before, after Point, d pipeline.Day) (meanC, seC float64, ok bool) {
	n := int(after.Day-before.Day) - 1
	if d <= before.Day || d >= after.Day || n > m.opt.LineDays {
		return 0, 0, false
	}
	s := m.lines.at(before.Day+1, n)
	if s == nil {
		return 0, 0, false
	}
	k := d - before.Day - 1
	return onLine(before, after, d), standard(s.C[k][k]), true
}

// covariance is that of the errors of two filled days. Errors of different
// rungs, or of different neighbours, are taken as independent.
func (m *Model) covariance(a, b *Filled) float64 {
	if a.Rung != b.Rung || a.Neighbour != b.Neighbour {
		return 0
	}
	switch a.Rung {
	case ByLine:
		return m.lines.covariance(a, b)
	case ByClimate:
		return m.climate.spreads.covariance(a, b)
	case ByNeighbour:
		for _, g := range m.neighbours {
			if g.station == a.Neighbour {
				return g.spreads.covariance(a, b)
			}
		}
	}
	panic(fmt.Sprintf("filling: day %s was filled by %s %q, which the model does not have", a.Day, a.Rung, a.Neighbour))
}
