package propose

import (
	"fmt"
	"time"

	"thawledger/pipeline"
)

// About is what a question is about.
type About string

// What questions are about.
const (
	Unit     About = "unit"
	Zone     About = "zone"
	DayOrder About = "day order"
	Covers   About = "covers"
	Station  About = "station"
	Variable About = "variable"
	Missing  About = "missing"
	Flag     About = "flag"
)

// Question is what the file does not say and a person has to.
type Question struct {
	About   About
	Column  string // the value column that it is about; "" for the layout
	Text    string
	Options []string // answers, as the settings write them
	Chosen  string   // what the proposal has meanwhile
}

// Reading is what the proposed layout reads from a cell.
type Reading struct {
	Station  string // the feed's id
	Column   string
	Variable string
	// Start is the start of what it covers: UTC, or as the station's clock shows
	// it if the proposed zone is the station's.
	Start   time.Time
	ValueC  float64
	Quality pipeline.Quality
}

// Proposal is a layout and what is not sure about it.
type Proposal struct {
	Layout    pipeline.Layout // its station clocks are not set
	Questions []Question
	Notes     []string // what is worth knowing and needs no answer

	// What became of the sample's rows by the layout.
	Rows, Read, WithoutValue, SetAside int
	FirstSetAside                      string // line and reason
	First                              []Reading

	file   string
	others []pipeline.ValueColumn // temperatures that are not proposed
	where  string                 // the station's position, if the file has it
	ids    []string               // of stations, as the settings would have them
	points []Point
}

// Look proposes a layout for a file, from its name and samples of it: its
// beginning and, where it is longer, pieces from further on, each cut at line
// ends. The error says what was found instead of a table of readings.
func Look(name string, samples [][]byte) (*Proposal, error) {
	text, err := gather(samples)
	if err != nil {
		return nil, err
	}
	t, err := tabulate(text)
	if err != nil {
		return nil, err
	}
	p := &Proposal{file: baseName(name)}
	l := &p.Layout
	l.Name, l.MaxSetAside = layoutName(p.file), defaultShare
	l.Delimiter, l.Comment, l.NamesLine = t.delimiter, t.comment, t.namesLine
	p.Notes = append(append(p.Notes, text.notes...), t.notes...)

	when, err := t.findTime()
	if err != nil {
		return nil, err
	}
	where := t.findStation(p.file, when)
	temps, err := t.findTemperatures(when, where)
	if err != nil {
		return nil, err
	}
	p.setTime(t, when, temps)
	p.setStation(where)
	if again := t.rows - when.distinct; len(where.ids) == 1 && float64(again) > mostAgain*float64(t.rows) {
		p.note("%d of %d rows have the time of another: a later row replaces an earlier one, so see whether times have all their columns", again, t.rows)
	}
	p.setValues(t, when, where, temps)
	if err := p.verify(text); err != nil {
		return nil, fmt.Errorf("proposed layout: %w", err)
	}
	return p, nil
}

// mostAgain is the share of rows that may have the time of another without a
// word (judgement, no source).
const mostAgain = 0.05

// defaultShare is what settings take for max_set_aside if it is left out.
const defaultShare = 0.2

func (p *Proposal) ask(q Question) { p.Questions = append(p.Questions, q) }

func (p *Proposal) note(format string, args ...any) {
	p.Notes = append(p.Notes, fmt.Sprintf(format, args...))
}
