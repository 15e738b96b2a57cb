package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"thawledger/pipeline"
)

// season is what the values of all proposed columns say of their unit.
type season struct {
	lo, hi     float64 // in the file's unit
	low, high  float64 // that 1 % are below, and above: sensors have spikes
	sum        [12]float64
	n          [12]int
	whole      bool
	latitudeD  float64 // NaN if not known
	warm, cold float64 // mean of the warmest and of the coldest month
	months     int
}

// Bounds of what air temperatures are, degC, where nothing else is known. Mostly
// judgement; the extremes on WMO's list are -89.2 and 56.7 degC, from memory.
const (
	lowestAirC      = -68.0
	lowestSouthC    = -90.0 // the Antarctic
	highestAirC     = 52.0
	highestNorthC   = 42.0 // polewards of 50 degrees
	spikeC          = 8.0  // that the highest of all values may be beyond
	coolestSummerC  = 0.0  // mean of the warmest month, but for the Antarctic and the high Arctic
	coolestPolarC   = -45.0
	warmestSummerC  = 42.0
	warmestNorthC   = 30.0
	warmestWinterC  = 32.0 // mean of the coldest month
	winterNorthC    = 9.0  // polewards of 55 degrees
	mostSeasonalC   = 75.0 // between the warmest and the coldest month
	tenthsFrom      = 100.0
	wholeYear       = 11 // months
	leastMonthCells = 5
)

func seasonOf(f *temps, when *timing, latitudeD float64) *season {
	var all []float64
	s := &season{lo: math.Inf(1), hi: math.Inf(-1), whole: true, latitudeD: latitudeD, warm: math.Inf(-1), cold: math.Inf(1)}
	for _, x := range f.values {
		s.whole = s.whole && x.column.whole
		for row, v := range x.column.values {
			if math.IsNaN(v) {
				continue
			}
			all = append(all, v)
			if d, ok := when.day(row); ok {
				_, m, _ := d.Date()
				s.sum[m-1] += v
				s.n[m-1]++
			}
		}
	}
	if n := len(all); n > 0 {
		slices.Sort(all)
		s.lo, s.low, s.high, s.hi = all[0], all[n/100], all[n-1-n/100], all[n-1]
	}
	for m, n := range s.n {
		if n >= leastMonthCells {
			mean := s.sum[m] / float64(n)
			s.warm, s.cold = max(s.warm, mean), min(s.cold, mean)
			s.months++
		}
	}
	return s
}

// doubt says why values of this unit would be no air temperatures; "" if they
// could well be.
func (s *season) doubt(u pipeline.TempUnit) string {
	c := func(v float64) float64 {
		v, _ = u.Celsius(v)
		return v
	}
	north := math.Abs(s.latitudeD) >= 50 // not so if the latitude is not known
	lowest, highest, warmest, winter := lowestAirC, highestAirC, warmestSummerC, warmestWinterC
	if s.latitudeD < -60 {
		lowest = lowestSouthC
	}
	if north {
		highest, warmest = highestNorthC, warmestNorthC
	}
	if math.Abs(s.latitudeD) >= 55 {
		winter = winterNorthC
	}
	coolest := coolestSummerC
	if s.latitudeD < -60 || s.latitudeD > 75 {
		coolest = coolestPolarC
	}
	switch {
	case strings.HasPrefix(string(u), "tenths") && (!s.whole || max(math.Abs(s.lo), math.Abs(s.hi)) < tenthsFrom):
		return "whole numbers past 100 would be expected"
	case c(s.high) > highest || c(s.hi) > highest+spikeC:
		return fmt.Sprintf("the highest would be %.1f degC", c(s.hi))
	case c(s.low) < lowest || c(s.lo) < lowest-spikeC:
		return fmt.Sprintf("the lowest would be %.1f degC", c(s.lo))
	case s.months == 0:
		return ""
	case c(s.warm) > warmest:
		return fmt.Sprintf("the warmest month would have %.1f degC", c(s.warm))
	case s.hasSummer() && c(s.warm) < coolest:
		return fmt.Sprintf("the warmest month would have %.1f degC", c(s.warm))
	case s.months >= wholeYear && c(s.cold) > winter:
		return fmt.Sprintf("the coldest month would have %.1f degC", c(s.cold))
	case c(s.warm)-c(s.cold) > mostSeasonalC:
		return fmt.Sprintf("summer and winter would be %.1f degC apart", c(s.warm)-c(s.cold))
	}
	return ""
}

// hasSummer reports whether a month is there that is of summer: where the
// hemisphere is not known, it takes both.
func (s *season) hasSummer() bool {
	july, january := s.n[6] >= leastMonthCells, s.n[0] >= leastMonthCells
	switch {
	case s.latitudeD > 0:
		return july
	case s.latitudeD < 0:
		return january
	}
	return july && january
}

// guess returns the likeliest unit, and why; the first of those that are
// possible.
func (s *season) guess() (pipeline.TempUnit, string) {
	if s.hi < s.lo {
		return pipeline.DegC, "there is no value to tell it by"
	}
	var possible []string
	var against []string
	unit := pipeline.TempUnit("")
	for _, u := range pipeline.TempUnits {
		if why := s.doubt(u); why == "" {
			if unit == "" {
				unit = u
			}
			possible = append(possible, string(u))
		} else if u == pipeline.DegC || u == pipeline.DegF {
			against = append(against, "as "+string(u)+" "+why)
		}
	}
	numbers := fmt.Sprintf("values are %v to %v", s.lo, s.hi)
	switch {
	case s.months == 1:
		numbers += fmt.Sprintf(", the month's mean %.1f", s.warm)
	case s.months > 1:
		numbers += fmt.Sprintf(", months' means %.1f to %.1f", s.cold, s.warm)
	}
	if len(against) > 0 {
		numbers += "; " + strings.Join(against, "; ")
	}
	switch len(possible) {
	case 0:
		return pipeline.DegC, numbers + "; no unit makes them likely, so " + string(pipeline.DegC) + " is only a word in its place"
	case 1:
		return unit, numbers + "; " + possible[0] + " is likely"
	}
	return unit, numbers + "; they can be " + strings.Join(possible, " and ") + ", and nothing but their source tells which"
}
