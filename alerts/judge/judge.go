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

// Outlook is what is known of the rest of a season.
type Outlook struct {
	// Low and High are the chance that the season ends on the wrong side of the
	// design value; they differ where missing days leave it open.
	Low, High float64
	Skilful   bool // outlooks of past seasons have shown skill at this lead
}

// ExpectedShare is the chance from which a season is expected to end on the
// wrong side, and steadyShare that below which it is expected to no longer
// (common practice, no source): a chance about the limit does not come and go.
const (
	ExpectedShare = 0.5
	steadyShare   = 0.4
)

// expected says whether the season is expected to end on the wrong side, by the
// lowest chance; was, whether it has been until now.
func (o *Outlook) expected(was bool) bool {
	return o != nil && o.Skilful && (o.Low >= ExpectedShare || was && o.Low >= steadyShare)
}

// Standing is how a season stands at its last day.
type Standing struct {
	State     pipeline.State
	Level     pipeline.Level
	Straddles bool // the design value lies above Low and at or below High
	Expected  bool // to end on the wrong side, by an outlook with skill

	Low, High float64 // index to date at the last day, degC.d

	// The first days on which the index was near, was at or past the design
	// value, and was so even at its lowest; nil if it never was.
	NearOn, ExceededOn, ConfirmedOn *pipeline.Day
}

// Season judges the days of one season, in order; over says that no day is to
// come. It panics if there are no days.
//
// The state is the first that is true of exceeded, unknown, expected, near and
// within; outlook may be nil, and was says whether the season has been expected
// to end on the wrong side until now. An
// index to date never falls, so a day's level holds for all later days. Where
// missing days leave the index open its low bound decides the level, and
// unknown says that a crossing may be hidden: unknown never takes the place of
// exceeded.
//
// For the direction not_below the index to date is only a lower bound of the
// season's: the season is within as soon as even the lowest index has reached
// the design value, expected (to fall short) or unknown until it is over, and has
// fallen short if even the highest has not reached it by then.
func Season(d Design, days []Day, over bool, outlook *Outlook, was bool) Standing {
	if len(days) == 0 {
		panic("judge: a season without days")
	}
	last := days[len(days)-1]
	s := Standing{Low: last.Low, High: last.High, Straddles: last.Low < d.CDays && d.CDays <= last.High}
	if d.Direction == pipeline.NotBelow {
		s.Level = pipeline.LevelWithin
		s.Expected = !over && last.Low < d.CDays && outlook.expected(was)
		switch {
		case last.Low >= d.CDays:
			s.State = pipeline.Within
		case s.Expected:
			s.State = pipeline.Expected
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
	s.Expected = !over && s.State != pipeline.Exceeded && outlook.expected(was)
	switch {
	case s.State == pipeline.Exceeded:
	case s.Straddles:
		s.State = pipeline.Unknown
	case s.Expected:
		s.State = pipeline.Expected
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
		return after == pipeline.FellShort || before == pipeline.FellShort || after == pipeline.Expected || before == pipeline.Expected
	}
	return before != "" || after != pipeline.Within
}

// Replaced is why a state changes when another design value takes the place of
// the one that it was judged by.
const Replaced = "design value replaced"

// SeasonOver is why a season that was expected to end on the wrong side is so no
// longer once it has ended.
const SeasonOver = "season over"

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
	case before.Expected != after.Expected && before.Level == after.Level:
		return "outlook"
	case !progressed || rank[after.State] < rank[before.State]:
		return "correction"
	}
	return "progress"
}

// Past is what was known of a standing when it was last judged.
type Past struct {
	State     pipeline.State
	Level     pipeline.Level
	Straddles bool
	Expected  bool
}

var rank = map[pipeline.State]int{pipeline.Near: 1, pipeline.Exceeded: 2, pipeline.FellShort: 2}
