package outlook

import (
	"math"
	"math/rand/v2"
	"time"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

var january15 = pipeline.MonthDay{Month: time.January, Day: 15}

var thawCurve = Question{Kind: pipeline.Thaw, Definition: pipeline.Curve, Starts: january15}

// climate is an invented one: a sinusoid with weather that lasts about a week,
// and a trend.
type climate struct {
	meanC, amplitudeC, trendC, weatherC float64 // trendC: a year
	persistence                         float64 // of the year's mean on top of the weather, degC
}

var tundra = climate{meanC: -10, amplitudeC: 18, weatherC: 4, persistence: 1.5}

// days makes so many years from 1 January of a year on.
func (c climate) days(from, count int, seed uint64) []degreeday.DayMean {
	rng := rand.New(rand.NewPCG(seed, 1))
	first, end := pipeline.DayOf(from, time.January, 1), pipeline.DayOf(from+count, time.January, 1)
	out := make([]degreeday.DayMean, 0, end-first)
	weather, offset, of := 0.0, 0.0, 0
	for d := first; d < end; d++ {
		y, _, _ := d.Date()
		if y != of {
			of, offset = y, c.persistence*rng.NormFloat64()
		}
		weather = 0.85*weather + c.weatherC*math.Sqrt(1-0.85*0.85)*rng.NormFloat64()
		phase := 2 * math.Pi * float64(d.Time().YearDay()-200) / 365.25
		m := c.meanC + c.amplitudeC*math.Cos(phase) + weather + offset + c.trendC*float64(y-from)
		out = append(out, known(d, math.Round(10*m)/10))
	}
	return out
}

func known(d pipeline.Day, c float64) degreeday.DayMean {
	return degreeday.DayMean{Day: d, Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
}

func missing(d pipeline.Day, low, high float64) degreeday.DayMean {
	return degreeday.DayMean{Day: d, Origin: pipeline.Missing, LowC: low, HighC: high}
}

// plain makes every day of whole years from a function of the date.
func plain(from, count int, c func(year int, month time.Month, day int) float64) []degreeday.DayMean {
	var out []degreeday.DayMean
	for d := pipeline.DayOf(from, time.January, 1); d < pipeline.DayOf(from+count, time.January, 1); d++ {
		out = append(out, known(d, c(d.Date())))
	}
	return out
}

func day(s string) pipeline.Day {
	d, err := pipeline.ParseDay(s)
	if err != nil {
		panic(err)
	}
	return d
}
