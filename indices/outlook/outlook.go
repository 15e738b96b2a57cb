package outlook

import (
	"errors"
	"fmt"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Which says how past years are taken.
type Which string

// The two sets of members.
const (
	Raw   Which = "raw"   // as they were
	Moved Which = "moved" // shifted by the trend between their year and this one
)

// LeastMembers is the number of members below which no outlook is made:
// judgement, no source.
const LeastMembers = 20

// ErrFewMembers says that too few past years are complete over the rest of the
// season.
var ErrFewMembers = errors.New("too few complete years")

// Outlook is what a season may come to, as seen at the end of a day.
type Outlook struct {
	Question Question
	Window   degreeday.Window
	Through  pipeline.Day // last day of this season that was used
	Which    Which
	Members  []int // years in which the members' thaw or freeze years begin

	// ToDate is the index to date, degC.d: a range where days of this season are
	// missing.
	ToDate degreeday.Bounds

	// low and high are made on this year's path with its missing days at their
	// lowest and highest counting mean; they are one where none is missing.
	low, high ensemble
}

// ensemble has the index to date of each member's joined path, degC.d, for every
// day of the window.
type ensemble struct {
	paths [][]float64
	ends  []float64 // last of each, sorted
}

// Open reports whether missing days of this season leave the outlook a range.
func (o *Outlook) Open() bool { return !o.ToDate.Known() || !same(o.low.ends, o.high.ends) }

// Outlook makes the outlook of the season that the day after through is in, from
// the days up to through and from past years; days of the record after through
// are not looked at. It fails with ErrFewMembers if fewer than LeastMembers past
// years are complete.
//
// It panics if the record does not reach through, or begins after the start of
// the season, or if the question has no meaning.
func (r *Record) Outlook(q Question, through pipeline.Day, which Which) (*Outlook, error) {
	q.check()
	if through < r.First() || through > r.Last() {
		panic(fmt.Sprintf("outlook: %s is outside the record", through))
	}
	w := degreeday.WindowAt(q.Starts, through+1)
	if w.First < r.First() {
		panic(fmt.Sprintf("outlook: the record begins on %s, after the start of the season on %s", r.First(), w.First))
	}
	ys := r.cut(q.Starts)
	j := join{question: q, years: ys, window: w, slot: ys.slotOf(w, through)}
	o := &Outlook{Question: q, Window: w, Through: through, Which: which}
	var trend slopes
	if which == Moved {
		trend = r.trend(w, false)
	}
	members := j.members(func(y *year) bool { return y.window.Last < w.First })
	if len(members) < LeastMembers {
		return nil, fmt.Errorf("%w: %d of the %d needed from %s on", ErrFewMembers, len(members), LeastMembers, through+1)
	}
	for _, m := range members {
		o.Members = append(o.Members, m.number)
	}
	open := j.begin(r, through)
	o.low, o.ToDate.Low = j.ensemble(members, trend, false)
	o.high, o.ToDate.High = o.low, o.ToDate.Low
	if open {
		o.high, o.ToDate.High = j.ensemble(members, trend, true)
	}
	return o, nil
}

// join joins past years to a season's path.
type join struct {
	question Question
	years    *years
	window   degreeday.Window
	slot     int // of the last day used; -1 before the season

	low, high []float64 // excesses of the whole window: this year's, then a member's
	track     degreeday.Track
	rest      []float64 // see end
}

// members returns the years that are complete over the rest of the window, of
// those that allowed lets through.
func (j *join) members(allowed func(*year) bool) []*year {
	var out []*year
	common := 0
	if j.window.Days() < slots {
		common = 1
	}
	for i := range j.years.all {
		y := &j.years.all[i]
		if y.lastMissing[common] <= j.slot && allowed(y) {
			out = append(out, y)
		}
	}
	return out
}

// begin lays this year's days up to through, and reports whether missing ones
// leave two paths.
func (j *join) begin(r *Record, through pipeline.Day) (open bool) {
	n := j.window.Days()
	j.low, j.high = resized(j.low, n), resized(j.high, n)
	for d := j.window.First; d <= through; d++ {
		i, m := int(d-j.window.First), &r.days[d-r.First()]
		if m.Origin != pipeline.Missing {
			j.low[i] = j.question.excess(m.MeanC)
			j.high[i] = j.low[i]
			continue
		}
		j.low[i], j.high[i] = j.question.excess(m.LowC), j.question.excess(m.HighC)
		if j.question.Kind == pipeline.Freeze {
			j.low[i], j.high[i] = j.high[i], j.low[i]
		}
		open = open || j.low[i] != j.high[i]
	}
	return open
}

func resized(s []float64, n int) []float64 {
	if cap(s) < n {
		return make([]float64, n)
	}
	return s[:n]
}

// used returns how many days of this year are used.
func (j *join) used() int {
	if j.window.Days() < slots && j.slot >= j.years.leapSlot {
		return j.slot
	}
	return j.slot + 1
}

// remaining puts a member's excesses of the days after those used into the end of
// excess.
func (j *join) remaining(excess []float64, member *year, trend *slopes) {
	number, _, _ := j.window.First.Date()
	apart := float64(number - member.number)
	var shift [12]float64
	for m := range shift {
		shift[m] = trend[m] * apart
	}
	n := j.window.Days()
	i := len(excess) - (n - j.used())
	for s := j.slot + 1; s < slots; s++ {
		if n < slots && s == j.years.leapSlot {
			continue
		}
		excess[i] = j.question.excess(member.meanC[s] + shift[j.years.months[s]])
		i++
	}
}

// index returns the index to date, by the question's definition, of a season's
// excesses.
func (j *join) index(excess []float64) []float64 {
	j.track.Rise(excess)
	if j.question.Definition == pipeline.Sum {
		return j.track.Sum
	}
	return j.track.ToDate
}

// path returns the index to date of this year's path joined with a member, for
// every day of the window. It is valid until the next call.
func (j *join) path(member *year, trend *slopes, high bool) []float64 {
	excess := j.low
	if high {
		excess = j.high
	}
	j.remaining(excess, member, trend)
	return j.index(excess)
}

// ensemble joins all members and returns the index to date too.
func (j *join) ensemble(members []*year, trend slopes, high bool) (e ensemble, toDate float64) {
	n := j.window.Days()
	flat := make([]float64, 0, len(members)*n)
	for _, m := range members {
		flat = append(flat, j.path(m, &trend, high)...)
		e.paths = append(e.paths, flat[len(flat)-n:])
		e.ends = append(e.ends, flat[len(flat)-1])
	}
	if used := j.used(); used > 0 {
		toDate = e.paths[0][used-1]
	}
	sorted(e.ends)
	return e, toDate
}
