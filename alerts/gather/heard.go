package gather

import (
	"slices"

	"thawledger/pipeline"
)

// rank orders states by how much they ask of whoever hears of them.
var rank = map[pipeline.State]int{
	pipeline.Within: 0, pipeline.Near: 1, pipeline.Expected: 2, pipeline.Unknown: 3, pipeline.Exceeded: 4, pipeline.FellShort: 4,
}

// Why a standing changes when what it rested on did: the words of
// thaw.standing_changes.
const (
	correction = "correction"
	replaced   = "design value replaced"
)

// Corrects says whether a change of state by one of these reasons takes
// something back rather than going on from it.
func Corrects(why string) bool { return why == correction || why == replaced }

// tells says whether somebody who wants to hear of some states is told that one
// he may have been told of has given way to another.
//
// The new state is told if it is among them. Otherwise what stood before is not
// left standing: a fall from a state among them is told, but for a return to
// within that came about of itself.
func tells(states []pipeline.State, before, after pipeline.State, corrected bool) bool {
	if slices.Contains(states, after) {
		return true
	}
	return slices.Contains(states, before) && rank[after] < rank[before] && (corrected || after != pipeline.Within)
}

// every is all states, in the order in which settings name them.
var every = []pipeline.State{pipeline.Exceeded, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.FellShort, pipeline.Within}

func wanted(h *pipeline.Hearing) []pipeline.State {
	if len(h.States) == 0 {
		return every
	}
	return h.States
}

// States returns the states of a surface that a recipient wants to hear of by a
// channel; none if the surface is not meant.
func States(r *pipeline.Recipient, channel string, site *pipeline.Site, surface string) (out []pipeline.State) {
	for i := range r.Hears {
		if h := &r.Hears[i]; slices.Contains(h.Channels, channel) && h.Of(site, surface) {
			out = append(out, wanted(h)...)
		}
	}
	return out
}

// Heard returns the channels by which a recipient hears of a change of a
// surface, in the order of the settings.
func Heard(r *pipeline.Recipient, site *pipeline.Site, surface string, before, after pipeline.State, why string) (channels []string) {
	for i := range r.Hears {
		h := &r.Hears[i]
		if !h.Of(site, surface) || !tells(wanted(h), before, after, Corrects(why)) {
			continue
		}
		for _, c := range h.Channels {
			if !slices.Contains(channels, c) {
				channels = append(channels, c)
			}
		}
	}
	return channels
}
