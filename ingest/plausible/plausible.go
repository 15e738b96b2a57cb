// Package plausible holds the readings of a batch against the climate of their
// station, to find a batch that was read in a wrong unit:
//
//	daily values of the record -> Climate
//	readings of a batch        -> Check -> is there a unit that would suit far better?
//
// It asks for much before it speaks: a warm spell must pass, however warm.
// Nothing here is a quality test of single readings.
package plausible

import (
	"fmt"
	"math"

	"thawledger/pipeline"
)

// All of these are judgement, no source.
const (
	aroundDays = 15  // days around a date that count for its climate
	enough     = 60  // daily means that a date's climate needs, some three years
	leastDays  = 5   // days that a batch needs to be held against it
	strange    = 3.0 // root mean square of standardised differences from which a batch looks wrong
	suits      = 1.5 // up to which another unit suits
	leastSD    = 1.0 // degC; a date's standard deviation is not taken for smaller
)

// Climate is the mean and standard deviation of a station's daily means by date.
type Climate struct {
	mean, sd [366]float64
	n        [366]int
}

// DateStats sums the daily means of a date of the year over all years.
type DateStats struct {
	YearDay int // 1 to 366
	N       int
	Sum     float64 // degC
	Squares float64
}

// NewClimate smooths dates over those within 15 days.
func NewClimate(stats []DateStats) *Climate {
	var dates [366]DateStats
	for _, s := range stats {
		if s.YearDay >= 1 && s.YearDay <= 366 {
			dates[s.YearDay-1] = s
		}
	}
	c := &Climate{}
	for i := range dates {
		var n int
		var sum, squares float64
		for off := -aroundDays; off <= aroundDays; off++ {
			d := dates[(i+off+366)%366]
			n, sum, squares = n+d.N, sum+d.Sum, squares+d.Squares
		}
		if c.n[i] = n; n > 1 {
			c.mean[i] = sum / float64(n)
			c.sd[i] = math.Sqrt(max((squares-sum*c.mean[i])/float64(n-1), 0))
		}
	}
	return c
}

// at returns the climate of a day; ok is false where the record knows too little.
func (c *Climate) at(d pipeline.Day) (mean, sd float64, ok bool) {
	i := d.Time().YearDay() - 1
	return c.mean[i], max(c.sd[i], leastSD), c.n[i] >= enough
}

// Check gathers the readings of one station in a batch.
type Check struct {
	climate *Climate
	days    map[pipeline.Day]*dayMean
}

type dayMean struct {
	sum float64
	n   int
}

// NewCheck begins a check.
func NewCheck(c *Climate) *Check { return &Check{climate: c, days: map[pipeline.Day]*dayMean{}} }

// Add takes a reading in degC, of any variable of the air.
func (k *Check) Add(d pipeline.Day, valueC float64) {
	m := k.days[d]
	if m == nil {
		m = &dayMean{}
		k.days[d] = m
	}
	m.sum, m.n = m.sum+valueC, m.n+1
}

// mistake is a wrong unit: what the value would be had it been read rightly.
type mistake struct {
	text  string
	right func(c float64) float64
	// least is the difference as read from which it is thought of: a division by
	// ten brings any warmth near to 0 degC, where the climate may be too.
	least float64
}

var mistakes = []mistake{
	{"degF, declared as degC", func(c float64) float64 { return (c - 32) / 1.8 }, strange},
	{"degC, declared as degF", func(c float64) float64 { return c*1.8 + 32 }, strange},
	{"tenths, declared as whole degrees", func(c float64) float64 { return c / 10 }, 4 * strange},
	{"whole degrees, declared as tenths", func(c float64) float64 { return c * 10 }, strange},
}

// Verdict says which wrong unit the batch looks like, and why; "" if none.
func (k *Check) Verdict() string {
	asRead, n := k.difference(func(c float64) float64 { return c })
	if n < leastDays || asRead < strange {
		return ""
	}
	best, least := "", suits
	for _, m := range mistakes {
		if d, _ := k.difference(m.right); asRead >= m.least && d <= least && d <= asRead/3 {
			best, least = m.text, d
		}
	}
	if best == "" {
		return ""
	}
	return fmt.Sprintf("looks like %s: over %d days it lies %.1f standard deviations from what the record has for the dates, and would lie %.1f",
		best, n, asRead, least)
}

// difference returns the root mean square of the standardised differences of
// days that the climate knows, and how many those are.
func (k *Check) difference(right func(float64) float64) (rms float64, n int) {
	var squares float64
	for d, m := range k.days {
		mean, sd, ok := k.climate.at(d)
		if !ok {
			continue
		}
		z := (right(m.sum/float64(m.n)) - mean) / sd
		squares, n = squares+z*z, n+1
	}
	return math.Sqrt(squares / float64(max(n, 1))), n
}
