package settings

import (
	"fmt"
	"math"
	"regexp"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

const columnRight = "write the column's name, or its number from 1"

// shape reads how lines are parted into cells, and numbers written.
func (o *object) shape(l *pipeline.Layout) {
	if l.Widths = o.wholes("widths", 1, 1<<20); len(l.Widths) == 0 {
		l.Delimiter = o.delimiter()
	} else if n := o.get("delimiter"); n != nil {
		o.r.fault(n, o.at("delimiter"), "leave one of them out", "widths part the columns, and a delimiter is given as well")
	}
	const quote = "write none if quotes are text, or leave it out"
	if l.Quote = o.textOr("quote", ""); l.Quote != "" && l.Quote != "none" {
		o.r.fault(o.vals["quote"], o.at("quote"), quote, "%q is not known", l.Quote)
	}
	switch l.Decimal = o.textOr("decimal", "."); {
	case l.Decimal == ".":
		l.Decimal = ""
	case l.Decimal != ",":
		o.r.fault(o.vals["decimal"], o.at("decimal"), `write "," for a decimal comma, or leave it out`, "%q will not do", l.Decimal)
	case l.Delimiter == ",":
		o.r.fault(o.vals["decimal"], o.at("decimal"), "give another delimiter", "a comma cannot be both the delimiter and the decimal mark")
	}
}

func (o *object) delimiter() string {
	const right = `write one character, or tab, or space for any run of blanks`
	text := o.text("delimiter", right)
	switch {
	case text == "tab":
		return "\t"
	case text == "space", text == "":
		return text
	case len(text) != 1 || text == `"` || text == "\n" || text == "\r":
		o.r.fault(o.vals["delimiter"], o.at("delimiter"), right, "%q will not do", text)
	}
	return text
}

// wholes returns a list of whole numbers.
func (o *object) wholes(key string, least, most int) (out []int) {
	o.list(key, func(n *yaml.Node, path string) {
		v, err := strconv.Atoi(n.Value)
		if n.Kind != yaml.ScalarNode || err != nil || v < least || v > most {
			o.r.fault(n, path, fmt.Sprintf("write a whole number from %d to %d", least, most), "%s will not do", shown(n))
			return
		}
		out = append(out, v)
	})
	return out
}

// expression returns a regular expression that has so many groups at least.
func (o *object) expression(key string, groups int, right string) string {
	text := o.textOr(key, "")
	if re, err := regexp.Compile(text); text != "" && (err != nil || re.NumSubexp() < groups) {
		o.r.fault(o.vals[key], o.at(key), "write a regular expression "+right, "%q will not do", text)
	}
	return text
}

// column returns a column's name and, where a list is given, what else it may be
// called. What right says is wanted if it is missing, unless that is empty.
func (o *object) column(key, right string) (name string, or []string) {
	if n := o.vals[key]; n != nil && n.Kind == yaml.SequenceNode {
		names := o.texts(key)
		if len(names) == 0 {
			o.missing(key, columnRight)
			return "", nil
		}
		return names[0], others(names)
	}
	if right == "" {
		return o.textOr(key, ""), nil
	}
	return o.text(key, right), nil
}

// columns returns a list of columns, each with its other names where it is a list
// itself; or is nil if none has any.
func (o *object) columns(key string) (names []string, or [][]string) {
	some := false
	o.list(key, func(n *yaml.Node, path string) {
		texts := []string{n.Value}
		if n.Kind == yaml.SequenceNode {
			texts = nil
			for i, entry := range n.Content {
				if entry.Kind != yaml.ScalarNode {
					o.r.fault(entry, fmt.Sprintf("%s[%d]", path, i), "write one value", "%s is not a single value", shown(entry))
					continue
				}
				texts = append(texts, entry.Value)
			}
		} else if n.Kind != yaml.ScalarNode {
			texts = nil
		}
		if len(texts) == 0 {
			o.r.fault(n, path, columnRight+", or a list of names of which the file has one", "%s is no column", shown(n))
			return
		}
		names, or = append(names, texts[0]), append(or, others(texts))
		some = some || len(texts) > 1
	})
	if !some {
		or = nil
	}
	return names, or
}

// others returns all names but the first; nil for none.
func others(names []string) []string {
	if len(names) < 2 {
		return nil
	}
	return names[1:]
}

// zone reads a time's zone, and what is done where its clocks are changed.
func (o *object) zone(t *pipeline.TimeColumns) {
	const right = `write station for the station's standard time, an offset in quotes such as "+00:00", or a named zone such as America/Edmonton`
	epoch := t.Format == "epoch" || t.Format == "epoch_ms"
	if epoch {
		t.Zone = o.textOr("zone", "Z")
	} else {
		t.Zone = o.text("zone", right)
	}
	named := strings.Contains(t.Zone, "/")
	switch _, offset := parseOffset(t.Zone); {
	case epoch && t.Zone != "Z":
		o.r.fault(o.vals["zone"], o.at("zone"), "write Z, or leave it out", "%s counts from 1970 in UTC", t.Format)
	case t.Zone != "" && t.Zone != "station" && !offset && !named:
		o.r.fault(o.vals["zone"], o.at("zone"), right, "%q will not do", t.Zone)
	}
	if named {
		t.Ambiguous = oneOf(o, "ambiguous", "", pipeline.AmbiguousEarlier, pipeline.AmbiguousLater, pipeline.AmbiguousSetAside)
		t.Skipped = oneOf(o, "skipped", "", pipeline.SkippedShift, pipeline.SkippedSetAside)
		return
	}
	for _, key := range []string{"ambiguous", "skipped"} {
		if n := o.get(key); n != nil {
			o.r.fault(n, o.at(key), "leave it out", "only a named zone has hours that are there twice or not at all")
		}
	}
}

// when reads of which rows a value is: for each column, a text or a list of them.
func (o *object) when() map[string][]string {
	n := o.get("when")
	if n == nil {
		return nil
	}
	m := o.r.object(n, o.at("when"), n)
	out := map[string][]string{}
	for column, v := range m.vals {
		if v.Kind == yaml.SequenceNode {
			out[column] = m.texts(column)
		} else if text, given := m.scalar(column); given != nil {
			out[column] = []string{text}
		}
		if column == "" {
			o.r.fault(n, o.at("when"), columnRight, "a column has no name")
		}
		if len(out[column]) == 0 {
			m.missing(column, "write a text that the column has in the rows that are meant, or a list of them")
		}
	}
	if len(out) == 0 && !m.bad {
		o.missing("when", "write a column, and a text that it has in the rows that are meant")
	}
	return out
}

// scale reads a factor, which is 0 where it is 1, and what is added.
func (o *object) scale() (scale, offset float64) {
	const most = 1e9
	one, zero := 1.0, 0.0
	if scale = o.number("scale", &one, -most, most); math.Abs(scale) < 1/most && o.has("scale") {
		o.r.fault(o.vals["scale"], o.at("scale"), "write what the cell is to be multiplied by", "%g would leave nothing of it", scale)
	}
	if scale == 1 {
		scale = 0
	}
	return scale, o.number("offset", &zero, -most, most)
}
