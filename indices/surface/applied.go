package surface

import (
	"fmt"
	"strings"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Index is a surface index in degC.d, by the low, the central and the high n.
// Each has bounds where the air index has: where days are missing.
type Index struct{ Low, Central, High degreeday.Bounds }

// Bounds returns the lowest and the highest surface index that the range of n
// and the missing days leave possible.
func (x Index) Bounds() degreeday.Bounds { return degreeday.Bounds{Low: x.Low.Low, High: x.High.High} }

// Note is a set of things to be said beside a surface index.
type Note uint8

// What there may be to say.
const (
	PartOfSeason    Note = 1 << iota // the season is not over: n is a figure of a whole season
	SplitSeason                      // more than one n holds in the season
	OtherDefinition                  // n is a ratio of indices of another definition
	NotStated                        // the source of n does not say which definition
	NotComplete                      // days are missing: the air index has bounds
)

// notes has the texts, indexed by place of the bit.
var notes = [...]string{
	"the n-factor is a figure of a whole season; on part of one it is an approximation",
	"more than one n-factor holds in this season; the index is split at the date",
	"the n-factor is a ratio of indices of another definition",
	"the source of the n-factor does not state the definition of its indices",
	"days are missing: the air index has bounds",
}

// Has reports whether all of o are in n.
func (n Note) Has(o Note) bool { return n&o == o }

// String returns the texts, with semicolons between.
func (n Note) String() string {
	var s []string
	for i, text := range notes {
		if n>>i&1 == 1 {
			s = append(s, text)
		}
	}
	return strings.Join(s, "; ")
}

// Result is a season's surface index to date.
type Result struct {
	Kind       pipeline.Kind
	Definition pipeline.Definition
	Through    pipeline.Day // last day of the air index
	Index      Index
	NoSeason   bool // the air has none; n says nothing of the surface then
	Notes      Note
}

// Day is a surface index to date at the end of a day.
type Day struct {
	Day   pipeline.Day
	Index Index
}

// Applied returns the surface index of an air season, by its curve or its sum
// index: I_s = n I_a (TM 5-852-4, 1983). Factors of the other kind are passed
// over; without one of the season's own kind at its start the error wraps
// ErrNoFactor.
//
// Where an n gives way to another within the season, the air index to date is
// split at the date: I_s = sum of n_k (I_a to the end of piece k - I_a to its
// start). The air index to date never falls, so the surface index never does;
// what a false start in spring had gathered stays with the n that held then. The
// bounds hold for every filling of missing days.
func Applied(season *degreeday.Season, by pipeline.Definition, factors []Factor) (Result, error) {
	a, err := newApplier(season, by, factors)
	if err != nil {
		return Result{}, err
	}
	r := Result{Kind: season.Kind, Definition: by, Through: season.Through, Notes: a.notes(season)}
	result := &season.Curve
	if by == pipeline.Sum {
		result = &season.Sum
	}
	r.NoSeason = result.NoSeason
	for i := range season.Days {
		a.step(&season.Days[i])
	}
	r.Index = a.index()
	return r, nil
}

// Days is Applied for each day of the season.
func Days(season *degreeday.Season, by pipeline.Definition, factors []Factor) ([]Day, error) {
	a, err := newApplier(season, by, factors)
	if err != nil {
		return nil, err
	}
	out := make([]Day, len(season.Days))
	for i := range season.Days {
		a.step(&season.Days[i])
		out[i] = Day{season.Days[i].Day, a.index()}
	}
	return out, nil
}

// applier adds up the pieces of a season.
type applier struct {
	by     pipeline.Definition
	pieces []piece
	holds  int // pieces that have taken effect

	air, start     degreeday.Bounds // air index: to date, and when the piece that holds took over
	most, mostThen float64          // highest sum index: to date, and then
	low, mid, top  track            // by the low, the central and the high n
}

func newApplier(season *degreeday.Season, by pipeline.Definition, factors []Factor) (*applier, error) {
	if by != pipeline.Curve && by != pipeline.Sum {
		return nil, fmt.Errorf("an n-factor applies to a curve or a sum index, not to %q", by)
	}
	pieces, err := inForce(season.Kind, season.Window.First, season.Window.Last, factors)
	if err != nil {
		return nil, err
	}
	a := &applier{by: by, pieces: pieces, holds: 1}
	a.hold()
	return a, nil
}

// step takes a day's air index.
func (a *applier) step(d *degreeday.DayIndex) {
	if a.holds < len(a.pieces) && a.pieces[a.holds].from <= d.Day {
		a.holds++
		a.hold()
	}
	a.air, a.most = d.CurveToDate, d.Sum.High
	if a.by == pipeline.Sum {
		a.air = d.Sum
	}
}

// hold lets the latest piece take over.
func (a *applier) hold() {
	f := a.pieces[a.holds-1].Factor
	x := a.index()
	a.low.takeOver(x.Low, f.Low, a.air)
	a.mid.takeOver(x.Central, f.Central, a.air)
	a.top.takeOver(x.High, f.High, a.air)
	a.start, a.mostThen = a.air, a.most
}

// index returns the surface index to date. With a greater n it is no smaller,
// which narrows the bounds by one n with those by another.
func (a *applier) index() Index {
	x := Index{Low: a.bounds(&a.low), Central: a.bounds(&a.mid), High: a.bounds(&a.top)}
	x.Central.Low = max(x.Central.Low, x.Low.Low)
	x.High.Low = max(x.High.Low, x.Central.Low)
	x.Central.High = min(x.Central.High, x.High.High)
	x.Low.High = min(x.Low.High, x.Central.High)
	return x
}

// track is a surface index by one of the three n.
type track struct {
	n    float64          // that holds
	done degreeday.Bounds // surface index when it took over
	// apart is what the index has more than n times the air index to date: the
	// sum of (n_k - n_k+1) I_a at each change.
	apart degreeday.Bounds
}

// takeOver lets another n hold.
func (t *track) takeOver(done degreeday.Bounds, n float64, air degreeday.Bounds) {
	low, high := air.Low, air.High
	if t.n < n {
		low, high = high, low
	}
	t.apart.Low += float64((t.n - n) * low)
	t.apart.High += float64((t.n - n) * high)
	t.n, t.done = n, done
}

// bounds returns the surface index to date by one of the three n. Where no day
// before the change is missing, or by the sum index, whose days add up singly,
// the lowest and the highest filling of missing days give the bounds. A curve
// index that was open at the change may have grown since by less than its low
// bound did, or by more than its high bound; not by more than the sum index.
// Products are rounded before sums, so that all machines give the same bits.
func (a *applier) bounds(t *track) degreeday.Bounds {
	if a.by == pipeline.Sum || a.start.Known() {
		return degreeday.Bounds{
			Low:  t.done.Low + float64(t.n*(a.air.Low-a.start.Low)),
			High: t.done.High + float64(t.n*(a.air.High-a.start.High)),
		}
	}
	least := max(0, a.air.Low-a.start.High)
	most := min(a.air.High-a.start.Low, a.most-a.mostThen)
	low := max(t.done.Low+float64(t.n*least), t.apart.Low+float64(t.n*a.air.Low))
	high := min(t.done.High+float64(t.n*most), t.apart.High+float64(t.n*a.air.High))
	return degreeday.Bounds{Low: low, High: max(low, high)}
}

// notes says what is to be said of the season as a whole.
func (a *applier) notes(season *degreeday.Season) Note {
	var n Note
	if !season.Over {
		n |= PartOfSeason
	}
	if season.Missing > 0 {
		n |= NotComplete
	}
	inUse := 0
	for _, p := range a.pieces {
		if p.from > season.Through {
			break
		}
		inUse++
		switch p.Definition {
		case "", pipeline.NotStated:
			n |= NotStated
		case a.by:
		default:
			n |= OtherDefinition
		}
	}
	if inUse > 1 {
		n |= SplitSeason
	}
	return n
}
