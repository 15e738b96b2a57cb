package settings

import (
	"maps"
	"slices"
	"strconv"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

func writeLayout(t *tree, l *pipeline.Layout) {
	delimiter := l.Delimiter
	if delimiter == "\t" {
		delimiter = "tab"
	}
	if len(l.Widths) == 0 {
		t.text("delimiter", delimiter)
	}
	t.wholes("widths", l.Widths)
	t.word("quote", l.Quote)
	t.word("decimal", l.Decimal)
	t.word("encoding", l.Encoding)
	t.word("comment", l.Comment)
	t.word("preamble_ends", l.PreambleEnds)
	t.number("names_line", float64(l.NamesLine))
	t.some("units_line", float64(l.UnitsLine))
	t.some("data_line", float64(l.DataLine))
	t.sub("time", func(t *tree) {
		t.columns("columns", l.Time.Columns, l.Time.Or)
		t.text("format", l.Time.Format)
		t.text("zone", l.Time.Zone)
		t.word("ambiguous", string(l.Time.Ambiguous))
		t.word("skipped", string(l.Time.Skipped))
		t.text("covers", string(l.Time.Covers))
		if l.Time.Covers == pipeline.CoversEnding || l.Time.Covers == pipeline.CoversBeginning {
			t.duration("span", time.Duration(l.Time.SpanS)*time.Second)
		}
	})
	if c := l.Station; c.Column+c.FileName+c.Preamble+c.Constant != "" {
		t.sub("station", func(t *tree) { writeStationColumn(t, &c) })
	}
	t.list("values", len(l.Values), func(i int, t *tree) {
		v := &l.Values[i]
		t.column("column", v.Column, v.Or)
		if len(v.When) > 0 {
			t.sub("when", func(t *tree) {
				for _, k := range slices.Sorted(maps.Keys(v.When)) {
					t.texts(k, v.When[k])
				}
			})
		}
		t.text("variable", v.Variable)
		t.text("unit", string(v.Unit))
		t.word("unit_text", v.UnitText)
		t.some("scale", v.Scale)
		t.some("offset", v.Offset)
		t.text("sensor", v.Sensor)
		t.number("level_m", v.LevelM)
		t.texts("missing", v.Missing)
		if v.Flag != nil {
			t.sub("flag", func(t *tree) {
				t.column("column", v.Flag.Column, v.Flag.Or)
				t.text("empty", v.Flag.Empty.String())
				t.sub("marks", func(t *tree) {
					for _, k := range slices.Sorted(maps.Keys(v.Flag.Marks)) {
						t.text(k, v.Flag.Marks[k].String())
					}
				})
			})
		}
	})
	t.number("max_set_aside", l.MaxSetAside)
}

func writeStationColumn(t *tree, c *pipeline.StationColumn) {
	if c.Column != "" {
		t.column("column", c.Column, c.Or)
	}
	t.word("file_name", c.FileName)
	t.word("preamble", c.Preamble)
	t.word("constant", c.Constant)
	if len(c.Map) > 0 {
		t.sub("map", func(t *tree) {
			for _, k := range slices.Sorted(maps.Keys(c.Map)) {
				t.text(k, c.Map[k])
			}
		})
	}
}

// some writes a number that is there only if it is not 0.
func (t *tree) some(key string, v float64) {
	if v != 0 {
		t.number(key, v)
	}
}

func (t *tree) wholes(key string, list []int) {
	if len(list) == 0 {
		return
	}
	l := &yaml.Node{Kind: yaml.SequenceNode, Style: yaml.FlowStyle}
	for _, v := range list {
		l.Content = append(l.Content, &yaml.Node{Kind: yaml.ScalarNode, Value: strconv.Itoa(v)})
	}
	t.key(key, l)
}

// column writes a column, as a list if it has other names.
func (t *tree) column(key, name string, or []string) {
	if len(or) == 0 {
		t.text(key, name)
		return
	}
	t.texts(key, append([]string{name}, or...))
}

// columns writes a list of columns, of which those that have other names are
// lists themselves.
func (t *tree) columns(key string, names []string, or [][]string) {
	if len(or) == 0 {
		t.texts(key, names)
		return
	}
	l := textNodes(names)
	for i, others := range or {
		if len(others) > 0 {
			l.Content[i] = textNodes(append([]string{names[i]}, others...))
		}
	}
	t.key(key, l)
}
