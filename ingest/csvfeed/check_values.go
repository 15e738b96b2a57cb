package csvfeed

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"thawledger/pipeline"
)

func (f *faults) checkValues(layout *pipeline.Layout, p *Plan) {
	if n := len(layout.Values); n == 0 || n > maxValues {
		f.add("values", "there are %d columns; 1 to %d give the readings", n, maxValues)
	}
	first := map[pipeline.Series][]int{}
	when := make([][]condition, len(layout.Values))
	for i := range layout.Values {
		c := &layout.Values[i]
		at := fmt.Sprintf("values[%d].", i)
		variable, err := pipeline.ParseVariable(c.Variable)
		if err != nil {
			f.add(at+"variable", "%w", err)
		}
		covers := layout.Time.Covers
		medium, statistic := variable.Of()
		switch {
		case err != nil || covers == "":
		case statistic == pipeline.AirTemp && covers != pipeline.CoversInstant:
			f.add(at+"variable", "%[1]s_temp is a value at an instant, and time.covers is %[2]s; %[1]s_temp_mean, %[1]s_temp_max or %[1]s_temp_min is right", medium, covers)
		case statistic != pipeline.AirTemp && covers == pipeline.CoversInstant:
			f.add(at+"variable", "%s is of a span, and time.covers is instant; %s_temp is right, or day, ending or beginning", c.Variable, medium)
		}
		if !slices.Contains(pipeline.TempUnits, c.Unit) {
			f.add(at+"unit", "%q is no unit; known are %s", string(c.Unit), unitNames())
		}
		if math.IsNaN(c.LevelM) || math.IsInf(c.LevelM, 0) {
			f.add(at+"level_m", "%v is no height in m", c.LevelM)
		}
		s := pipeline.Series{Sensor: c.Sensor, Variable: variable, LevelM: c.LevelM, SpanS: layout.Time.SpanS}
		when[i] = conditions(c)
		for _, j := range first[s] {
			if err == nil && !apart(when[i], when[j]) {
				f.add(at+"sensor", "values[%d] has the same sensor, variable and level; readings of one would replace those of the other", j)
				break
			}
		}
		first[s] = append(first[s], i)
		if v := c.Scale; math.IsNaN(v) || math.Abs(v) > maxScale || v != 0 && math.Abs(v) < 1/maxScale {
			f.add(at+"scale", "%v is no factor; %g to %g are", v, 1/maxScale, maxScale)
		}
		if v := c.Offset; math.IsNaN(v) || math.Abs(v) > maxScale {
			f.add(at+"offset", "%v is nothing to add; up to %g is", v, maxScale)
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
	check := func(field, name string, or []string) {
		for _, name := range append([]string{name}, or...) {
			n, isNumber := columnNumber(name)
			switch {
			case name == "":
				f.add(field, "there is no column; name it as the header does, or by its number from 1")
			case isNumber && len(or) > 0:
				f.add(field, "%q is a number, and of several names for a column the file has one; give names only", name)
			case isNumber && n > maxColumn && layout.NamesLine == 0:
				f.add(field, "column %d is past %d", n, maxColumn)
			case isNumber && len(layout.Widths) > 0 && n > len(layout.Widths):
				f.add(field, "column %d is past the last, %d, that has a width", n, len(layout.Widths))
			case !isNumber && layout.NamesLine == 0:
				f.add(field, "%q is a name, and names_line is 0: there are no names; give the column's number from 1", name)
			}
		}
	}
	if n := len(layout.Time.Or); n > len(layout.Time.Columns) {
		f.add("time.columns", "there are other names for %d of %d columns", n, len(layout.Time.Columns))
	}
	for i, name := range layout.Time.Columns {
		var or []string
		if i < len(layout.Time.Or) {
			or = layout.Time.Or[i]
		}
		check(fmt.Sprintf("time.columns[%d]", i), name, or)
	}
	switch c := &layout.Station; {
	case c.Column != "":
		check("station.column", c.Column, c.Or)
	case len(c.Or) > 0:
		f.add("station.column", "there are other names for a column that is not given")
	}
	when := make([][]condition, len(layout.Values))
	for i := range layout.Values {
		c := &layout.Values[i]
		at := fmt.Sprintf("values[%d].", i)
		when[i] = conditions(c)
		check(at+"column", c.Column, c.Or)
		for j := range i {
			if layout.Values[j].Column == c.Column && !apart(when[i], when[j]) {
				f.add(at+"column", "values[%d] reads column %q already", j, c.Column)
				break
			}
		}
		if c.Flag != nil {
			check(at+"flag.column", c.Flag.Column, c.Flag.Or)
		}
		for _, column := range slices.Sorted(maps.Keys(c.When)) {
			check(at+"when", column, nil)
			if len(c.When[column]) == 0 {
				f.add(at+"when", "there is no text for column %q; no row would have it", column)
			}
			for _, text := range c.When[column] {
				if trim(text) != text {
					f.add(at+"when", "%q has blanks around it, which cells are read without; leave them out", text)
				}
			}
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
