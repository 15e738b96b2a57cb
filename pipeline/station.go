package pipeline

import "time"

// MeanRule says how a station's daily mean is made.
type MeanRule string

// The rules for a daily mean. The rule is stored with each day.
const (
	MeanMaxMin     MeanRule = "max_min"     // (max + min) / 2 of the station's day
	MeanAsReported MeanRule = "as_reported" // the daily mean that the feed states
	MeanHourly     MeanRule = "hourly"      // mean of the day's hours, with a completeness rule
)

// MeanRules lists the rules in the order in which messages name them.
var MeanRules = []MeanRule{MeanMaxMin, MeanAsReported, MeanHourly}

// Station is where air temperature is measured.
type Station struct {
	ID         string
	Name       string
	LatitudeD  float64 // degrees, + north
	LongitudeD float64 // degrees, + east
	ElevationM float64
	UTCOffset  time.Duration // standard time minus UTC; no daylight saving
	DayStarts  time.Duration // day boundary after local midnight, standard time
	Mean       MeanRule
	MinHours   int // MeanHourly: hours needed of 24
	MaxHole    int // MeanHourly: longest run of missing hours allowed
	BaseC      float64
	FillDays   int      // longest gap, in days, that a straight line may bridge
	ThawYear   MonthDay // first day of the window that a thaw season is sought in
	FreezeYear MonthDay // first day of the window that a freeze season is sought in
	Facts      []Fact
	Measures   Medium
	// Bases are not empty for a record with a base that changes within the year:
	// each holds from its date until the next; before the first BaseC does.
	Bases []BaseFrom
	// Neighbours are stations that missing days are filled from.
	Neighbours []string
	// ClimateFills says that the mean of the date fills days that nothing better does.
	ClimateFills bool
	// Joined is not empty for a record that has no readings of its own but takes
	// the daily values of other stations, one after another.
	Joined []Member
}

// Medium is what a station measures the temperature of.
type Medium string

// The media. The index of a surface is a surface index, and no n-factor is
// applied to it.
const (
	OfTheAir     Medium = "air"
	OfTheSurface Medium = "surface"
)

// BaseFrom is a base temperature that holds from a date on.
type BaseFrom struct {
	From  MonthDay
	BaseC float64
}

// BaseOn returns the base temperature of a day in degC.
func (s *Station) BaseOn(d Day) float64 {
	base := s.BaseC
	if len(s.Bases) == 0 {
		return base
	}
	year, _, _ := d.Date()
	for _, b := range s.Bases {
		if b.From.In(year) <= d {
			base = b.BaseC
		}
	}
	return base
}

// Fact is something that happened to a station.
type Fact struct {
	What     FactKind
	From, To Day // both included
	Note     string
}

// FactKind says what happened.
type FactKind string

// What may happen to a station. The first five are possible breaks of its record.
const (
	NewSensor   FactKind = "sensor"
	NewShield   FactKind = "shield"
	NewHeight   FactKind = "height"
	Moved       FactKind = "moved"
	Calibrated  FactKind = "calibrated"
	Visit       FactKind = "visit"
	Maintenance FactKind = "maintenance" // readings are not used
	Outage      FactKind = "outage"      // planned
)

// FactKinds lists the kinds in the order in which messages name them.
var FactKinds = []FactKind{NewSensor, NewShield, NewHeight, Moved, Calibrated, Visit, Maintenance, Outage}

// Member is a station that a joined record takes daily values from.
type Member struct {
	Station string
	Until   *Day        // last day; nil for the last member
	AdjustC [12]float64 // added to daily values, January to December, degC
	ErrorC  float64     // standard error of that, degC
	Source  string
}

// DayStart returns the instant at which the station's day begins.
func (s *Station) DayStart(d Day) time.Time {
	return d.Time().Add(s.DayStarts - s.UTCOffset)
}

// DayAt returns the station's day that contains the instant t.
func (s *Station) DayAt(t time.Time) Day {
	return Day(floorDiv(t.Add(s.UTCOffset-s.DayStarts).Unix(), secondsPerDay))
}
