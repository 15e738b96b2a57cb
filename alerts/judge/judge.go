package judge

import "thawledger/pipeline"

// Design is what a season's index is held against.
type Design struct {
	CDays     float64 // degC.d, of the same kind, definition, base and place (air or surface) as the index
	NearShare float64 // share of CDays from which the index is near, above 0 and at most 1
	Direction pipeline.Direction
}

// Day is the lowest and highest possible index to date at the end of a day,
// degC.d. They are equal where no missing day leaves the index open.
type Day struct {
	Day       pipeline.Day
	Low, High float64
}

// Standing is how a season stands at its last day.
type Standing struct {
	State     pipeline.State
	Level     pipeline.Level
	Straddles bool // the design value lies above Low and at or below High

	Low, High float64 // index to date at the last day, degC.d

	// The first days on which the index was near, was at or past the design
	// value, and was so even at its lowest; nil if it never was.
	NearOn, ExceededOn, ConfirmedOn *pipeline.Day
}

// Season judges the days of one season, in order; over says that no day is to
// come. It panics if there are no days.
//
// The state is the first that is true of exceeded, unknown, near and within. An
// index to date never falls, so a day's level holds for all later days. Where
// missing days leave the index open its low bound decides the level, and
// unknown says that a crossing may be hidden: unknown never takes the place of
// exceeded.
//
// For the direction not_below the index to date is only a lower bound of the
// season's: the season is within as soon as even the lowest index has reached
// the design value, unknown until it is over, and has fallen short if even the
// highest has not reached it by then.
func Season(d Design, days []Day, over bool) Standing {
	if len(days) == 0 {
		panic("judge: a season without days")
	}
	last := days[len(days)-1]
	s := Standing{Low: last.Low, High: last.High, Straddles: last.Low < d.CDays && d.CDays <= last.High}
	if d.Direction == pipeline.NotBelow {
		s.Level = pipeline.LevelWithin
		switch {
		case last.Low >= d.CDays:
			s.State = pipeline.Within
		case !over || s.Straddles:
			s.State = pipeline.Unknown
		default:
			s.State = pipeline.FellShort
		}
		return s
	}
	s.NearOn = firstAt(days, d.NearShare*d.CDays)
	s.ConfirmedOn = firstAt(days, d.CDays)
	s.ExceededOn = s.ConfirmedOn
	switch {
	case s.ExceededOn != nil:
		s.State, s.Level = pipeline.Exceeded, pipeline.LevelExceeded
	case s.NearOn != nil:
		s.State, s.Level = pipeline.Near, pipeline.LevelNear
	default:
		s.State, s.Level = pipeline.Within, pipeline.LevelWithin
	}
	if s.State != pipeline.Exceeded && s.Straddles {
		s.State = pipeline.Unknown
	}
	return s
}

// firstAt returns the first day on which the low bound is at least cDays.
func firstAt(days []Day, cDays float64) *pipeline.Day {
	for i := range days {
		if days[i].Low >= cDays {
			return &days[i].Day
		}
	}
	return nil
}

// Told says whether a change of state within an open season is worth telling:
// always when a surface comes to stand above within, or open to doubt, or back;
// never what a not_below season passes through before its end.
func Told(direction pipeline.Direction, before, after pipeline.State) bool {
	if before == after {
		return false
	}
	if direction == pipeline.NotBelow {
		return after == pipeline.FellShort || before == pipeline.FellShort
	}
	return before != "" || after != pipeline.Within
}

// Replaced is why a state changes when another design value takes the place of
// the one that it was judged by.
const Replaced = "design value replaced"

// Why says in a word what brought a change of state about: before is nil for
// the first judgement of a season, progressed says that the season has gone on
// since. A level that falls, or that changes while the season has not gone on,
// was corrected.
func Why(before *Past, after Standing, progressed bool) string {
	switch {
	case before == nil:
		return "first judgement"
	case after.Straddles && !before.Straddles:
		return "gap"
	case before.Straddles && !after.Straddles:
		return "gap closed"
	case !progressed || rank[after.State] < rank[before.State]:
		return "correction"
	}
	return "progress"
}

// Past is what was known of a standing when it was last judged.
type Past struct {
	State     pipeline.State
	Straddles bool
}

var rank = map[pipeline.State]int{pipeline.Near: 1, pipeline.Exceeded: 2, pipeline.FellShort: 2}
