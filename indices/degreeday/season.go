package degreeday

import (
	"fmt"

	"thawledger/pipeline"
)

// Bounds are the lowest and the highest possible value of a number.
type Bounds struct{ Low, High float64 }

// Known reports whether the two are the same, so that no gap leaves the number open.
func (b Bounds) Known() bool { return b.Low == b.High }

// DayMean is a day's mean temperature in degC. An observed or filled day has
// MeanC, and LowC and HighC are equal to it; a missing day has no MeanC, and
// LowC and HighC are the lowest and the highest mean that are plausible.
//
// A filled day whose error is known has AboveC and BelowC: the expected excess
// above the base, and below it, which is more than the excess of its mean where
// the base is within reach of the error. The sum indices count these.
type DayMean struct {
	Day                pipeline.Day
	Origin             pipeline.Origin
	MeanC, LowC, HighC float64
	HasError           bool
	AboveC, BelowC     float64 // if HasError
}

// DayIndex is what the indices have come to at the end of a day, in degC.d.
type DayIndex struct {
	Day         pipeline.Day
	Running     Bounds // cumulative value less its lowest so far; falls again after the season
	CurveToDate Bounds // curve index to date: the largest Running so far; never falls
	Sum         Bounds // sum index to date; never falls
}

// Result is a season's index by one definition, to date while it is not over.
type Result struct {
	Index Bounds // degC.d

	// First and Last are the first and last day of the largest rise (by the sum:
	// of all days that count), if Began. With missing days they are those of the
	// lowest filling, whose index is Index.Low.
	First, Last pipeline.Day
	Began       bool

	NoSeason bool // the season is over, and no filling gives any index

	// EdgeProvisional: First or Last lies on the edge of the window, or the low
	// or the high that it marks has a missing day beside it.
	EdgeProvisional bool
	// OnsetProvisional: the season is not over and even the lowest filling has
	// not yet risen above 50 degC.d, or what Settle has learned from past seasons,
	// so that a relapse may move First. Curve only.
	OnsetProvisional bool
}

// onsetCDays is the rise after which an onset is taken to hold: common practice,
// no source.
const onsetCDays = 50

// Season is one thaw or freeze season.
type Season struct {
	Kind   pipeline.Kind
	Window Window
	Label  string

	Through    pipeline.Day // last day used
	Over       bool         // the record has reached the end of the window
	Days       []DayIndex   // from Window.First to Through
	Curve, Sum Result

	Observed, Interpolated, ByNeighbour, ByClimate, Missing int // days
	LongestGap                                              int // longest run of days not observed
}

// Complete reports whether the season is over and no day of it is missing.
func (s *Season) Complete() bool { return s.Over && s.Missing == 0 }

// Build works a season out. days are the daily means from w.First to recordEnd
// or w.Last, whichever is earlier, every day once; at least one.
//
// Both indices, and the running value, never fall when a day's excess rises. So
// filling all missing days with the lowest (freezing: highest) plausible mean
// gives the low bound, and with the highest (lowest) the high bound, exactly.
//
// Build panics if kind is unknown, if the days are not those said above, or if a
// temperature is not finite, beyond 1e6 degC, or a missing day's LowC is above
// its HighC.
func Build(kind pipeline.Kind, w Window, label string, baseC float64, days []DayMean, recordEnd pipeline.Day) Season {
	var s Season
	s.Build(kind, w, label, baseC, days, recordEnd)
	return s
}

