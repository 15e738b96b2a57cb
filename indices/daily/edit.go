package daily

import (
	"cmp"
	"math"
	"slices"

	"thawledger/pipeline"
)

// Edit is a correction that a person has made to a station's readings. It never
// touches the readings themselves: it applies when daily values are made from
// them.
type Edit struct {
	Kind     pipeline.EditKind
	Variable pipeline.Variable // 0 for all
	Sensor   string            // "" for all; of a replacement, the sensor that it speaks for
	Feed     string            // "" for all
	FromS    int64             // starts of readings, s since 1970-01-01T00:00:00Z, half-open
	ToS      int64
	// Amount is what is put in the place of the value, or added to it, degC, or
	// added to the start of the span, s.
	Amount float64
}

func (e *Edit) concerns(r *Input) bool {
	return e.FromS <= r.StartS && r.StartS < e.ToS && (e.Variable == 0 || e.Variable == r.Variable) &&
		(e.Sensor == "" || e.Sensor == r.Sensor) && (e.Feed == "" || e.Feed == r.Feed)
}

// Reach returns how far edits may move a reading in time, in s.
func Reach(edits []Edit) int64 {
	var most int64
	for i := range edits {
		if edits[i].Kind == pipeline.EditShift {
			most = max(most, int64(math.Abs(edits[i].Amount)))
		}
	}
	return most
}

// Edited returns readings as edits leave them, in order of time. Each edit is
// held against the readings as they came, and those that concern one apply in
// the order given: an exclusion marks it wrong, so that it is not used and keeps
// out the same sensor's values of lower rank; an offset is added to the value, a
// shift to the time, and either marks it changed, unless its mark is worse. A
// replacement adds a value that covers a day, of a rank above all feeds; it names
// a variable and begins with the day.
func Edited(edits []Edit, in []Input) []Input {
	out := make([]Input, 0, len(in)+len(edits))
	for _, r := range in {
		edited := r
		for i := range edits {
			e := &edits[i]
			if !e.concerns(&r) {
				continue
			}
			switch e.Kind {
			case pipeline.EditExclude:
				edited.Quality = pipeline.QualityWrong
			case pipeline.EditOffset:
				edited.ValueC += e.Amount
				edited.Quality = MarkChanged(edited.Quality)
			case pipeline.EditShift:
				edited.StartS += int64(e.Amount)
				edited.Quality = MarkChanged(edited.Quality)
			}
		}
		out = append(out, edited)
	}
	for i := range edits {
		if e := &edits[i]; e.Kind == pipeline.EditReplace {
			out = append(out, Input{Feed: "edit", Rank: math.MaxInt, Sensor: e.Sensor, Variable: e.Variable, SpanS: dayS, StartS: e.FromS,
				ValueC: e.Amount, Quality: pipeline.QualityChanged})
		}
	}
	slices.SortStableFunc(out, func(a, b Input) int { return cmp.Compare(a.StartS, b.StartS) })
	return out
}

// MarkChanged returns the mark of a value that was good by q and has been changed:
// changed, unless q says worse.
func MarkChanged(q pipeline.Quality) pipeline.Quality {
	if q == pipeline.QualityWrong || q == pipeline.QualityMissing {
		return q
	}
	return worse(q, pipeline.QualityChanged)
}
