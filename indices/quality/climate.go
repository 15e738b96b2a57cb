package quality

import (
	"math"
	"slices"
)

// gaps makes Gap: values of a calendar month from the first gap on, seen from
// the median up and down.
func (s *sheet) gaps(e *element, out []Outcome) {
	var lowest, highest [12]float64
	var known [12]bool
	for m, v := range s.byMonth(func(i int) (float64, bool) { return e.c[i], e.has[i] }) {
		if len(v) >= enough {
			known[m] = true
			lowest[m], highest[m] = mainBody(v)
		}
	}
	for i, m := range s.month {
		if e.has[i] && known[m] {
			out[i].note(Gap, e.c[i] < lowest[m] || e.c[i] > highest[m])
		}
	}
}

// mainBody returns the ends of the main body of values: those that no gap of gapC or
// more parts from the median. Values are put into boxes half as wide as the gap
// that is sought: a gap lies between boxes, never within one, and the values
// need no sorting.
func mainBody(v []float64) (lowest, highest float64) {
	type box struct {
		lowest, highest float64
		n               int
	}
	least, most := slices.Min(v), slices.Max(v)
	place := func(c float64) int { return int((c - least) / (gapC / 2)) }
	boxes := make([]box, place(most)+1)
	for _, c := range v {
		b := &boxes[place(c)]
		if b.n == 0 {
			b.lowest, b.highest = c, c
		}
		b.lowest, b.highest = min(b.lowest, c), max(b.highest, c)
		b.n++
	}
	middle := 0
	for n := boxes[0].n; n <= len(v)/2; n += boxes[middle].n {
		middle++
	}
	lowest, highest = boxes[middle].lowest, boxes[middle].highest
	for i := middle + 1; i < len(boxes); i++ {
		if b := &boxes[i]; b.n > 0 {
			if b.lowest-highest >= gapC {
				break
			}
			highest = b.highest
		}
	}
	for i := middle - 1; i >= 0; i-- {
		if b := &boxes[i]; b.n > 0 {
			if lowest-b.highest >= gapC {
				break
			}
			lowest = b.lowest
		}
	}
	return lowest, highest
}

// outliers makes Climatology.
func (s *sheet) outliers(e *element, out []Outcome) {
	v, from := s.byDate(e)
	on := func(place int) []float64 { return v[from[place]:from[place+1]] } // places of byDate
	var mean, sd [datesOfYear]float64
	var known [datesOfYear]bool
	var w window
	for place := range 2*halfWindow + 1 {
		w.move(nil, on(place))
	}
	for p := range datesOfYear {
		if p > 0 {
			w.move(on(p-1), on(p+2*halfWindow))
		}
		mean[p], sd[p], known[p] = biweight(w.sorted)
	}
	for i, p := range s.place {
		if e.has[i] && known[p] {
			out[i].note(Climatology, math.Abs(e.c[i]-mean[p]) >= outlierZ*sd[p])
		}
	}
}
