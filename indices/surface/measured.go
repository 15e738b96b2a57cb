package surface

import (
	"errors"
	"fmt"
	"math"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// Pair is a season's air index beside the index of a surface's own
// temperatures, in degC.d. Both are of the same kind, definition and base.
type Pair struct {
	Label        string
	First        pipeline.Day // first day of the season's window: its key
	Kind         pipeline.Kind
	Definition   pipeline.Definition
	Air, Surface degreeday.Bounds
	// Complete: in both records the season is over and no day is missing.
	Complete bool
}

// PairOf puts two seasons of the same window together: the air's and the
// surface's.
func PairOf(air, surface *degreeday.Season, by pipeline.Definition) (Pair, error) {
	if air.Kind != surface.Kind || air.Window != surface.Window {
		return Pair{}, fmt.Errorf("%s season from %s of the air, %s season from %s of the surface: not the same season",
			air.Kind, air.Window.First, surface.Kind, surface.Window.First)
	}
	p := Pair{Label: air.Label, First: air.Window.First, Kind: air.Kind, Definition: by, Complete: air.Complete() && surface.Complete()}
	switch by {
	case pipeline.Curve:
		p.Air, p.Surface = air.Curve.Index, surface.Curve.Index
	case pipeline.Sum:
		p.Air, p.Surface = air.Sum.Index, surface.Sum.Index
	default:
		return Pair{}, fmt.Errorf("an n-factor is measured by curve or sum indices, not by %q", by)
	}
	return p, nil
}

// LeastAirCDays is the air index, in degC.d, from which on a ratio to it says
// something of the surface: judgement, no source.
const LeastAirCDays = 50

// Why says why a season gives no n.
type Why string

// The reasons.
const (
	NotWhole    Why = "not complete"     // part of a season, or days missing: a seasonal n cannot be had from it
	LittleAir   Why = "little air index" // less than LeastAirCDays
	NoSurface   Why = "no surface index" // the surface stayed on the other side of the base
	Implausible Why = "implausible"      // above MostN
)

// SeasonN is a season's measured n.
type SeasonN struct {
	Label string
	First pipeline.Day
	N     float64
}

// Refused is a season that gives no n, and why.
type Refused struct {
	Label string
	First pipeline.Day
	Why   Why
}

// Measurement is a measured n-factor.
type Measurement struct {
	Kind       pipeline.Kind
	Definition pipeline.Definition
	Seasons    []SeasonN // at least one
	Refused    []Refused

	Mean, Low, High float64 // of the seasons' n
	SD              float64 // standard deviation between seasons, by n-1
	HasSD           bool    // from two seasons on
}

// ErrNoSeason is wrapped by the error where no season gives an n.
var ErrNoSeason = errors.New("no complete season gives an n-factor")

// Measured returns the n-factor of a surface whose temperature is measured: the
// ratio of the surface index to the air index, season by season (TM 5-852-4,
// 1983), and its mean and spread. Only complete seasons count; the others are
// named in Refused. All pairs must be of one kind and definition.
func Measured(pairs []Pair) (Measurement, error) {
	var m Measurement
	for i := range pairs {
		p := &pairs[i]
		if i == 0 {
			if p.Kind != pipeline.Thaw && p.Kind != pipeline.Freeze {
				return Measurement{}, fmt.Errorf("season %s: kind %q is neither thaw nor freeze", p.Label, p.Kind)
			}
			m.Kind, m.Definition = p.Kind, p.Definition
		}
		if p.Kind != m.Kind || p.Definition != m.Definition {
			return Measurement{}, fmt.Errorf("season %s is a %s season by %s, season %s a %s season by %s: n_t and n_f, and definitions, are kept apart",
				pairs[0].Label, m.Kind, m.Definition, p.Label, p.Kind, p.Definition)
		}
		if why := p.refused(); why != "" {
			m.Refused = append(m.Refused, Refused{p.Label, p.First, why})
			continue
		}
		m.Seasons = append(m.Seasons, SeasonN{p.Label, p.First, p.Surface.Low / p.Air.Low})
	}
	if len(m.Seasons) == 0 {
		return Measurement{}, fmt.Errorf("%w: %d seasons given, at least one must be complete in air and surface", ErrNoSeason, len(pairs))
	}
	m.summarise()
	return m, nil
}

func (p *Pair) refused() Why {
	switch a, s := p.Air.Low, p.Surface.Low; {
	case !p.Complete || !p.Air.Known() || !p.Surface.Known():
		return NotWhole
	case !(a >= LeastAirCDays):
		return LittleAir
	case !(s > 0):
		return NoSurface
	case !(s/a <= MostN):
		return Implausible
	}
	return ""
}

func (m *Measurement) summarise() {
	m.Low, m.High = m.Seasons[0].N, m.Seasons[0].N
	var sum float64
	for _, s := range m.Seasons {
		m.Low, m.High = min(m.Low, s.N), max(m.High, s.N)
		sum += s.N
	}
	// within [Low, High] whatever the rounding
	m.Mean = min(max(sum/float64(len(m.Seasons)), m.Low), m.High)
	if len(m.Seasons) < 2 {
		return
	}
	var squares float64
	for _, s := range m.Seasons {
		d := s.N - m.Mean
		squares += float64(d * d)
	}
	m.SD, m.HasSD = math.Sqrt(squares/float64(len(m.Seasons)-1)), true
}

// Factor returns the measurement as an n-factor that takes effect with the first
// season that starts on from or later: the mean, and the range between seasons.
func (m *Measurement) Factor(from pipeline.Day) Factor {
	return Factor{
		Kind: m.Kind, From: from, Low: m.Low, Central: m.Mean, High: m.High, Definition: m.Definition,
		Source: fmt.Sprintf("measured on the surface, %d seasons, %s to %s", len(m.Seasons), m.Seasons[0].Label, m.Seasons[len(m.Seasons)-1].Label),
	}
}
