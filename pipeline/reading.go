package pipeline

import (
	"fmt"
	"time"
)

// Variable is what a reading is a value of. The numbers are stored and sent;
// they never change their meaning.
type Variable uint8

// The variables that readings may have. AirTemp and SurfaceTemp are values at an
// instant; the others are statistics over the span that the reading covers.
const (
	AirTemp     Variable = 1
	AirTempMean Variable = 2
	AirTempMax  Variable = 3
	AirTempMin  Variable = 4

	SurfaceTemp     Variable = 5
	SurfaceTempMean Variable = 6
	SurfaceTempMax  Variable = 7
	SurfaceTempMin  Variable = 8
)

// Of returns the variable's medium, and the variable of the air that it answers to.
func (v Variable) Of() (Medium, Variable) {
	if v >= SurfaceTemp {
		return OfTheSurface, v - SurfaceTemp + AirTemp
	}
	return OfTheAir, v
}

// Variables maps each variable to its name in settings and tables.
var Variables = map[Variable]string{
	AirTemp: "air_temp", AirTempMean: "air_temp_mean", AirTempMax: "air_temp_max", AirTempMin: "air_temp_min",
	SurfaceTemp: "surface_temp", SurfaceTempMean: "surface_temp_mean", SurfaceTempMax: "surface_temp_max", SurfaceTempMin: "surface_temp_min",
}

// String returns the variable's name in settings and tables.
func (v Variable) String() string {
	if n, ok := Variables[v]; ok {
		return n
	}
	return fmt.Sprintf("variable %d", uint8(v))
}

// ParseVariable returns the variable of a name.
func ParseVariable(name string) (Variable, error) {
	for v, n := range Variables {
		if n == name {
			return v, nil
		}
	}
	return 0, fmt.Errorf("%q is no variable; known are air_temp, air_temp_mean, air_temp_max, air_temp_min, and the same of surface_temp", name)
}

// Quality is a quality mark by WMO BUFR table 0 33 020 (WMO-No. 306, volume I.2,
// code table 0 33 020).
type Quality uint8

// The marks of BUFR table 0 33 020.
const (
	QualityGood         Quality = 0
	QualityInconsistent Quality = 1
	QualityDoubtful     Quality = 2
	QualityWrong        Quality = 3
	QualityNotChecked   Quality = 4
	QualityChanged      Quality = 5
	QualityEstimated    Quality = 6
	QualityMissing      Quality = 7
)

// Qualities lists the names of the marks, indexed by mark.
var Qualities = []string{"good", "inconsistent", "doubtful", "wrong", "not_checked", "changed", "estimated", "missing"}

// String returns the mark's name.
func (q Quality) String() string {
	if int(q) < len(Qualities) {
		return Qualities[q]
	}
	return fmt.Sprintf("quality %d", uint8(q))
}

// Series is what a station's readings have in common apart from their time.
// Together with the station, the feed and the start it is a reading's key.
type Series struct {
	Sensor   string
	Variable Variable
	LevelM   float64 // height of the sensor in m, + above, - below ground
	SpanS    int32   // length of what a reading covers, in s; 0 for an instant
}

// Reading is one normalised value of a series.
type Reading struct {
	Series  uint16 // place in the Series list of the part that holds it
	Quality Quality
	Row     int32   // number of the row in its batch, from 1 (header and blank lines not counted)
	StartS  int64   // start of the span it covers, s since 1970-01-01T00:00:00Z, half-open
	ValueC  float64 // degC, finite
}

// Start returns the start of the span in UTC.
func (r Reading) Start() time.Time { return time.Unix(r.StartS, 0).UTC() }

// Part is what travels on the bus as one message: readings of one station from
// one batch. Batch and Number identify it; Attempt tells a repeated message
// from its forerunner.
type Part struct {
	Batch    int64
	Number   int32 // from 1
	Attempt  int32 // from 1
	Feed     string
	Station  string
	Series   []Series
	Readings []Reading
}

// PartReadings is how many readings a part holds at most.
const PartReadings = 500
