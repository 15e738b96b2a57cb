package filling

import (
	"thawledger/pipeline"
)

// Point is an observed daily mean in degC.
type Point struct {
	Day   pipeline.Day
	MeanC float64
}

// Neighbour is a station that may stand in for another: its observed daily
// means in order of date, each day at most once.
type Neighbour struct {
	Station string
	Points  []Point
}

// Rung is what a day was filled by. The numbers may be stored.
type Rung uint8

// The rungs of the ladder, in the order in which they are tried.
const (
	ByLine      Rung = 1
	ByNeighbour Rung = 2
	ByClimate   Rung = 3
)

// Rungs lists the rungs in their order.
var Rungs = []Rung{ByLine, ByNeighbour, ByClimate}

// String returns the rung's name.
func (r Rung) String() string {
	switch r {
	case ByLine:
		return "line"
	case ByNeighbour:
		return "neighbour"
	case ByClimate:
		return "climate"
	}
	return "unknown"
}

// Options are the limits within which a rung is used.
type Options struct {
	LineDays   int     // longest gap on a straight line, days; 0 for none, at most 5
	LeastDays  int     // common days that a month's regression takes, of the three months around
	LeastYears int     // and the years (for the climate too) that they must come from
	LeastR     float64 // least correlation of daily means in a month
}

// Usual returns the usual limits: a straight line over at most 2 days, and for a
// regression 120 common days in the three months around, of 4 years at least,
// with a correlation of 0.9 (all of them common practice or judgement, no source).
func Usual() Options { return Options{LineDays: 2, LeastDays: 120, LeastYears: 4, LeastR: 0.9} }

// Filled is a day that a rung filled.
type Filled struct {
	Day       pipeline.Day
	Rung      Rung
	Neighbour string  // rung neighbour: the station
	Gap       int     // length of the gap that the day is in, days; 0 at the record's ends
	Place     int     // place of the day in its gap, from 1; 0 at the record's ends
	MeanC     float64 // best estimate, degC
	SEC       float64 // its standard error, degC
}

// NeighbourMean is a neighbour's observed mean of the day to be filled, in degC.
type NeighbourMean struct {
	Station string
	MeanC   float64
}

// SeasonError is a season's index with the days that were filled in it. Without
// filled days the errors are 0 and the indices those of package degreeday.
type SeasonError struct {
	CurveC, CurveSEC float64 // curve index and its standard error, degC.d
	SumC, SumSEC     float64 // sum index and its standard error, degC.d
}
