package chance

import (
	"thawledger/indices/extreme"
	"thawledger/indices/trend"
	"thawledger/pipeline"
)

// Season is a complete season of the record.
type Season struct {
	Year  int     // in which the season's year starts: its place in time
	Label string  // 2031 or 2031-32
	CDays float64 // index, degC.d, of the same kind, definition, base and place (air or surface) as the design value
}

// Question is what is asked.
type Question struct {
	DesignCDays float64 // degC.d
	Direction   pipeline.Direction
	Seasons     []Season // complete ones only, each year once
	ThisYear    int      // the first season that is not over: the answers are for it
	LifeYears   int      // seasons of service that remain, ThisYear's the first; at least 1
	Bootstrap   extreme.Bootstrap
}

// LatestYears is how many years are taken as the climate of today: the
// climatological normal period of the World Meteorological Organization, and the
// period of the rule of the three warmest.
const LatestYears = 30

// TrendSeasons is the least number of seasons that a line is drawn through for a
// chance: judgement, no source.
const TrendSeasons = 20

// Answer is what a record says of a design value.
type Answer struct {
	Seasons int
	Passed  []Season // in order of time: at or above the design value; below it for not_below

	// Rank is the place that a season at the design value would have among those
	// of the record, 1 being the most severe: one more than have passed it.
	Rank int

	Latest  Estimate  // nil distribution if too few
	Trend   *Estimate // nil if the record is too short for a line
	NoTrend string    // why Trend is nil

	// The trend of the record; nil if it is too short for one.
	Change *Change
}

// Change is how the record changes with the years.
type Change struct {
	Kendall trend.Kendall
	Line    trend.Line
	// LagOne is the lag-one autocorrelation of what the line leaves, of LagPairs
	// pairs of neighbouring years, if HasLag. A positive one makes the test's p too
	// small and the slope's interval too narrow.
	LagOne   float64
	LagPairs int
	HasLag   bool
}

// Significant is the p below which a trend is told with a warning (common practice).
const Significant = 0.05

// Significant says that the record changes with the years.
func (c *Change) Significant() bool { return c.Kendall.P < Significant }

// Estimate is the chance of passing a design value in a season of this year's
// climate.
type Estimate struct {
	First, Last int // years of the first and last season that it rests on
	Seasons     int
	Passed      int // of them, after they were moved

	// Empirical is (Passed+1/2)/(Seasons+1), which is never 0 or 1, and
	// EmpiricalInterval Wilson's interval of Passed of Seasons.
	Empirical         float64
	EmpiricalInterval extreme.Interval

	// Fitted is the chance by the best fitting distribution; nil with fewer than
	// extreme.MinSample seasons, or if they are all the same.
	Fitted *Fitted

	// Life is the chance of passing it at least once in the years that remain: by
	// the distribution if there is one, else by Empirical.
	Life float64
}

// Fitted is a chance by a distribution.
type Fitted struct {
	extreme.Fitted
	Chance   float64
	Interval extreme.Interval
}

// Chance returns Fitted.Chance, or Empirical if there is no distribution.
func (e *Estimate) Chance() float64 {
	if e.Fitted != nil {
		return e.Fitted.Chance
	}
	return e.Empirical
}

// Period states the return period that belongs to Chance.
func (e *Estimate) Period() extreme.Period { return extreme.PeriodOf(e.Chance(), e.Seasons) }
