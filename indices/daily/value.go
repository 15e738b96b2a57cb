package daily

import (
	"math"
	"slices"

	"thawledger/pipeline"
)

// Value is a station's day. Temperatures are in degC and finite.
type Value struct {
	Day    pipeline.Day
	Origin pipeline.Origin
	MeanC  float64 // 0 and without meaning if Origin is Missing

	MaxC, MinC     float64 // highest and lowest of the day, as the station states them
	HasMax, HasMin bool    // whether they are known

	// LowC and HighC are the bounds of the mean: the mean itself, or for a
	// missing day the lowest and the highest that are plausible.
	LowC, HighC float64

	Rule        pipeline.MeanRule
	Hours       int16 // rule hourly: hours with a value
	LongestHole int16 // rule hourly: longest run of hours without one

	// ErrorC is the standard error of a filled mean in degC, if HasError; From the
	// station that it was filled from, if Origin is ByNeighbour.
	ErrorC   float64
	HasError bool
	From     string

	// TestsMade and TestsFailed are sets of quality tests, a bit a test.
	TestsMade, TestsFailed uint32

	// Quality is the worst mark of the values that the mean was made of, by the
	// order good, not checked, changed, estimated, doubtful, inconsistent. It is
	// estimated for an interpolated day and missing for a missing one.
	Quality pipeline.Quality
}

// Own reports whether the day holds anything from readings. One that does not
// follows from the days around it.
func (v Value) Own() bool {
	return v.Origin == pipeline.Observed || v.HasMax || v.HasMin || v.Hours > 0
}

// observe gives the day its mean.
func (v *Value) observe(meanC float64, q pipeline.Quality) {
	v.Origin, v.MeanC, v.LowC, v.HighC, v.Quality = pipeline.Observed, meanC, meanC, meanC, q
}

// Lowest and highest plausible air temperature in degC: WMO guidelines on
// quality control for automatic weather stations (Zahumensky, 2004), as quoted
// elsewhere; the guidelines themselves were not at hand.
const (
	lowestC  = -80
	highestC = 60
)

// isTemperature is false for what no arithmetic here should see: values far from
// any temperature, infinities and NaN.
func isTemperature(c float64) bool { return math.Abs(c) <= 1e6 }

// marks are those that a value may bear and be used, from best to worst.
var marks = []pipeline.Quality{
	pipeline.QualityGood, pipeline.QualityNotChecked, pipeline.QualityChanged, pipeline.QualityEstimated,
	pipeline.QualityDoubtful, pipeline.QualityInconsistent,
}

// severity is the place of a mark in marks, and -1 for all others.
func severity(q pipeline.Quality) int { return slices.Index(marks, q) }

func worse(a, b pipeline.Quality) pipeline.Quality {
	if severity(b) > severity(a) {
		return b
	}
	return a
}
