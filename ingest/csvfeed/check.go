package csvfeed

import (
	"errors"
	"fmt"
	"maps"
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
	maxHeader  = 1_000      // lines before the data, the preamble not counted
	maxScale   = 1e9        // factor or summand
)

// faults gathers what is wrong with a layout.
type faults struct{ list []error }

func (f *faults) add(field, format string, args ...any) {
	f.list = append(f.list, fmt.Errorf(field+": "+format, args...))
}

func (f *faults) err() error { return errors.Join(f.list...) }

func (f *faults) checkShape(layout *pipeline.Layout, p *Plan) {
	switch d := layout.Delimiter; {
	case len(layout.Widths) > 0:
		f.checkWidths(layout, p)
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
	switch layout.Quote {
	case "":
	case "none":
		p.plainQuotes = true
	default:
		f.add("quote", "%q is not known; none says that quotes are text, and left out they quote cells", layout.Quote)
	}
	switch layout.Decimal {
	case "", ".":
	case ",":
		if p.decimal = ','; p.delimiter == ',' {
			f.add("decimal", `"," is the delimiter too; give another delimiter`)
		}
	default:
		f.add("decimal", `%q is no decimal mark; "," is, and "." if it is left out`, layout.Decimal)
	}
	if m := layout.MaxSetAside; !(m >= 0 && m <= 1) {
		f.add("max_set_aside", "%v is not a share from 0 to 1", m)
	}
}

// checkWidths looks at the widths of columns that no delimiter parts.
func (f *faults) checkWidths(layout *pipeline.Layout, p *Plan) {
	if layout.Delimiter != "" {
		f.add("delimiter", "%q cannot be with widths, which part the columns; leave one of them out", layout.Delimiter)
	}
	if n := len(layout.Widths); n > maxColumn {
		f.add("widths", "there are %d columns; %d are the most", n, maxColumn)
	}
	for i, w := range layout.Widths {
		if w < 1 || w > MaxLine {
			f.add(fmt.Sprintf("widths[%d]", i), "%d is no width in characters; 1 to %d are", w, MaxLine)
		}
	}
	p.widths = slices.Clone(layout.Widths)
}

// checkHeader looks at where names, units and data are.
func (f *faults) checkHeader(layout *pipeline.Layout, p *Plan) {
	p.namesLine, p.unitsLine = int64(layout.NamesLine), int64(layout.UnitsLine)
	p.header = max(p.namesLine, p.unitsLine)
	if layout.NamesLine < 0 {
		f.add("names_line", "%d is no line; lines are numbered from 1, and 0 says that there are no names", layout.NamesLine)
	}
	if layout.UnitsLine < 0 {
		f.add("units_line", "%d is no line; lines are numbered from 1, and 0 says that there are no units", layout.UnitsLine)
	}
	if p.unitsLine > 0 && p.unitsLine == p.namesLine {
		f.add("units_line", "%d is the line of the names too", p.unitsLine)
	}
	switch n := int64(layout.DataLine); {
	case n < 0:
		f.add("data_line", "%d is no line; lines are numbered from 1, and left out data begin after names and units", n)
	case n > 0 && n <= p.header:
		f.add("data_line", "%d is not after the lines of names and units; the last of them is %d", n, p.header)
	case n > 0:
		p.header = n - 1
	}
	if p.header > maxHeader {
		field := "names_line"
		if layout.DataLine > 0 {
			field = "data_line"
		}
		f.add(field, "the header has %d lines; %d are the most", p.header, maxHeader)
	}
	p.preambleEnds = f.expression("preamble_ends", layout.PreambleEnds, false)
	for i := range layout.Values {
		if trim(layout.Values[i].UnitText) != "" && p.unitsLine == 0 {
			f.add(fmt.Sprintf("values[%d].unit_text", i), "there is no line of units to hold it against; say which it is by units_line")
		}
	}
}

// expression compiles a regular expression; nil for none or a bad one.
func (f *faults) expression(field, text string, group bool) *regexp.Regexp {
	if text == "" {
		return nil
	}
	re, err := regexp.Compile(text)
	switch {
	case err != nil:
		f.add(field, "%w", err)
	case group && re.NumSubexp() < 1:
		what := "name"
		if field == "station.preamble" {
			what = "line"
		}
		f.add(field, "%q has no group; put the part of the %s that is the station in parentheses", text, what)
	}
	return re
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
	epoch := format != nil && format.IsEpoch()
	switch {
	case epoch:
		if fixed = true; c.Zone != "" && c.Zone != "Z" {
			f.add("time.zone", "%q cannot be with format %s, which counts from 1970 in UTC; write Z", c.Zone, c.Format)
		}
		if c.Covers == pipeline.CoversDay {
			f.add("time.format", "%s counts instants, and a day is a date; give a format with a date, or what else the row covers", c.Format)
		}
	case normal.IsZoneName(c.Zone):
		fixed = true
		f.checkZone(c, p)
	case c.Zone != "station" && !(c.Zone == "" && c.Covers == pipeline.CoversDay):
		if offsetS, err = normal.ParseOffset(c.Zone); err != nil {
			f.add("time.zone", `%w, not "station", which is the station's standard time, and no named zone such as America/Edmonton`, err)
		} else if c.Covers == pipeline.CoversDay {
			f.add("time.zone", "%q cannot be with covers day: a station's day goes by its utc_offset and day_starts; write station", c.Zone)
		}
		fixed = true
	}
	if !normal.IsZoneName(c.Zone) && (c.Ambiguous != "" || c.Skipped != "") {
		f.add("time.zone", "%q has no times that are there twice or not at all; leave ambiguous and skipped out", c.Zone)
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

// checkZone makes a named zone ready.
func (f *faults) checkZone(c *pipeline.TimeColumns, p *Plan) {
	if c.Covers == pipeline.CoversDay {
		f.add("time.zone", "%q cannot be with covers day: a station's day goes by its utc_offset and day_starts; write station", c.Zone)
	}
	zone, err := normal.LoadZone(c.Zone, c.Ambiguous, c.Skipped)
	if err != nil {
		f.add("time.zone", "%w", err)
	}
	p.zone = zone
	switch c.Ambiguous {
	case pipeline.AmbiguousEarlier, pipeline.AmbiguousLater, pipeline.AmbiguousSetAside:
	default:
		f.add("time.ambiguous", "%q is none of earlier, later, set_aside: what a time is that the clocks of %s show twice", string(c.Ambiguous), c.Zone)
	}
	switch c.Skipped {
	case pipeline.SkippedShift, pipeline.SkippedSetAside:
	default:
		f.add("time.skipped", "%q is none of shift, set_aside: what becomes of a time that the clocks of %s leave out", string(c.Skipped), c.Zone)
	}
}

func (f *faults) checkStation(c *pipeline.StationColumn, p *Plan) {
	var set []string
	for _, way := range [...][2]string{{"column", c.Column}, {"file_name", c.FileName}, {"preamble", c.Preamble}, {"constant", c.Constant}} {
		if way[1] != "" {
			set = append(set, way[0])
		}
	}
	switch len(set) {
	case 0:
		f.add("station", "none of column, file_name, preamble and constant is set; exactly one says which station a row is of")
	case 1:
	default:
		f.add("station", "%s are set; exactly one says which station a row is of", strings.Join(set, " and "))
	}
	p.fileName = f.expression("station.file_name", c.FileName, true)
	p.preamble = f.expression("station.preamble", c.Preamble, true)
	if p.preamble != nil && p.preambleEnds == nil && p.header <= min(1, p.namesLine) {
		f.add("station.preamble", "there is no line before the names; say where they are by names_line, or how the preamble ends by preamble_ends")
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
