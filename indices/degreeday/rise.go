package degreeday

import (
	"fmt"
	"math"

	"thawledger/indices/compensated"
)

// Track is how the indices grow over a season, day by day, in degC.d.
type Track struct {
	Running []float64 // C less the lowest C so far; falls again after the season
	ToDate  []float64 // curve index to date: the largest Running so far
	Sum     []float64 // sum index to date

	// First and Last are the places, from 0, of the first and the last day of
	// the largest rise; -1 if no day is above zero. Of equal highs the earliest
	// counts and of equal lows the latest: the rise is the shortest there is.
	First, Last int
}

// Rise returns the track of a season's daily excesses in degC, one a day without
// gaps. Thawing: mean less base; freezing: base less mean. It panics if a value
// is not finite or beyond 1e6 degC.
func Rise(excessC []float64) Track {
	var t Track
	t.Rise(excessC)
	return t
}

// Rise makes t anew from other excesses, in the memory that t has.
func (t *Track) Rise(excessC []float64) {
	n := len(excessC)
	t.Running, t.ToDate, t.Sum = resized(t.Running, n), resized(t.ToDate, n), resized(t.Sum, n)
	r := newRise()
	for i, x := range excessC {
		if !isTemperature(x) {
			panic(fmt.Sprintf("degreeday: excess %v at place %d is not a difference of temperatures", x, i))
		}
		r.step(x, max(x, 0))
		t.Running[i], t.ToDate[i], t.Sum[i] = r.running, r.toDate, r.sum
	}
	t.First, t.Last = r.first, r.last
}

func resized(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	return s[:n]
}

// mostC is far above any temperature, and so low that no season's sum can leave
// the range of float64.
const mostC = 1e6

// isTemperature is false for NaN too.
func isTemperature(c float64) bool { return math.Abs(c) <= mostC }

// rise is the state of a track after some days.
//
// C less its lowest value so far is kept as a total of its own that starts again
// from zero at each new low. That is the same number, and it makes the index
// independent of all that came before the low: of the start of the window, and
// of how missing days of the cold season are filled.
type rise struct {
	running, toDate, sum float64

	sinceLow, positive compensated.Sum
	days               int
	begin              int // place of the day after the latest low
	first, last        int // of the largest rise
	firstPos, lastPos  int // first and last day above zero
}

func newRise() rise { return rise{first: -1, last: -1, firstPos: -1, lastPos: -1} }

// step adds a day: its excess, and what it adds to the sum.
func (r *rise) step(excessC, positiveC float64) {
	i := r.days
	r.days++
	r.sinceLow.Add(excessC)
	r.running = r.sinceLow.Value()
	switch {
	case r.running <= 0:
		r.running, r.sinceLow, r.begin = 0, compensated.Sum{}, i+1
	case r.running > r.toDate:
		r.toDate, r.first, r.last = r.running, r.begin, i
	}
	if positiveC > 0 {
		r.positive.Add(positiveC)
		r.sum = r.positive.Value()
	}
	if excessC > 0 {
		if r.firstPos < 0 {
			r.firstPos = i
		}
		r.lastPos = i
	}
}