// Build is the function Build, in the memory that s.Days has.
func (s *Season) Build(kind pipeline.Kind, w Window, label string, baseC float64, days []DayMean, recordEnd pipeline.Day) {
	check(kind, w, baseC, days, recordEnd)
	memory := s.Days
	if cap(memory) < len(days) {
		memory = make([]DayIndex, len(days))
	}
	*s = Season{
		Kind: kind, Window: w, Label: label, Days: memory[:len(days)],
		Through: days[len(days)-1].Day, Over: recordEnd >= w.Last,
	}
	low, high, gap := newRise(), rise{}, 0
	for i := range days {
		m := &days[i]
		switch m.Origin {
		case pipeline.Observed:
			s.Observed++
			gap = 0
		case pipeline.Interpolated:
			s.Interpolated++
			gap++
		case pipeline.ByNeighbour:
			s.ByNeighbour++
			gap++
		case pipeline.ByClimate:
			s.ByClimate++
			gap++
		case pipeline.Missing:
			if s.Missing == 0 {
				high = low // until here the two fillings are one
			}
			s.Missing++
			gap++
		}
		s.LongestGap = max(s.LongestGap, gap)
		lowX, highX := m.excess(kind, baseC)
		lowPos, highPos := max(lowX, 0), max(highX, 0)
		if m.HasError {
			lowPos = m.AboveC
			if kind == pipeline.Freeze {
				lowPos = m.BelowC
			}
			highPos = lowPos
		}
		low.step(lowX, lowPos)
		top := &low
		if s.Missing > 0 {
			high.step(highX, highPos)
			top = &high
		}
		d := &s.Days[i]
		d.Day = m.Day
		d.Running.Low, d.Running.High = low.running, top.running
		d.CurveToDate.Low, d.CurveToDate.High = low.toDate, top.toDate
		d.Sum.Low, d.Sum.High = low.sum, top.sum
	}
	last := &s.Days[len(s.Days)-1]
	s.Curve = s.result(days, last.CurveToDate, low.first, low.last)
	s.Curve.OnsetProvisional = !s.Over && low.toDate <= onsetCDays
	s.Sum = s.result(days, last.Sum, low.firstPos, low.lastPos)
}

// excess returns the lowest and the highest excess that a day may have.
func (m *DayMean) excess(kind pipeline.Kind, baseC float64) (low, high float64) {
	lowC, highC := m.MeanC, m.MeanC
	if m.Origin == pipeline.Missing {
		lowC, highC = m.LowC, m.HighC
	}
	if kind == pipeline.Freeze {
		return baseC - highC, baseC - lowC
	}
	return lowC - baseC, highC - baseC
}

// result puts an index together; first and last are places in days, -1 if none.
func (s *Season) result(days []DayMean, index Bounds, first, last int) Result {
	r := Result{Index: index, Began: first >= 0, NoSeason: s.Over && index.High == 0}
	if !r.Began {
		return r
	}
	r.First, r.Last = days[first].Day, days[last].Day
	missing := func(i int) bool { return 0 <= i && i < len(days) && days[i].Origin == pipeline.Missing }
	r.EdgeProvisional = r.First == s.Window.First || r.Last == s.Window.Last ||
		missing(first-1) || missing(first) || missing(last) || missing(last+1)
	return r
}

// check panics at a fault of the caller.
func check(kind pipeline.Kind, w Window, baseC float64, days []DayMean, recordEnd pipeline.Day) {
	if kind != pipeline.Thaw && kind != pipeline.Freeze {
		panic(fmt.Sprintf("degreeday: kind %q is neither thaw nor freeze", kind))
	}
	if !isTemperature(baseC) {
		panic(fmt.Sprintf("degreeday: base %v degC is not a temperature", baseC))
	}
	if want := int(min(w.Last, recordEnd)-w.First) + 1; want < 1 || len(days) != want {
		panic(fmt.Sprintf("degreeday: %d days for %s to %s with a record to %s; there must be %d, and at least one",
			len(days), w.First, w.Last, recordEnd, want))
	}
	for i := range days {
		m := &days[i]
		if want := w.First + pipeline.Day(i); m.Day != want {
			panic(fmt.Sprintf("degreeday: day %s in place of %s; days must be consecutive", m.Day, want))
		}
		switch m.Origin {
		case pipeline.Observed, pipeline.Interpolated, pipeline.ByNeighbour, pipeline.ByClimate:
			if !isTemperature(m.MeanC) {
				panic(fmt.Sprintf("degreeday: mean %v degC of %s is not a temperature", m.MeanC, m.Day))
			}
			if m.HasError && !(m.Origin.Filled() && isTemperature(m.AboveC) && isTemperature(m.BelowC) && m.AboveC >= 0 && m.BelowC >= 0) {
				panic(fmt.Sprintf("degreeday: expected excesses %v and %v degC of %s day %s", m.AboveC, m.BelowC, m.Origin, m.Day))
			}
		case pipeline.Missing:
			if m.HasError {
				panic(fmt.Sprintf("degreeday: missing day %s has the error of a filled one", m.Day))
			}
			if !isTemperature(m.LowC) || !isTemperature(m.HighC) || m.LowC > m.HighC {
				panic(fmt.Sprintf("degreeday: %v to %v degC of missing day %s are no bounds", m.LowC, m.HighC, m.Day))
			}
		default:
			panic(fmt.Sprintf("degreeday: origin %d of %s is unknown", m.Origin, m.Day))
		}
	}
}
