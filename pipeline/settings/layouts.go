package settings

import (
	"cmp"
	"fmt"
	"maps"
	"slices"
	"strconv"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

func (r *reader) readLayouts(s *Settings, o *object) {
	n := o.get("layouts")
	if n == nil {
		o.missing("layouts", "declare at least one layout")
		return
	}
	all := r.object(n, "layouts", n)
	for i := 0; !all.bad && i+1 < len(n.Content); i += 2 {
		name := n.Content[i].Value
		if s.Layouts[name] != nil {
			continue // the second of two; object has said so
		}
		l := r.layout(name, r.object(all.get(name), all.at(name), n.Content[i]))
		s.Layouts[name] = &l
		s.order = append(s.order, name)
	}
}

func (r *reader) layout(name string, o *object) pipeline.Layout {
	zero, share := 0.0, 0.2
	l := pipeline.Layout{Name: name}
	o.shape(&l)
	l.Comment, l.PreambleEnds = o.textOr("comment", ""), o.expression("preamble_ends", 0, "that fits the last line of the preamble, such as ^DATA")
	l.NamesLine, l.UnitsLine, l.DataLine = o.whole("names_line", &zero, 0, 1000), o.whole("units_line", &zero, 0, 1000), o.whole("data_line", &zero, 0, 1001)
	if l.Encoding = oneOf(o, "encoding", "utf-8", encodings...); l.Encoding == "utf-8" {
		l.Encoding = ""
	}
	l.Time = r.timeColumns(r.object(o.get("time"), o.at("time"), o.node))
	if o.has("station") {
		l.Station = r.stationColumn(r.object(o.get("station"), o.at("station"), o.node))
	} else {
		o.known = append(o.known, "station")
	}
	missing := o.texts("missing")
	if o.list("values", func(n *yaml.Node, path string) {
		l.Values = append(l.Values, r.valueColumn(r.object(n, path, n), missing))
	}) == nil && !o.has("values") {
		o.missing("values", "say which columns hold temperatures, of what variable and in what unit")
	}
	l.MaxSetAside = o.number("max_set_aside", &share, 0, 1)
	o.done()
	r.sameSeries(o, l)
	if l.NamesLine == 0 {
		r.numbersOnly(o, l)
	}
	return l
}

// encodings are those that ingest can read; a test keeps the two lists the same.
var encodings = []string{"utf-8", "utf-16", "utf-16le", "utf-16be", "latin-1", "windows-1252"}

// sameSeries reports two columns that would give readings of one key.
func (r *reader) sameSeries(o *object, l pipeline.Layout) {
	type key struct {
		variable, sensor string
		level            float64
	}
	seen := map[key]int{}
	for i, v := range l.Values {
		if len(v.When) > 0 {
			continue // which rows such a value is of is for checkLayouts
		}
		k := key{v.Variable, v.Sensor, v.LevelM}
		if first, ok := seen[k]; ok {
			r.fault(o.vals["values"].Content[i], fmt.Sprintf("%s[%d]", o.at("values"), i), "give one of them another sensor or level_m",
				"values[%d] has the same variable, sensor and level", first)
		}
		seen[k] = i
	}
}

// numbersOnly reports columns called by name where the file has no names.
func (r *reader) numbersOnly(o *object, l pipeline.Layout) {
	names := slices.Concat(l.Time.Columns, slices.Concat(l.Time.Or...), []string{l.Station.Column}, l.Station.Or)
	for _, v := range l.Values {
		names = slices.Concat(names, []string{v.Column}, v.Or, slices.Sorted(maps.Keys(v.When)))
		if v.Flag != nil {
			names = append(append(names, v.Flag.Column), v.Flag.Or...)
		}
	}
	for _, name := range names {
		if n, err := strconv.Atoi(name); name != "" && (err != nil || n < 1) {
			r.fault(o.node, o.path, "give its number from 1, or say in which line the names are (names_line)",
				"column %q is called by name, and the layout has no line of names", name)
		}
	}
}

func (r *reader) timeColumns(o *object) pipeline.TimeColumns {
	t := pipeline.TimeColumns{Format: o.text("format", "say how the time is written, such as YYYY-MM-DD hh:mm")}
	t.Columns, t.Or = o.columns("columns")
	if len(t.Columns) == 0 && !o.bad {
		o.missing("columns", "list the columns that hold the time, by name or number")
	}
	o.zone(&t)
	t.Covers = oneOf(o, "covers", "", pipeline.CoversDay, pipeline.CoversInstant, pipeline.CoversEnding, pipeline.CoversBeginning)
	span := o.duration("span", 0)
	switch t.Covers {
	case pipeline.CoversDay:
		if o.has("span") {
			r.fault(o.keys["span"], o.at("span"), "leave it out", "a day is 24 h long")
		}
		if t.Zone != "station" && t.Zone != "" {
			r.fault(cmp.Or(o.vals["zone"], o.node), o.at("zone"), "write station", "a day is the station's day")
		}
		span = 24 * time.Hour
	case pipeline.CoversInstant:
		if span != 0 {
			r.fault(o.keys["span"], o.at("span"), "leave it out", "an instant has no length")
		}
	default:
		if span < time.Second || span >= 24*time.Hour {
			r.fault(o.node, o.at("span"), "write how long, such as 1h; for a whole day covers: day", "a span that ends or begins at a time needs a length below a day")
		}
	}
	t.SpanS = int32(span / time.Second)
	o.done()
	return t
}

func (r *reader) stationColumn(o *object) pipeline.StationColumn {
	c := pipeline.StationColumn{Constant: o.textOr("constant", "")}
	c.Column, c.Or = o.column("column", "")
	const group = `with a group around the station's id, such as ^([A-Z]+)_`
	c.FileName, c.Preamble = o.expression("file_name", 1, group), o.expression("preamble", 1, group)
	given := 0
	for _, text := range []string{c.Column, c.FileName, c.Preamble, c.Constant} {
		if text != "" {
			given++
		}
	}
	if given != 1 && !o.bad {
		r.fault(o.node, o.path, "give exactly one of column, file_name, preamble and constant", "%d of them are given", given)
	}
	if n := o.get("map"); n != nil {
		m := r.object(n, o.at("map"), n)
		c.Map = map[string]string{}
		for key := range m.vals {
			c.Map[key] = m.text(key, "write one of our stations")
		}
	}
	o.done()
	return c
}

func (r *reader) valueColumn(o *object, missing []string) pipeline.ValueColumn {
	level := 1.5
	v := pipeline.ValueColumn{
		When: o.when(),
		Variable: oneOf(o, "variable", "", "air_temp_mean", "air_temp_max", "air_temp_min", "air_temp",
			"surface_temp_mean", "surface_temp_max", "surface_temp_min", "surface_temp"),
		Unit: oneOf(o, "unit", "", pipeline.TempUnits...), UnitText: o.textOr("unit_text", ""),
		Sensor: o.textOr("sensor", "air"), LevelM: o.number("level_m", &level, -500, 500),
		Missing: slices.Concat(missing, o.texts("missing")),
	}
	v.Column, v.Or = o.column("column", columnRight)
	v.Scale, v.Offset = o.scale()
	if n := o.get("flag"); n != nil {
		f := r.object(n, o.at("flag"), n)
		v.Flag = &pipeline.FlagColumn{Empty: quality(f, "empty", pipeline.QualityNotChecked)}
		v.Flag.Column, v.Flag.Or = f.column("column", columnRight)
		m := r.object(f.get("marks"), f.at("marks"), n)
		v.Flag.Marks = map[string]pipeline.Quality{}
		for key := range m.vals {
			v.Flag.Marks[key] = quality(m, key, pipeline.QualityNotChecked)
		}
		f.done()
	}
	o.done()
	return v
}

func quality(o *object, key string, otherwise pipeline.Quality) pipeline.Quality {
	word := oneOf(o, key, otherwise.String(), pipeline.Qualities...)
	return pipeline.Quality(slices.Index(pipeline.Qualities, word))
}
