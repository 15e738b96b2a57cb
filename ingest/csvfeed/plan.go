package csvfeed

import (
	"maps"
	"regexp"
	"slices"
	"strconv"
	"strings"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// Plan is a layout made ready for reading. It may be used by several goroutines
// at once.
type Plan struct {
	delimiter   byte
	blanks      bool
	widths      []int
	plainQuotes bool
	decimal     byte
	comment     []byte
	maxSetAside float64

	// Lines of the header, counted after the preamble; header is the last of them.
	preambleEnds                 *regexp.Regexp
	namesLine, unitsLine, header int64

	time        *normal.TimeFormat
	timeColumns [][]string // each with its other names
	zone        *normal.Zone
	covers      pipeline.Covers
	spanS       int64

	stationColumn []string
	fileName      *regexp.Regexp
	preamble      *regexp.Regexp
	constant      string
	stations      map[string]*station // by the feed's id
	ours          map[string]string   // the layout's Map
	known         []string            // the feed's ids, in order

	values []value
	series []pipeline.Series
	choice bool  // some values are not of all rows
	cells  int64 // values that are of all rows
}

// station is what a row's station adds to its time.
type station struct {
	id     string // ours
	shiftS int64  // from the civil time, taken as UTC, to the start of the span
}

// value is a column that gives readings.
type value struct {
	columns []string // its column and what else that may be called
	when    []condition
	unit    pipeline.TempUnit
	text    string // of the unit; "" for any
	scaled  bool
	scale   float64
	offset  float64
	missing []string
	flag    []string // column of the flag, with its other names; nil for none
	marks   map[string]pipeline.Quality
	bare    pipeline.Quality // mark of a value that has no flag
}

// dayS is the length of a station's day in s: standard time has no other.
const dayS = 86400

// Compile makes a layout ready and checks all of it that can be checked without
// a file. All faults are named at once, one a line, each by the layout's field.
// The plan does not change with the layout afterwards.
func Compile(layout *pipeline.Layout) (*Plan, error) {
	f := &faults{}
	p := &Plan{
		comment: []byte(layout.Comment), maxSetAside: layout.MaxSetAside, decimal: '.',
		covers: layout.Time.Covers, spanS: int64(layout.Time.SpanS),
		stationColumn: names(layout.Station.Column, layout.Station.Or), constant: layout.Station.Constant,
	}
	for i, name := range layout.Time.Columns {
		var or []string
		if i < len(layout.Time.Or) {
			or = layout.Time.Or[i]
		}
		p.timeColumns = append(p.timeColumns, names(name, or))
	}
	f.checkShape(layout, p)
	f.checkHeader(layout, p)
	offsetS, fixed := f.checkTime(&layout.Time, p)
	f.checkStation(&layout.Station, p)
	f.checkValues(layout, p)
	f.checkColumns(layout)
	if err := f.err(); err != nil {
		return nil, err
	}
	p.resolveStations(&layout.Station, offsetS, fixed)
	p.resolveValues(layout)
	return p, nil
}

// Series returns the series of the layout's value columns, in their order. The
// column that a Sink is given is an index into it.
func (p *Plan) Series() []pipeline.Series { return slices.Clone(p.series) }

// resolveStations works out what each of the feed's ids stands for.
func (p *Plan) resolveStations(c *pipeline.StationColumn, offsetS int32, fixed bool) {
	ours := make(map[string]*station, len(c.Clocks))
	for id, clock := range c.Clocks {
		s := &station{id: id, shiftS: -int64(clock.UTCOffsetS)}
		if fixed {
			s.shiftS = -int64(offsetS)
		}
		switch p.covers {
		case pipeline.CoversDay:
			s.shiftS += int64(clock.DayStartsS)
		case pipeline.CoversEnding:
			s.shiftS -= p.spanS
		}
		ours[id] = s
	}
	p.ours = maps.Clone(c.Map)
	p.stations = maps.Clone(ours)
	for theirs, id := range c.Map {
		delete(p.stations, theirs)
		if s := ours[id]; s != nil {
			p.stations[theirs] = s
		}
	}
	p.known = slices.Sorted(maps.Keys(p.stations))
}

func (p *Plan) resolveValues(layout *pipeline.Layout) {
	for i := range layout.Values {
		c := &layout.Values[i]
		v := value{columns: names(c.Column, c.Or), unit: c.Unit, text: trim(c.UnitText), when: conditions(c), bare: pipeline.QualityNotChecked,
			scaled: c.Scale != 0 || c.Offset != 0, scale: c.Scale, offset: c.Offset}
		if v.scale == 0 {
			v.scale = 1
		}
		if v.when == nil {
			p.cells++
		} else {
			p.choice = true
		}
		for _, token := range c.Missing {
			if token = trim(token); token != "" {
				v.missing = append(v.missing, token)
			}
		}
		if c.Flag != nil {
			v.flag, v.bare = names(c.Flag.Column, c.Flag.Or), c.Flag.Empty
			v.marks = maps.Clone(c.Flag.Marks)
		}
		p.values = append(p.values, v)
	}
}

// names puts a column's name before what else it may be called; nil for none.
func names(name string, or []string) []string {
	if name == "" {
		return nil
	}
	return append([]string{name}, or...)
}

// columnNumber returns the number that a column is named by, from 1, and whether
// it is one.
func columnNumber(name string) (int, bool) {
	n, err := strconv.Atoi(name)
	return n, err == nil && n > 0 && name[0] != '+'
}

func trim(text string) string { return strings.Trim(text, " \t") }
