package outlook

import (
	"slices"
	"time"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// LeastEarlier is the number of members, and of seasons in the climatology, from
// which a hindcast is made. It is below LeastMembers so that a record of thirty
// years can be judged at all: what ten members are worth is rather less than what
// twenty are, so that this errs on the side of saying nothing. Judgement, no
// source.
const LeastEarlier = 10

// LeastYears is the number of seasons below which scores have no intervals and
// nothing counts as skill: judgement, no source.
const LeastYears = 10

// Information says which years an outlook was made from.
type Information string

// Earlier is what was to be had on the day. Others leaves out the season alone,
// and flatters: in a warming record the years after are the better members.
const (
	Earlier Information = "earlier" // years before the season only
	Others  Information = "others"  // all years but the season's own
)

// HindcastOptions say how a hindcast is made. The zero value will do.
type HindcastOptions struct {
	FromYear   int       // year in which the first season that is scored begins; 0: the first with enough earlier ones
	Thresholds []float64 // degC.d, for Brier scores; see Hindcast.Thresholds
	Resamples  int       // of the intervals; 0: 1000
	Seed       uint64    // of the intervals
}

// eitherSide is how many seasons must lie on either side of a threshold that is
// scored: judgement, no source.
const eitherSide = 3

// Hindcast is what outlooks of past seasons were worth.
type Hindcast struct {
	Question Question
	// Thresholds of the Brier scores, degC.d: of those given the ones that at
	// least three seasons of the record came to and three did not, since nothing
	// can be learnt from what never or always happens; if none is left, the
	// quartiles and the 90 % of the record's seasons, and FromRecord is true.
	Thresholds []float64
	FromRecord bool
	Seasons    int     // seasons of the record whose end index is known
	Scores     []Score // by information, set, and lead from high to low

	scored map[key]int // places in Scores
}

type key struct {
	information Information
	which       Which
	lead        int
}

// Score returns the score of a lead; false if no season could be scored.
func (h *Hindcast) Score(i Information, w Which, leadMonth int) (Score, bool) {
	at, ok := h.scored[key{i, w, leadMonth}]
	if !ok {
		return Score{}, false
	}
	return h.Scores[at], true
}

// Better says which set is used: the one with the lower mean CRPS over all
// outlooks from earlier years, at all leads together, so that it does not change
// within a season. Raw if nothing could be scored.
func (h *Hindcast) Better() Which {
	var raw, moved float64
	for i := range h.Scores {
		s := &h.Scores[i]
		switch {
		case s.Information != Earlier:
		case s.Which == Raw:
			raw += float64(s.CRPS * float64(s.N))
		default:
			moved += float64(s.CRPS * float64(s.N))
		}
	}
	if moved < raw {
		return Moved
	}
	return Raw
}

// Skilful reports whether outlooks at a lead may be announced: from earlier years
// only, with the better set, over at least LeastYears seasons, the CRPS beats that
// of the climatology, the lower end of the interval of its skill being above zero.
func (h *Hindcast) Skilful(leadMonth int) bool {
	s, ok := h.Score(Earlier, h.Better(), leadMonth)
	return ok && s.Skill.OK && s.Years >= LeastYears && s.Skill.Low > 0
}

// LeadMonth returns the lead of an outlook that is issued on the day after
// through: the number of calendar months from that of the issue to that of the
// window's end. It runs from 12, before the season, to 0.
func LeadMonth(w degreeday.Window, through pipeline.Day) int {
	y, m, _ := (through + 1).Date()
	ly, lm, _ := w.Last.Date()
	return 12*(ly-y) + int(lm) - int(m)
}

// IssuedThrough returns the last days used by the outlooks of a hindcast: those
// issued on the first day of the window, on the first of each month and on the
// sixteenth.
func IssuedThrough(w degreeday.Window) []pipeline.Day {
	out := []pipeline.Day{w.First - 1}
	y, m, _ := w.First.Date()
	for i := range 14 {
		for _, d := range []int{1, 16} {
			if through := pipeline.DayOf(y, m+time.Month(i), d) - 1; through >= w.First && through < w.Last {
				out = append(out, through)
			}
		}
	}
	return out
}

// Hindcast makes outlooks of the record's past seasons whose end index is known
// as they could have been made, on days from before each season to its end, and
// scores them. Where missing days of a season leave its outlook open it is not
// scored. A day that was filled from the days after it is not used as the last.
func (r *Record) Hindcast(q Question, o HindcastOptions) *Hindcast {
	q.check()
	ys := r.cut(q.Starts)
	ends := r.ends(q, ys)
	h := &Hindcast{Question: q, scored: map[key]int{}}
	known := make([]float64, 0, len(ends))
	for i := range ends {
		if ends[i].known {
			known = append(known, ends[i].index)
		}
	}
	h.Seasons = len(known)
	if len(known) == 0 {
		return h
	}
	slices.Sort(known)
	for _, threshold := range o.Thresholds {
		if below, _ := slices.BinarySearch(known, threshold); min(below, len(known)-below) >= eitherSide {
			h.Thresholds = append(h.Thresholds, threshold)
		}
	}
	if h.FromRecord = len(h.Thresholds) == 0; h.FromRecord {
		for _, share := range []float64{0.25, 0.5, 0.75, 0.9} {
			h.Thresholds = append(h.Thresholds, Quantile(known, share))
		}
	}
	all := map[key]*tally{}
	for i := range ys.all {
		if ends[i].known && ends[i].number >= o.FromYear {
			r.score(q, ys, ends, i, h.Thresholds, all)
		}
	}
	h.gather(all, o)
	return h
}

// end is a season's index at its end, degC.d.
type end struct {
	number int // year in which it begins
	index  float64
	known  bool // no missing day leaves it open
}

// ends returns the end index of each year of the record.
func (r *Record) ends(q Question, ys *years) []end {
	out := make([]end, len(ys.all))
	for i := range ys.all {
		y := &ys.all[i]
		out[i].number = y.number
		if y.window.First < r.First() || y.window.Last > r.Last() {
			continue
		}
		j := join{question: q, years: ys, window: y.window, slot: slots - 1}
		open := j.begin(r, y.window.Last)
		out[i].index, out[i].known = j.last(false), true
		if open {
			out[i].known = j.last(true) == out[i].index
		}
	}
	return out
}

// last returns the end index of a path that is whole.
func (j *join) last(high bool) float64 {
	path := j.path(&year{}, &slopes{}, high)
	return path[len(path)-1]
}

// score adds the outlooks of one season, from both kinds of information and of
// both sets, to the tallies of their leads.
func (r *Record) score(q Question, ys *years, ends []end, at int, thresholds []float64, all map[key]*tally) {
	y := &ys.all[at]
	for _, info := range []Information{Earlier, Others} {
		allowed := func(o *year) bool {
			return o.window.Last < y.window.First || info == Others && o.window.First > y.window.Last
		}
		raw, moved := climatology(ys, ends, at, allowed)
		if len(raw) < LeastEarlier {
			continue
		}
		trend := r.trend(y.window, info == Others)
		for _, issued := range IssuedThrough(y.window) {
			through := issued
			for through >= y.window.First && r.filledAfter(through) {
				through--
			}
			j := join{question: q, years: ys, window: y.window, slot: ys.slotOf(y.window, through)}
			members := j.members(allowed)
			if len(members) < LeastEarlier {
				continue
			}
			open := j.begin(r, through)
			for _, set := range []struct {
				which Which
				trend *slopes
			}{{Raw, &slopes{}}, {Moved, &trend}} {
				values, ok := j.ends(members, set.trend, open)
				if !ok {
					continue
				}
				k := key{info, set.which, LeadMonth(y.window, issued)}
				if all[k] == nil {
					all[k] = &tally{thresholds: thresholds}
				}
				all[k].add(y.number, values, raw, moved, ends[at].index)
			}
		}
	}
}

// filledAfter reports whether a day was filled from the days beside it, and so
// was not known at its end.
func (r *Record) filledAfter(d pipeline.Day) bool {
	i := int(d - r.First())
	return i >= 0 && i < len(r.days) && r.days[i].Origin == pipeline.Interpolated
}

// ends returns the end indices of all members, sorted; false if missing days
// leave any open.
func (j *join) ends(members []*year, trend *slopes, open bool) ([]float64, bool) {
	out := make([]float64, len(members))
	begun := [2][2]float64{j.begun(j.low)}
	if open {
		begun[1] = j.begun(j.high)
	}
	for i, m := range members {
		j.rest = resized(j.rest, 2+j.window.Days()-j.used())
		j.remaining(j.rest, m, trend)
		out[i] = j.end(begun[0])
		if open && j.end(begun[1]) != out[i] {
			return nil, false
		}
	}
	return sorted(out), true
}

// begun returns two excesses that leave the index where this year's days so far
// leave it: up to the index to date, and from there down to where the curve is
// now. An outlook's hundreds of paths need not begin with the same hundreds of
// days again.
func (j *join) begun(excess []float64) [2]float64 {
	used := j.used()
	if used == 0 {
		return [2]float64{}
	}
	j.track.Rise(excess[:used])
	if j.question.Definition == pipeline.Sum {
		return [2]float64{j.track.Sum[used-1]}
	}
	up := j.track.ToDate[used-1]
	return [2]float64{up, j.track.Running[used-1] - up}
}

// end returns the end index of what has begun and of the member in j.rest.
func (j *join) end(begun [2]float64) float64 {
	j.rest[0], j.rest[1] = begun[0], begun[1]
	path := j.index(j.rest)
	return path[len(path)-1]
}

// climatology returns the known end indices of the allowed seasons, sorted: as
// they were, and moved to the season's year by their Theil-Sen slope, zero at
// least.
func climatology(ys *years, ends []end, at int, allowed func(*year) bool) (raw, moved []float64) {
	var number []float64
	for i := range ends {
		if ends[i].known && allowed(&ys.all[i]) {
			raw, number = append(raw, ends[i].index), append(number, float64(ends[i].number))
		}
	}
	slope := theilSen(number, raw)
	moved = make([]float64, len(raw))
	for i := range raw {
		moved[i] = max(0, raw[i]+float64(slope*(float64(ends[at].number)-number[i])))
	}
	return sorted(raw), sorted(moved)
}
