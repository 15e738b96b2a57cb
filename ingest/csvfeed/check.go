package csvfeed

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"regexp"
	"slices"
	"strings"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// Most that a layout may say.
const (
	maxColumn  = 10_000     // number of a column
	maxValues  = 1_000      // value columns
	maxSpanS   = 366 * dayS // length of what a row covers
	maxOffsetS = 14 * 3600  // of a station's standard time from UTC
)

// faults gathers what is wrong with a layout.
type faults struct{ list []error }

func (f *faults) add(field, format string, args ...any) {
	f.list = append(f.list, fmt.Errorf(field+": "+format, args...))
}

func (f *faults) err() error { return errors.Join(f.list...) }

func (f *faults) checkShape(layout *pipeline.Layout, p *Plan) {
	switch d := layout.Delimiter; {
	case d == "space":
		p.delimiter, p.blanks = ' ', true
	case len(d) == 1 && (d == "\t" || d[0] >= ' ' && d[0] < 0x7f) && d != `"`:
		p.delimiter = d[0]
	default:
		f.add("delimiter", `%q is no delimiter; one ASCII character such as "," or ";" is right, or space for any run of blanks`, d)
	}
	if strings.ContainsAny(layout.Comment, "\r\n") {
		f.add("comment", "%q holds a line end; comments are known by how a line begins", layout.Comment)
	}
	if layout.NamesLine < 0 {
		f.add("names_line", "%d is no line; lines are numbered from 1, and 0 says that there are no names", layout.NamesLine)
	}
	if m := layout.MaxSetAside; !(m >= 0 && m <= 1) {
		f.add("max_set_aside", "%v is not a share from 0 to 1", m)
	}
}

// checkTime returns the fixed offset, if the zone is one.
func (f *faults) checkTime(c *pipeline.TimeColumns, p *Plan) (offsetS int32, fixed bool) {
	if len(c.Columns) == 0 {
		f.add("time.columns", "there are none; name the column that holds the time, or those that together do")
	}
	format, err := normal.CompileTime(c.Format)
	if err != nil {
		f.add("time.format", "%w", err)
	}
	p.time = format
	if c.Zone != "station" && !(c.Zone == "" && c.Covers == pipeline.CoversDay) {
		if offsetS, err = normal.ParseOffset(c.Zone); err != nil {
			f.add("time.zone", `%w, and not "station", which is the station's standard time`, err)
		} else if c.Covers == pipeline.CoversDay {
			f.add("time.zone", "%q cannot be with covers day: a station's day goes by its utc_offset and day_starts; write station", c.Zone)
		}
		fixed = true
	}
	switch c.Covers {
	case pipeline.CoversDay:
		if c.SpanS != dayS {
			f.add("time.span_s", "%d cannot be with covers day; 86400 is right", c.SpanS)
		}
	case pipeline.CoversInstant:
		if c.SpanS != 0 {
			f.add("time.span_s", "%d cannot be with covers instant; 0 is right", c.SpanS)
		}
	case pipeline.CoversEnding, pipeline.CoversBeginning:
		if c.SpanS <= 0 || c.SpanS > maxSpanS {
			f.add("time.span_s", "%d is not 1 to %d, the seconds that a row covers", c.SpanS, maxSpanS)
		}
	default:
		f.add("time.covers", "%q is none of instant, day, ending, beginning", string(c.Covers))
		return offsetS, fixed
	}
	if format != nil && !format.HasHour() && c.Covers != pipeline.CoversDay {
		f.add("time.format", "format %q has no time of the day, which covers %s needs; add hh:mm, or cover day", c.Format, c.Covers)
	}
	return offsetS, fixed
}

func (f *faults) checkStation(c *pipeline.StationColumn, p *Plan) {
	var set []string
	for _, way := range [...][2]string{{"column", c.Column}, {"file_name", c.FileName}, {"constant", c.Constant}} {
		if way[1] != "" {
			set = append(set, way[0])
		}
	}
	switch len(set) {
	case 0:
		f.add("station", "none of column, file_name and constant is set; exactly one says which station a row is of")
	case 1:
	default:
		f.add("station", "%s are set; exactly one says which station a row is of", strings.Join(set, " and "))
	}
	if c.FileName != "" {
		re, err := regexp.Compile(c.FileName)
		if err != nil {
			f.add("station.file_name", "%w", err)
		} else if re.NumSubexp() < 1 {
			f.add("station.file_name", "%q has no group; put the part of the name that is the station in parentheses", c.FileName)
		}
		p.fileName = re
	}
	for _, id := range slices.Sorted(maps.Keys(c.Clocks)) {
		clock := c.Clocks[id]
		if clock.UTCOffsetS < -maxOffsetS || clock.UTCOffsetS > maxOffsetS {
			f.add("station.clocks", "utc_offset_s %d of %q is not -50400 to 50400", clock.UTCOffsetS, id)
		}
		if clock.DayStartsS <= -dayS || clock.DayStartsS >= dayS {
			f.add("station.clocks", "day_starts_s %d of %q is not within a day (86400)", clock.DayStartsS, id)
		}
	}
}

