package filling

import (
	"fmt"
	"math/rand/v2"
	"slices"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Trial says how Experiment is to be done.
type Trial struct {
	Kind    pipeline.Kind
	BaseC   float64
	Starts  pipeline.MonthDay // first day of the season windows
	Options Options
	Blocks  []int // lengths of the gaps to be made, days
	Repeats int   // gaps of each length in each part of the year
	Seed    uint64
}

// Part is a part of the year, as the record's own normals have it.
type Part string

// The parts. Shoulders are at most 25 days to either side of the day on which the
// normals rise above, or fall below, the base for the season.
const (
	Winter Part = "winter"
	Spring Part = "spring shoulder"
	Summer Part = "summer"
	Autumn Part = "autumn shoulder"
)

// Parts lists the parts in their order.
var Parts = []Part{Winter, Spring, Summer, Autumn}

// shoulderDays is half the length of a shoulder: judgement, no source.
const shoulderDays = 25

// leastObserved is the share of a season's days that must have been observed for
// it to be used: days that are missing from the first are on a straight line, in
// the true and in the filled season alike, and are never among those removed.
const leastObserved = 0.8

// perRepeat is about how many days are removed at a time, in as many gaps as that
// makes; a longer gap is removed alone.
const perRepeat = 10

// A season counts as touched if either its error or its standard error comes to
// this much, degC.d: half of what indices are shown to.
const touchedCDays = 0.05

// Cell is how one rung did with gaps of one length in one part of the year, by
// one definition. Errors are index with filled days less true index, degC.d.
type Cell struct {
	Rung       Rung
	Part       Part
	Block      int // length of gaps, days
	Definition pipeline.Definition

	Repeats   int // in which the rung could fill all days removed
	Untouched int // of these: neither error nor standard error; not counted below
	Within    int // error within 2 standard errors
	// Separate is how many of the rest can be called independent at most: gaps of
	// one season overlap.
	Separate            int
	CoverLow, CoverHigh float64 // 95 % interval of the share within, of Separate trials

	BiasC, RMSEC float64 // mean error; root mean square error
	SEC          float64 // root mean square of the standard errors
	WidthC       float64 // mean width of +-2 standard errors
}

// Tried is how many repeats count.
func (c *Cell) Tried() int { return c.Repeats - c.Untouched }

// Cover is the share of errors within 2 standard errors; 0 if none was tried.
func (c *Cell) Cover() float64 {
	if c.Tried() == 0 {
		return 0
	}
	return float64(c.Within) / float64(c.Tried())
}

// Weighs reports whether the cell can be judged: 20 tries, and errors that come to
// 1 degC.d, below which nobody would ask.
func (c *Cell) Weighs() bool { return c.Tried() >= 20 && max(c.SEC, c.RMSEC) >= 1 }

// Outside reports whether the share within 2 standard errors, 95 % for normal
// errors, is not from 90 to 98 %.
func (c *Cell) Outside() bool { return c.Cover() < 0.9 || c.Cover() > 0.98 }

// SurelyOutside reports whether even the interval of that share is all outside.
func (c *Cell) SurelyOutside() bool { return c.CoverHigh < 0.9 || c.CoverLow > 0.98 }

// BiasShare is the mean error in units of the standard error; 0 if there is none.
func (c *Cell) BiasShare() float64 {
	if c.SEC == 0 {
		return 0
	}
	return c.BiasC / c.SEC
}

// Outcome is what an experiment found.
type Outcome struct {
	Seasons []string // labels of those used
	Removed int      // days removed, over all repeats
	Cells   []Cell   // by definition, part, block and rung
}

// Experiment removes observed days from seasons that are nearly whole, fills them
// by each rung, and compares index and standard error with the season's index as
// it was. The models have been fitted without the season that is tried. Seasons
// take turns, and gaps lie at random in their part of the year, whole: their
// middle is in it.
//
// It panics as Fit does, and if the trial makes no sense.
func Experiment(target []Point, neighbours []Neighbour, t Trial) Outcome {
	if t.Repeats < 1 || slices.ContainsFunc(t.Blocks, func(n int) bool { return n < 1 || n > 90 }) {
		panic(fmt.Sprintf("filling: %d repeats of gaps of %v days; at least 1, gaps of 1 to 90", t.Repeats, t.Blocks))
	}
	seasons := trialSeasons(target, t)
	out := Outcome{}
	for i := range seasons {
		s := &seasons[i]
		out.Seasons = append(out.Seasons, s.window.Label())
		without := slices.DeleteFunc(slices.Clone(target), func(p Point) bool { return s.window.Contains(p.Day) })
		s.model = Fit(without, neighbours, t.Options)
		s.neighbours = neighbours
		s.truth = s.model.IndexError(t.Kind, t.BaseC, s.window.First, s.meanC, nil)
	}
	if len(seasons) == 0 {
		return out
	}
	parts := partsOf(target, t)
	random := rand.New(rand.NewPCG(t.Seed, 0x7468617765642121))
	tallies := map[cellKey]*tally{}
	for _, part := range Parts {
		for _, block := range t.Blocks {
			for n := range t.Repeats {
				s := &seasons[n%len(seasons)]
				removed := s.remove(random, parts, part, block)
				out.Removed += len(removed)
				for _, rung := range Rungs {
					if len(removed) > 0 {
						s.try(t, tallies, cellKey{rung, part, block, pipeline.Curve}, removed)
					}
				}
			}
		}
	}
	for _, definition := range []pipeline.Definition{pipeline.Curve, pipeline.Sum} {
		for _, part := range Parts {
			for _, block := range t.Blocks {
				for _, rung := range Rungs {
					if k := (cellKey{rung, part, block, definition}); tallies[k] != nil {
						out.Cells = append(out.Cells, tallies[k].cell(k, parts, len(seasons)))
					}
				}
			}
		}
	}
	return out
}

// trialSeason is a season to be tried.
type trialSeason struct {
	window     degreeday.Window
	meanC      []float64
	observed   []bool
	model      *Model // fitted without it
	neighbours []Neighbour
	truth      SeasonError
}

// trialSeasons finds the seasons with enough observed days, and completes them.
func trialSeasons(target []Point, t Trial) []trialSeason {
	var out []trialSeason
	for i := 0; i < len(target); {
		s := trialSeason{window: degreeday.WindowAt(t.Starts, target[i].Day)}
		n := s.window.Days()
		s.meanC, s.observed = make([]float64, n), make([]bool, n)
		seen, whole := 0, true
		for k := range n {
			d := s.window.First + pipeline.Day(k)
			j, is := at(target, d)
			switch {
			case is:
				s.meanC[k], s.observed[k] = target[j].MeanC, true
				seen++
			case j == 0 || j == len(target):
				whole = false
			default:
				s.meanC[k] = onLine(target[j-1], target[j], d)
			}
		}
		if whole && float64(seen) >= leastObserved*float64(n) {
			out = append(out, s)
		}
		i, _ = at(target, s.window.Last+1)
	}
	return out
}

// partsOf returns the part of the year of each place in a season window, by the
// rise of the record's normals. A window has its last day twice in a common year.
func partsOf(target []Point, t Trial) [places]Part {
	var raw sums
	for _, c := range commonDays(target, nil, true) {
		raw.add(&c)
	}
	all := raw.around()
	sign, rise, inside, fall, outside := 1.0, Spring, Summer, Autumn, Winter
	if t.Kind == pipeline.Freeze {
		sign, rise, inside, fall, outside = -1, Autumn, Winter, Spring, Summer
	}
	start, _, _ := placeOf(t.Starts.In(2000))
	excess := make([]float64, places)
	for i := range excess {
		_, y, _ := all.normal((start+i)%places, nil)
		excess[i] = sign * (y - t.BaseC)
	}
	track := degreeday.Rise(excess)
	var out [places]Part
	for i := range out {
		half := min(shoulderDays, (track.Last-track.First+1)/4)
		part := outside
		switch {
		case track.First < 0:
		case track.First-half <= i && i < track.First+half:
			part = rise
		case track.Last-half < i && i <= track.Last+half:
			part = fall
		case track.First < i && i < track.Last:
			part = inside
		}
		out[(start+i)%places] = part
	}
	return out
}

// remove chooses days to be removed, in order of date: gaps of block days that
// were observed, as were the days beside them, in a part of the year. It returns
// none where there is no room.
func (s *trialSeason) remove(random *rand.Rand, parts [places]Part, part Part, block int) []pipeline.Day {
	taken := make([]bool, len(s.meanC)+2) // by place + 1, with the days beside a gap
	var out []pipeline.Day
	gaps := max(1, perRepeat/block)
	for range 200 {
		if gaps == 0 || len(s.meanC) < block+2 {
			break
		}
		first := 1 + random.IntN(len(s.meanC)-block-1)
		place, _, _ := placeOf(s.window.First + pipeline.Day(first+block/2))
		if parts[place] != part || slices.Contains(s.observed[first-1:first+block+1], false) ||
			slices.Contains(taken[first:first+block+2], true) {
			continue
		}
		for i := first; i < first+block; i++ {
			taken[i+1] = true
			out = append(out, s.window.First+pipeline.Day(i))
		}
		gaps--
	}
	slices.Sort(out)
	return out
}

type cellKey struct {
	rung       Rung
	part       Part
	block      int
	definition pipeline.Definition
}

// try fills removed days by one rung, if it can fill them all, and enters how the
// two indices came out.
func (s *trialSeason) try(t Trial, tallies map[cellKey]*tally, k cellKey, removed []pipeline.Day) {
	meanC := slices.Clone(s.meanC)
	fills := make([]Filled, 0, len(removed))
	for i, d := range removed {
		f := Filled{Day: d, Rung: k.rung, Gap: k.block, Place: 1}
		if i > 0 && removed[i-1] == d-1 {
			f.Place = fills[i-1].Place + 1
		}
		at := int(d - s.window.First)
		before, after := at-f.Place, at-f.Place+k.block+1
		ok := false
		switch k.rung {
		case ByLine:
			f.MeanC, f.SEC, ok = s.model.FillLine(Point{s.window.First + pipeline.Day(before), s.meanC[before]},
				Point{s.window.First + pipeline.Day(after), s.meanC[after]}, d)
		case ByNeighbour:
			f.MeanC, f.SEC, f.Neighbour, ok = s.model.Fill(d, meansOf(s.neighbours, d))
		case ByClimate:
			f.MeanC, f.SEC, ok = s.model.FillClimate(d)
		}
		if !ok {
			return
		}
		meanC[at] = f.MeanC
		fills = append(fills, f)
	}
	got := s.model.IndexError(t.Kind, t.BaseC, s.window.First, meanC, fills)
	for _, v := range []struct {
		definition pipeline.Definition
		error, se  float64
	}{{pipeline.Curve, got.CurveC - s.truth.CurveC, got.CurveSEC}, {pipeline.Sum, got.SumC - s.truth.SumC, got.SumSEC}} {
		k.definition = v.definition
		if tallies[k] == nil {
			tallies[k] = &tally{}
		}
		tallies[k].add(v.error, v.se)
	}
}

func meansOf(neighbours []Neighbour, d pipeline.Day) []NeighbourMean {
	var out []NeighbourMean
	for _, n := range neighbours {
		if i, seen := at(n.Points, d); seen {
			out = append(out, NeighbourMean{n.Station, n.Points[i].MeanC})
		}
	}
	return out
}
