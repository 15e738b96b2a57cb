package region

import (
	"hash/fnv"
	"math"
	"math/rand/v2"
	"time"

	"thawledger/pipeline"
)

// The invented record runs from First to Last; the days from Replay on are sent
// bit by bit, as the current season.
var (
	First  = pipeline.DayOf(2000, time.January, 1)
	Replay = pipeline.DayOf(2031, time.January, 15)
	Last   = pipeline.DayOf(2031, time.August, 29)
)

// Station is an invented station.
type Station struct {
	ID     string
	Name   string
	Lat    float64
	Lon    float64
	Layout string // name of the layout that it sends by

	meanC, waveC float64 // yearly mean and half of the yearly range
	warm2031C    float64 // how much warmer the current summer is
	gap          stretch // days that its logger missed
	lateBy       int     // days after the gap on which they arrive after all; 0: never
}

type stretch struct{ from, to pipeline.Day }

func day(month time.Month, d int) pipeline.Day { return pipeline.DayOf(2031, month, d) }

// Stations are all stations of the region.
var Stations = []Station{
	{ID: "FELLMOOR", Name: "Fellmoor Flats", Lat: 69.2, Lon: -121.4, Layout: "quoted", meanC: -9.5, waveC: 19.5, warm2031C: 1.9},
	{ID: "QUILLNESS", Name: "Quillness Head", Lat: 70.1, Lon: -119.8, Layout: "quoted", meanC: -10.5, waveC: 18, warm2031C: 0.3},
	{ID: "TARNHOLM", Name: "Tarnholm", Lat: 68.4, Lon: -122.9, Layout: "quoted", meanC: -7.5, waveC: 20, warm2031C: 0.9,
		gap: stretch{day(time.July, 20), day(time.July, 31)}, lateBy: 22},
	{ID: "OSTERBRAE", Name: "Osterbrae", Lat: 67.8, Lon: -124.0, Layout: "fahrenheit", meanC: -5.8, waveC: 20.5, warm2031C: 1.2},
	{ID: "HALVDEN", Name: "Halvden Landing", Lat: 68.9, Lon: -120.2, Layout: "fahrenheit", meanC: -8.6, waveC: 19, warm2031C: 0.2},
	{ID: "SKERRY", Name: "Skerry Light", Lat: 70.6, Lon: -118.7, Layout: "tenths", meanC: -11.5, waveC: 16.5, warm2031C: 0.6,
		gap: stretch{day(time.July, 24), day(time.August, 8)}},
	{ID: "RIMEWATER", Name: "Rimewater", Lat: 68.0, Lon: -121.1, Layout: "tenths", meanC: -7.0, waveC: 20.5, warm2031C: -0.2},
	{ID: "GRAVELBANK", Name: "Gravelbank", Lat: 69.7, Lon: -123.3, Layout: "tenths", meanC: -9.9, waveC: 18.5, warm2031C: 0.8},
	{ID: "LOWMERE", Name: "Lowmere", Lat: 68.6, Lon: -119.3, Layout: "hourly", meanC: -8.0, waveC: 19.5, warm2031C: 0.5},
}

// weather returns the station's daily means in degC from First to Last.
func (s *Station) weather() []float64 {
	h := fnv.New64a()
	h.Write([]byte(s.ID))
	random := rand.New(rand.NewPCG(20310720, h.Sum64()))
	out := make([]float64, 0, Last-First+1)
	noise := 0.0
	for d := First; d <= Last; d++ {
		year, _, _ := d.Date()
		ofYear := float64(d - pipeline.DayOf(year, time.January, 1))
		summer := math.Cos(2 * math.Pi * (ofYear - 201) / 365.25) // 1 on 21 July
		noise = 0.78*noise + (2.2-0.9*summer)*random.NormFloat64()
		c := s.meanC + s.waveC*summer + 0.05*float64(year-2000) + noise
		if d >= Replay && summer > 0 {
			c += s.warm2031C * summer
		}
		out = append(out, c)
	}
	return out
}
