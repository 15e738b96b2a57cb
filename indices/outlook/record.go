package outlook

import (
	"fmt"
	"math"
	"time"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Record is a station's daily means, every day once from its first to its last.
// It is made once and not changed.
type Record struct {
	days   []degreeday.DayMean
	months []month // calendar months, for the trend
	month0 int     // of months[0]: 12 * year + month - 1
}

// NewRecord makes a record of daily means. The days must be consecutive. A day
// whose origin is not pipeline.Missing counts as known by its MeanC, however it
// was filled; a missing day has LowC and HighC.
//
// It panics if there are no days, if they are not consecutive, or if a
// temperature is not finite, beyond 1e6 degC, or a missing day's LowC is above
// its HighC.
func NewRecord(days []degreeday.DayMean) *Record {
	if len(days) == 0 {
		panic("outlook: a record without days")
	}
	for i := range days {
		d := &days[i]
		switch {
		case d.Day != days[0].Day+pipeline.Day(i):
			panic(fmt.Sprintf("outlook: day %s in place of %s; days must be consecutive", d.Day, days[0].Day+pipeline.Day(i)))
		case d.Origin == pipeline.Missing && !(isTemperature(d.LowC) && isTemperature(d.HighC) && d.LowC <= d.HighC):
			panic(fmt.Sprintf("outlook: %v to %v degC of missing day %s are no bounds", d.LowC, d.HighC, d.Day))
		case d.Origin != pipeline.Missing && !isTemperature(d.MeanC):
			panic(fmt.Sprintf("outlook: mean %v degC of %s is not a temperature", d.MeanC, d.Day))
		}
	}
	r := &Record{days: days}
	r.gatherMonths()
	return r
}

// isTemperature is false for NaN too.
func isTemperature(c float64) bool { return math.Abs(c) <= 1e6 }

// First returns the record's first day.
func (r *Record) First() pipeline.Day { return r.days[0].Day }

// Last returns the record's last day.
func (r *Record) Last() pipeline.Day { return r.days[len(r.days)-1].Day }

// Question says which index of which season is asked for.
type Question struct {
	Kind       pipeline.Kind
	Definition pipeline.Definition // curve or sum
	BaseC      float64
	Starts     pipeline.MonthDay // of the thaw or freeze year
}

func (q *Question) check() {
	if q.Kind != pipeline.Thaw && q.Kind != pipeline.Freeze {
		panic(fmt.Sprintf("outlook: kind %q is neither thaw nor freeze", q.Kind))
	}
	if q.Definition != pipeline.Curve && q.Definition != pipeline.Sum {
		panic(fmt.Sprintf("outlook: definition %q is neither curve nor sum", q.Definition))
	}
	if !isTemperature(q.BaseC) {
		panic(fmt.Sprintf("outlook: base %v degC is not a temperature", q.BaseC))
	}
}

// excess returns by how much a mean counts.
func (q *Question) excess(meanC float64) float64 {
	if q.Kind == pipeline.Freeze {
		return q.BaseC - meanC
	}
	return meanC - q.BaseC
}

// slots is the number of month-days, 29 February among them.
const slots = 366

// year is one thaw or freeze year of the record, day by day of the year, so that
// all years can be laid on one another.
type year struct {
	window degreeday.Window
	number int // year of the window's first day

	// meanC has 29 February in its place in every year; where the calendar has
	// none it is the mean of 28 February and 1 March.
	meanC [slots]float64
	// lastMissing is the slot of the last day that is not known, -1 if all are;
	// [1]: 29 February left out.
	lastMissing [2]int
}

// years is the record cut into the years of a question.
type years struct {
	all      []year
	leapSlot int         // slot of 29 February
	months   [slots]int8 // month of each slot, from 0
}

// cut cuts the record into thaw or freeze years.
func (r *Record) cut(starts pipeline.MonthDay) *years {
	y := &years{}
	// A window that begins in 2023 or 2024 has a 29 February.
	leap := degreeday.WindowAt(starts, pipeline.DayOf(2024, time.February, 29))
	y.leapSlot = int(pipeline.DayOf(2024, time.February, 29) - leap.First)
	for s := range slots {
		_, m, _ := (leap.First + pipeline.Day(s)).Date()
		y.months[s] = int8(m - 1)
	}
	for w := degreeday.WindowAt(starts, r.First()); w.First <= r.Last(); w = degreeday.WindowAt(starts, w.Last+1) {
		y.all = append(y.all, r.lay(w, y.leapSlot))
	}
	return y
}

// slotOf returns the slot of a day of a window; the day before its first is -1.
func (y *years) slotOf(w degreeday.Window, d pipeline.Day) int {
	i := int(d - w.First)
	if w.Days() < slots && i >= y.leapSlot {
		i++
	}
	return i
}

func (r *Record) lay(w degreeday.Window, leapSlot int) year {
	y := year{window: w, lastMissing: [2]int{-1, -1}}
	y.number, _, _ = w.First.Date()
	common := w.Days() < slots
	for s := range slots {
		d := w.First + pipeline.Day(s)
		var known bool
		switch {
		case common && s == leapSlot:
			before, ok := r.mean(d - 1)
			after, ok2 := r.mean(d)
			y.meanC[s], known = (before+after)/2, ok && ok2
		case common && s > leapSlot:
			y.meanC[s], known = r.mean(d - 1)
		default:
			y.meanC[s], known = r.mean(d)
		}
		if !known {
			y.lastMissing[0] = s
			if s != leapSlot {
				y.lastMissing[1] = s
			}
		}
	}
	return y
}

// mean returns a day's mean; false if it is missing or outside the record.
func (r *Record) mean(d pipeline.Day) (float64, bool) {
	i := int(d - r.First())
	if i < 0 || i >= len(r.days) || r.days[i].Origin == pipeline.Missing {
		return 0, false
	}
	return r.days[i].MeanC, true
}
