package outlook

import (
	"slices"
	"time"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// A month counts with at least so many known days, and a slope is taken from at
// least so many years: judgement, no source.
const (
	enoughDays  = 20
	enoughYears = 10
)

// month is a calendar month's mean.
type month struct {
	meanC float64
	ok    bool
}

func (r *Record) gatherMonths() {
	number := func(d pipeline.Day) int {
		y, m, _ := d.Date()
		return 12*y + int(m) - 1
	}
	r.month0 = number(r.First())
	r.months = make([]month, number(r.Last())-r.month0+1)
	for i, d := 0, r.First(); i < len(r.months); i++ {
		next := firstOf(r.month0 + i + 1)
		var sum float64
		var n int
		for ; d < next && d <= r.Last(); d++ {
			if c, ok := r.mean(d); ok {
				sum += c
				n++
			}
		}
		if n >= enoughDays {
			r.months[i] = month{sum / float64(n), true}
		}
	}
}

// firstOf returns the first day of a month numbered 12 * year + month - 1.
func firstOf(number int) pipeline.Day { return pipeline.DayOf(0, time.Month(number+1), 1) }

// slopes are trends in degC a year, by month of the year from January.
type slopes [12]float64

// trend returns the Theil-Sen slope (P. K. Sen, 1968, "Estimates of the
// regression coefficient based on Kendall's tau", Journal of the American
// Statistical Association 63) of the mean of three months, for each month in
// their middle. Three months rather than one, since the slope of a single
// month's means is lost in their scatter: judgement, no source. Used are spells
// that are over before the window begins and, if later says so, those that begin
// after its end. A month with fewer than ten years has slope zero.
func (r *Record) trend(w degreeday.Window, later bool) slopes {
	var out slopes
	var at, mean []float64
	for m := range out {
		at, mean = at[:0], mean[:0]
		for i := 1; i+1 < len(r.months); i++ {
			if (r.month0+i)%12 != m || !r.months[i-1].ok || !r.months[i].ok || !r.months[i+1].ok {
				continue
			}
			if firstOf(r.month0+i+2)-1 >= w.First && !(later && firstOf(r.month0+i-1) > w.Last) {
				continue
			}
			at = append(at, float64((r.month0+i)/12))
			mean = append(mean, (r.months[i-1].meanC+r.months[i].meanC+r.months[i+1].meanC)/3)
		}
		if len(at) >= enoughYears {
			out[m] = theilSen(at, mean)
		}
	}
	return out
}

// theilSen returns the median of the slopes of all pairs of points with
// different x; 0 if there are none.
func theilSen(x, y []float64) float64 {
	all := make([]float64, 0, len(x)*(len(x)-1)/2)
	for j := range x {
		for i := range j {
			if x[i] != x[j] {
				all = append(all, (y[j]-y[i])/(x[j]-x[i]))
			}
		}
	}
	if len(all) == 0 {
		return 0
	}
	slices.Sort(all)
	n := len(all)
	return (all[(n-1)/2] + all[n/2]) / 2
}
