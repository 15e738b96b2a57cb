package quality

import "thawledger/pipeline"

// DayValue is what a station has for a day, in degC.
type DayValue struct {
	Day            pipeline.Day
	MeanC          float64 // if Observed
	MaxC, MinC     float64 // if HasMax, HasMin
	HasMax, HasMin bool
	Observed       bool // false for a missing or an interpolated mean
}

// Record is a station's days, in order, each at most once; days may be left out.
type Record []DayValue

// Limits of the tests on daily values.
const (
	toleranceC  = 1.0  // Consistency: Durre et al., 2010, second-hand
	stepC       = 25.0 // Step and Spike without a distribution: that of the spike in Durre et al.
	leastStepC  = 15.0 // least limit of Step with one: judgement
	stepTimes   = 8.0  // Step: times the standard deviation of differences; judgement
	spikeShare  = 0.75 // Spike: share of the limit of Step, on both sides; judgement
	flatC       = 0.1  // Persistence: Zahumensky, 2004, second-hand
	curtainC    = 0.2  // around 0 degC, where ground and surface stand still: the same
	streakDays  = 20   // Durre et al., 2010, second-hand
	gapC        = 10.0 // the same
	outlierZ    = 6.0  // the same
	halfWindow  = 7    // days each side of the date: a window of 15 (the same)
	laggedC     = 40.0 // the same
	naughtDegFC = -160.0 / 9
)

// Daily tests every day of a record; the outcomes are in the same order. Each
// test is made on the mean, the maximum and the minimum, where the day has them,
// and fails if it fails on any. The tests:
//
//   - Range: beyond Options.Bounds. Such a value takes part in no other test.
//   - Consistency: minimum above maximum, or mean above maximum or below
//     minimum, by more than 1 degC (tolerance of Durre et al.).
//   - Step: change from the day before of 8 standard deviations (biweight) or
//     more of the record's changes in that month, and at least 15 degC; 25 degC
//     where fewer than 100 are known. The guidelines' 3 degC are for values a
//     minute apart and say nothing of days. A step back from a spike is not held
//     against the day after it.
//   - Spike: off the days before and after, to the same side, by 0.75 of that
//     limit or more; where it is not known by 25 degC (Durre et al.).
//   - Persistence: maximum less minimum below 0.1 degC. Surface: unless within
//     0.2 degC of zero. Soil: not tested, it stands still.
//   - Streak: the same value on 20 days or more in a row (Durre et al.); a day
//     without a value ends a row. Exempt as for Persistence.
//   - Naught: maximum and minimum both 0 degC, or both 0 degF (-17.8 degC), the
//     marks of a missing value (Durre et al.). Here it is a doubt and nothing
//     more, since days at zero are what thaw is about; surface and soil, which
//     rest there, are only tested for 0 degF.
//   - Gap: on the far side of a gap of 10 degC or more in the sorted values of
//     the calendar month, as seen from the median (Durre et al.); 100 values or
//     more.
//   - Climatology: 6 biweight standard deviations or more from the biweight mean
//     of the values within 7 days of its date in all years, 100 or more (Durre
//     et al.). Dates are aligned by month and day.
//   - LaggedRange: maximum 40 degC or more above the warmest minimum of the day
//     before, the day and the day after; minimum as far below the coldest
//     maximum of the three (Durre et al., details from memory). Surface: not
//     tested, sun makes such ranges.
//   - Neighbour: see Options; the mean is 8 degC or more, and 4 standard
//     deviations or more, off what the neighbours' means let expect (Durre et
//     al.). They are regressed on month by month, over 40 days or more and with
//     a correlation of 0.8 or more. Of each the day before or after counts if it
//     is nearer; of all the median.
//
// A month's or a date's distribution is that of the whole record: a value added
// anywhere may change outcomes in other years (see MayChange). Shifts of a
// climate within the record widen the distributions.
//
// Daily panics if days are not in order, or a value is not finite or beyond 1e6
// degC.
func Daily(rec Record, opt Options) []Outcome {
	opt.check()
	s, out := lay(rec, opt.bounds())
	s.consistency(out)
	for e := range s.elements {
		s.steps(&s.elements[e], out)
		s.streaks(&s.elements[e], opt.Medium, out)
		s.gaps(&s.elements[e], out)
		s.outliers(&s.elements[e], out)
	}
	s.within(opt.Medium, out)
	s.neighbours(&opt, out)
	for i := range out {
		if v := &rec[i]; v.Observed || v.HasMax || v.HasMin {
			out[i].settle()
		}
	}
	return out
}

// MayChange reports whether the outcome of a day may change when the values of
// another (or the same) day do. It may within 19 days; within 7 days of the same
// date of any year; in the changed day's calendar month of any year, and in the
// next day's (a change from one to the next belongs to the later); and on the
// day after such a month, for a spike on its last day. All else is as it was.
func MayChange(changed, day pipeline.Day) bool {
	if apart := changed - day; -streakDays < apart && apart < streakDays {
		return true
	}
	m, p := dateOf(changed)
	next, _ := dateOf(changed + 1)
	here, q := dateOf(day)
	before, _ := dateOf(day - 1)
	if here == m || before == m || before == next { // the first of the next month has before == m
		return true
	}
	apart := (int(p) - int(q) + datesOfYear) % datesOfYear
	return apart <= halfWindow || datesOfYear-apart <= halfWindow
}
