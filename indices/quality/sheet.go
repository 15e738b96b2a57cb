package quality

import (
	"fmt"
	"slices"

	"thawledger/pipeline"
)

// sheet is a record laid out for the tests: by element and by date.
type sheet struct {
	days     []pipeline.Day
	month    []uint8  // 0 to 11
	place    []uint16 // date of the year, by place in a leap year
	elements [3]element
}

// The elements of a day.
const (
	meanOf = iota
	maxOf
	minOf
)

// element is a day's mean, maximum or minimum through the record. Values beyond
// the hard bounds are left out.
type element struct {
	c   []float64
	has []bool
}

// datesOfYear is how many dates a leap year has.
const datesOfYear = 366

// monthStart is the place of each month's first day in a leap year.
var monthStart = [12]uint16{0, 31, 60, 91, 121, 152, 182, 213, 244, 274, 305, 335}

// dateOf returns a day's month, from 0, and the place of its date in a leap
// year: dates are kept apart by month and day, so that 1 March is always the
// same place and 29 February has its own.
func dateOf(d pipeline.Day) (month uint8, place uint16) {
	_, m, day := d.Date()
	month = uint8(m - 1)
	return month, monthStart[month] + uint16(day-1)
}

// lay makes the sheet and the outcomes, with Range noted.
func lay(rec Record, b Bounds) (*sheet, []Outcome) {
	s := &sheet{days: make([]pipeline.Day, len(rec)), month: make([]uint8, len(rec)), place: make([]uint16, len(rec))}
	for e := range s.elements {
		s.elements[e] = element{make([]float64, len(rec)), make([]bool, len(rec))}
	}
	out := make([]Outcome, len(rec))
	for i := range rec {
		v, o := &rec[i], &out[i]
		if i > 0 && v.Day <= rec[i-1].Day {
			panic(fmt.Sprintf("quality: day %s after %s; days must be in order, each at most once", v.Day, rec[i-1].Day))
		}
		o.Day, o.Mark = v.Day, pipeline.QualityMissing
		s.days[i] = v.Day
		s.month[i], s.place[i] = dateOf(v.Day)
		for e, c := range [3]float64{v.MeanC, v.MaxC, v.MinC} {
			if !v.has(e) {
				continue
			}
			if !isTemperature(c) {
				panic(fmt.Sprintf("quality: value %v degC of %s is not a temperature", c, v.Day))
			}
			within := b.LowestC <= c && c <= b.HighestC
			o.note(Range, !within)
			s.elements[e].c[i], s.elements[e].has[i] = c, within
		}
	}
	return s, out
}

func (v *DayValue) has(e int) bool {
	switch e {
	case maxOf:
		return v.HasMax
	case minOf:
		return v.HasMin
	}
	return v.Observed
}

// follows reports whether days i-1 and i of the record are a day apart and the
// element has both.
func (s *sheet) follows(e *element, i int) bool {
	return i > 0 && i < len(s.days) && e.has[i-1] && e.has[i] && s.days[i] == s.days[i-1]+1
}

// byMonth returns values of the days by calendar month.
func (s *sheet) byMonth(value func(i int) (float64, bool)) [12][]float64 {
	var count [12]int
	for _, m := range s.month {
		count[m]++
	}
	var out [12][]float64
	for m, n := range count {
		out[m] = make([]float64, 0, n)
	}
	for i, m := range s.month {
		if c, ok := value(i); ok {
			out[m] = append(out[m], c)
		}
	}
	return out
}

// byDate returns an element's values in order of their date of the year, sorted
// within each, and where each date's begin. halfWindow dates of the year's end stand before the
// first date, and as many of its beginning after the last, so that every date's
// window is one piece: from[p] to from[p+2*halfWindow+1] for place p.
func (s *sheet) byDate(e *element) (v []float64, from []int) {
	var count [datesOfYear]int
	for i, p := range s.place {
		if e.has[i] {
			count[p]++
		}
	}
	from = make([]int, 1, datesOfYear+2*halfWindow+1)
	for p := range datesOfYear + 2*halfWindow {
		from = append(from, from[p]+count[(p+datesOfYear-halfWindow)%datesOfYear])
	}
	v = make([]float64, from[len(from)-1])
	at := slices.Clone(from[halfWindow : halfWindow+datesOfYear])
	for i, p := range s.place {
		if e.has[i] {
			v[at[p]] = e.c[i]
			at[p]++
		}
	}
	for p := halfWindow; p < halfWindow+datesOfYear; p++ {
		slices.Sort(v[from[p]:from[p+1]])
	}
	begin, end := from[halfWindow], from[halfWindow+datesOfYear]
	copy(v[:begin], v[end-begin:end])
	copy(v[end:], v[begin:begin+len(v)-end])
	return v, from
}
