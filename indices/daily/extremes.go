package daily

import (
	"thawledger/pipeline"
)

// aroundDays is how far from a date, in days, the record's extremes count:
// judgement, no source.
const aroundDays = 15

// enough is how many observed means it takes before their extremes bound
// anything: judgement, no source.
const enough = 10

// Extremes are the lowest and the highest observed daily mean of a record for
// every date of the year. The zero value knows none.
type Extremes struct {
	dates [366]span // by place in a leap year
}

type span struct {
	lowC, highC float64
	days        int // observed
}

func (s *span) add(o span) {
	switch {
	case o.days == 0:
	case s.days == 0:
		*s = o
	default:
		s.lowC, s.highC, s.days = min(s.lowC, o.lowC), max(s.highC, o.highC), s.days+o.days
	}
}

// Bounds returns the lowest and the highest plausible mean of a day in degC: the
// lowest and the highest observed mean of the record within 15 days of the same
// month and day in any year, the day's own year too. For 29 February that is 1
// March in other years. Where the record has fewer than ten it returns -80 and
// 60 degC (WMO guidelines on quality control for automatic weather stations, as
// quoted elsewhere). Extremes of a record of a few years are closer together than
// those of the climate: bounds that rest on them may be too narrow.
func (e *Extremes) Bounds(d pipeline.Day) (lowC, highC float64) {
	place, leap := placeOf(d)
	if !leap && place >= leapPlace {
		place++
	}
	if s := e.dates[place]; s.days >= enough {
		return s.lowC, s.highC
	}
	return lowestC, highestC
}

// leapPlace is the place of 29 February in a leap year, and of 1 March in others.
const leapPlace = 31 + 28

// placeOf returns a day's place in its year, from 0.
func placeOf(d pipeline.Day) (place int, leap bool) {
	t := d.Time()
	year := t.Year()
	return t.YearDay() - 1, year%4 == 0 && (year%100 != 0 || year%400 == 0)
}

// extremesOf gathers the observed values. Leap years and others are kept apart
// until distances have been counted, since dates across the end of February are
// a day further apart in leap years.
func extremesOf(values []Value) *Extremes {
	var inLeap [366]span
	var inCommon [365]span
	for i := range values {
		v := &values[i]
		if v.Origin != pipeline.Observed {
			continue
		}
		mean := span{lowC: v.MeanC, highC: v.MeanC, days: 1}
		if place, leap := placeOf(v.Day); leap {
			inLeap[place].add(mean)
		} else {
			inCommon[place].add(mean)
		}
	}
	e := &Extremes{}
	for place := range e.dates {
		common := place
		if place > leapPlace {
			common--
		}
		for off := -aroundDays; off <= aroundDays; off++ {
			e.dates[place].add(inLeap[(place+off+366)%366])
			e.dates[place].add(inCommon[(common+off+365)%365])
		}
	}
	return e
}
