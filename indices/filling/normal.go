package filling

import (
	"math"
	"time"

	"thawledger/pipeline"
)

// places is the number of dates of the year: 29 February has a place of its own,
// so that every other date is at the same place in every year.
const places = 366

// placeOf returns a date's place in the year, from 0, and its month, from 0.
func placeOf(d pipeline.Day) (place, month, year int) {
	y, m, day := d.Date()
	return time.Date(2000, m, day, 0, 0, 0, 0, time.UTC).YearDay() - 1, int(m) - 1, y
}

// aroundDays is how far from a date, in days, means of other years count for its
// normal, and enoughOfYear how many of a year's 31 days around it make the year
// one that counts: judgement, no source.
const (
	aroundDays   = 15
	enoughOfYear = 10
)

// sums are sums over the days around each date of the year. The zero value is
// empty.
type sums struct {
	n, x, y [places]float64
}

// around returns the sums within aroundDays of each date.
func (s *sums) around() *sums {
	out := &sums{}
	for _, v := range [...]struct{ from, to *[places]float64 }{{&s.n, &out.n}, {&s.x, &out.x}, {&s.y, &out.y}} {
		var before [places + 2*aroundDays + 1]float64 // sums before each place, from aroundDays before the year on
		for i := range len(before) - 1 {
			before[i+1] = before[i] + v.from[(i-aroundDays+places)%places]
		}
		for p := range places {
			v.to[p] = before[p+2*aroundDays+1] - before[p]
		}
	}
	return out
}

// normal returns the mean of x and of y around a date, of all years or, if
// without is not nil, of all but those of its days. ok is false if none is left.
func (s *sums) normal(place int, without *sums) (x, y float64, ok bool) {
	n, x, y := s.n[place], s.x[place], s.y[place]
	if without != nil {
		n, x, y = n-without.n[place], x-without.x[place], y-without.y[place]
	}
	if n < 1 {
		return 0, 0, false
	}
	return x / n, y / n, true
}

// common is a day on which both stations were observed: x of the neighbour and y
// of the target, in degC. For the climate x is 0.
type common struct {
	day          pipeline.Day
	place, month int
	year         int
	x, y         float64
}

// commonDays pairs two series in order of date; all of the target's days if
// neighbour is nil.
func commonDays(target, neighbour []Point, alone bool) []common {
	out := make([]common, 0, len(target))
	k := 0
	for _, t := range target {
		c := common{day: t.Day, y: t.MeanC}
		if !alone {
			for k < len(neighbour) && neighbour[k].Day < t.Day {
				k++
			}
			if k == len(neighbour) || neighbour[k].Day != t.Day {
				continue
			}
			c.x = neighbour[k].MeanC
		}
		c.place, c.month, c.year = placeOf(t.Day)
		out = append(out, c)
	}
	return out
}

// yearAround returns the year of the day as counted from half a year before to
// half a year after the middle of month: so December and the January after it
// are of one year if month is either of them.
func (c *common) yearAround(month int) int {
	off := (c.month-month+18)%12 - 6 // months from the middle month, -6 to 5
	switch {
	case month+off < 0:
		return c.year + 1
	case month+off > 11:
		return c.year - 1
	}
	return c.year
}

// near says whether the day is in the month or in one beside it.
func (c *common) near(month int) bool {
	off := (c.month - month + 12) % 12
	return off <= 1 || off == 11
}

func square(x float64) float64 { return x * x }

// standard is the square root, of 0 for what rounding has left below 0.
func standard(x float64) float64 { return math.Sqrt(max(0, x)) }
