package quality

import (
	"math"
	"math/rand/v2"
	"time"

	"thawledger/pipeline"
)

// invented returns years of an invented arctic station, without faults: a yearly
// wave of -10 +- 18 degC and weather that remembers (autoregressive, lag-one
// 0.75), twice as strong in winter as in summer, in tenths.
func invented(seed uint64, years int) Record {
	r := rand.New(rand.NewPCG(seed, 1))
	first, end := pipeline.DayOf(1996, time.January, 1), pipeline.DayOf(1996+years, time.January, 1)
	rec := make(Record, 0, end-first)
	weather := 0.0
	for d := first; d < end; d++ {
		wave := math.Cos(2 * math.Pi * (float64(d.Time().YearDay()) - 200) / 365.25)
		weather = 0.75*weather + math.Sqrt(1-0.75*0.75)*r.NormFloat64()
		sd := 4.5 - 2.5*max(wave, -1)*0.6
		mean := -10 + 18*wave + sd*weather
		half := 3 + math.Abs(r.NormFloat64())*1.5
		v := DayValue{Day: d, MaxC: tenth(mean + half), MinC: tenth(mean - half), HasMax: true, HasMin: true, Observed: true}
		v.MeanC = (v.MaxC + v.MinC) / 2
		rec = append(rec, v)
	}
	return rec
}

func tenth(c float64) float64 { return math.Round(c*10) / 10 }

// set gives a day other values.
func (rec Record) set(d pipeline.Day, minC, maxC float64) {
	v := rec.at(d)
	v.MinC, v.MaxC, v.MeanC, v.HasMax, v.HasMin, v.Observed = minC, maxC, (minC+maxC)/2, true, true, true
}

func (rec Record) at(d pipeline.Day) *DayValue { return &rec[d-rec[0].Day] }

func of(out []Outcome, d pipeline.Day) Outcome { return out[d-out[0].Day] }
