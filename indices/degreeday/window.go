package degreeday

import (
	"fmt"

	"thawledger/pipeline"
)

// Window is the thaw or freeze year in which a season is sought, first and last
// day included: 365 or 366 days. Its first day is the season's key.
type Window struct{ First, Last pipeline.Day }

// WindowAt returns the window that contains d, of those that start each year on
// starts. A start on 29 February is on 1 March in other years.
func WindowAt(starts pipeline.MonthDay, d pipeline.Day) Window {
	year, _, _ := d.Date()
	if starts.In(year) > d {
		year--
	}
	return Window{First: starts.In(year), Last: starts.In(year+1) - 1}
}

// Days returns how many days the window has.
func (w Window) Days() int { return int(w.Last-w.First) + 1 }

// Contains reports whether d is in the window.
func (w Window) Contains(d pipeline.Day) bool { return w.First <= d && d <= w.Last }

// Label returns the usual name of the season in the window: 2031 for a thaw
// season of the northern hemisphere, 2031-32 for one that runs over a new year,
// as a freeze season does there and a thaw season in the southern hemisphere.
// The season is taken to be in the middle half of the window, which starts far
// from any low or high.
func (w Window) Label() string {
	quarter := pipeline.Day(w.Days() / 4)
	first, _, _ := (w.First + quarter).Date()
	last, _, _ := (w.Last - quarter).Date()
	if first == last {
		return fmt.Sprintf("%04d", first)
	}
	return fmt.Sprintf("%04d-%02d", first, last%100)
}