func (f *faults) checkValues(layout *pipeline.Layout, p *Plan) {
	if n := len(layout.Values); n == 0 || n > maxValues {
		f.add("values", "there are %d columns; 1 to %d give the readings", n, maxValues)
	}
	first := map[pipeline.Series]int{}
	for i := range layout.Values {
		c := &layout.Values[i]
		at := fmt.Sprintf("values[%d].", i)
		variable, err := pipeline.ParseVariable(c.Variable)
		if err != nil {
			f.add(at+"variable", "%w", err)
		}
		covers := layout.Time.Covers
		switch {
		case err != nil || covers == "":
		case variable == pipeline.AirTemp && covers != pipeline.CoversInstant:
			f.add(at+"variable", "air_temp is a value at an instant, and time.covers is %s; air_temp_mean, air_temp_max or air_temp_min is right", covers)
		case variable != pipeline.AirTemp && covers == pipeline.CoversInstant:
			f.add(at+"variable", "%s is of a span, and time.covers is instant; air_temp is right, or day, ending or beginning", c.Variable)
		}
		if !slices.Contains(pipeline.TempUnits, c.Unit) {
			f.add(at+"unit", "%q is no unit; known are %s", string(c.Unit), unitNames())
		}
		if math.IsNaN(c.LevelM) || math.IsInf(c.LevelM, 0) {
			f.add(at+"level_m", "%v is no height in m", c.LevelM)
		}
		s := pipeline.Series{Sensor: c.Sensor, Variable: variable, LevelM: c.LevelM, SpanS: layout.Time.SpanS}
		if j, twice := first[s]; twice && err == nil {
			f.add(at+"sensor", "values[%d] has the same sensor, variable and level; readings of one would replace those of the other", j)
		} else {
			first[s] = i
		}
		p.series = append(p.series, s)
		if c.Flag != nil {
			f.checkFlag(at+"flag.", c.Flag)
		}
	}
}

func (f *faults) checkFlag(at string, c *pipeline.FlagColumn) {
	if int(c.Empty) >= len(pipeline.Qualities) {
		f.add(at+"empty", "%d is no quality mark; 0 to %d are", c.Empty, len(pipeline.Qualities)-1)
	}
	for _, text := range slices.Sorted(maps.Keys(c.Marks)) {
		switch {
		case trim(text) == "":
			f.add(at+"marks", "there is a mark for the empty flag; it is set by empty")
		case trim(text) != text:
			f.add(at+"marks", "%q has blanks around it, which cells are read without; leave them out", text)
		}
		if m := c.Marks[text]; int(m) >= len(pipeline.Qualities) {
			f.add(at+"marks", "%d of %q is no quality mark; 0 to %d are", m, text, len(pipeline.Qualities)-1)
		}
	}
}

// checkColumns looks at how the columns are named.
func (f *faults) checkColumns(layout *pipeline.Layout) {
	check := func(field, name string) {
		n, isNumber := columnNumber(name)
		switch {
		case name == "":
			f.add(field, "there is no column; name it as the header does, or by its number from 1")
		case isNumber && n > maxColumn && layout.NamesLine == 0:
			f.add(field, "column %d is past %d", n, maxColumn)
		case !isNumber && layout.NamesLine == 0:
			f.add(field, "%q is a name, and names_line is 0: there are no names; give the column's number from 1", name)
		}
	}
	for i, name := range layout.Time.Columns {
		check(fmt.Sprintf("time.columns[%d]", i), name)
	}
	if layout.Station.Column != "" {
		check("station.column", layout.Station.Column)
	}
	first := map[string]int{}
	for i := range layout.Values {
		c := &layout.Values[i]
		at := fmt.Sprintf("values[%d].", i)
		check(at+"column", c.Column)
		if j, twice := first[c.Column]; twice {
			f.add(at+"column", "values[%d] reads column %q already", j, c.Column)
		} else {
			first[c.Column] = i
		}
		if c.Flag != nil {
			check(at+"flag.column", c.Flag.Column)
		}
	}
}

func unitNames() string {
	names := make([]string, len(pipeline.TempUnits))
	for i, u := range pipeline.TempUnits {
		names[i] = string(u)
	}
	return strings.Join(names, ", ")
}
