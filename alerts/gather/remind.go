package gather

import (
	"maps"
	"slices"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// standing returns the part of what was told that says what still stands: the
// notices since the standing came to its state of now. It is empty if something
// else was told last.
func standing(told []Told, now pipeline.State) []Told {
	from := len(told)
	for from > 0 && told[from-1].State == now {
		from--
	}
	return told[from:]
}

func seen(told []Told) bool {
	return slices.ContainsFunc(told, func(t Told) bool { return t.Seen })
}

// Remind returns a line for each exceedance that the recipient was told of, that
// still stands, that nobody has marked as seen and that was last told of
// RemindEvery ago or longer. If there is one that long ago, those that would
// follow within the time for gathering go with it. busy are standings that the
// same message tells of anyway.
func Remind(r *pipeline.Recipient, told map[string][]Told, now map[string]pipeline.State, busy []Line, at time.Time) (lines []Line) {
	if r.RemindEvery == 0 || AfterQuiet(r.Quiet, r.Zone, at).After(at) {
		return nil
	}
	due := false
	for _, about := range slices.Sorted(maps.Keys(told)) {
		still := standing(told[about], pipeline.Exceeded)
		if now[about] != pipeline.Exceeded || len(still) == 0 || seen(still) ||
			slices.ContainsFunc(busy, func(l Line) bool { return l.About == about }) {
			continue
		}
		since := at.Sub(still[len(still)-1].At)
		if since < r.RemindEvery-r.GatherFor {
			continue
		}
		due = due || since >= r.RemindEvery
		lines = append(lines, Line{About: about, Kind: delivery.Reminder, From: pipeline.Exceeded, To: pipeline.Exceeded, Earlier: sinceWithin(told[about])})
	}
	if !due && len(busy) == 0 {
		return nil
	}
	return lines
}

// HandOn returns the standings that somebody else is to be told of: exceeded or
// fallen short, told of NextAfter ago or longer, still so, and not marked as
// seen. It returns the same again until that changes: whoever hands on does so
// once.
func HandOn(r *pipeline.Recipient, told map[string][]Told, now map[string]pipeline.State, at time.Time) (abouts []string) {
	if r.Next == "" {
		return nil
	}
	for _, about := range slices.Sorted(maps.Keys(told)) {
		stands := now[about]
		if stands != pipeline.Exceeded && stands != pipeline.FellShort {
			continue
		}
		still := standing(told[about], stands)
		if len(still) > 0 && !seen(still) && at.Sub(still[0].At) >= r.NextAfter {
			abouts = append(abouts, about)
		}
	}
	return abouts
}
