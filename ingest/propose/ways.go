package propose

import (
	"math"
	"slices"
)

// singleColumns returns the ways to read times from one column.
func (t *table) singleColumns() (out []*timing) {
	for _, c := range t.columns {
		c.shape = shapeOf(c.cells)
		if c.shape == nil {
			continue
		}
		for _, f := range c.shape.forms() {
			out = append(out, &timing{form: f, columns: []*column{c}})
		}
	}
	return out
}

// withClocks returns the ways to read a date from one column and the time of the
// day from another.
func (t *table) withClocks(dates []*timing) (out []*timing) {
	for _, d := range dates {
		if hasHour(d.format) {
			continue
		}
		for _, c := range t.columns {
			next := c.index == d.columns[0].index+1
			if c == d.columns[0] || c.shape == nil || c.filled == 0 {
				continue
			}
			f, ok := c.shape.clock()
			if !ok || !hasHour(f.format) {
				continue
			}
			if c.isRun() && !(next && c.name == "") && !c.has("hour", "hr", "hh", "time", "utc") {
				continue // any small whole number would do
			}
			zone := d.zone
			if f.zone != "" {
				zone = f.zone
			}
			out = append(out, &timing{form: form{d.format + " " + f.format, zone, d.order}, columns: []*column{d.columns[0], c}})
		}
	}
	return out
}

func hasHour(format string) bool { return slices.Contains([]byte(format), 'h') }

// fromFields returns the ways to read times from columns for year, month, day
// and so on.
func (t *table) fromFields() (out []*timing) {
	for i, c := range t.columns {
		year := c.yearField()
		if year == "" {
			continue
		}
		near := func(by int) *column {
			if j := i + by; j >= 0 && j < len(t.columns) {
				return t.columns[j]
			}
			return nil
		}
		month, day := t.called("month", "mo", "mon"), t.called("day", "dy", "dd", "dom")
		ofYear := t.called("doy", "jday", "julian", "yday")
		if day == nil && ofYear == nil && month == nil {
			month, day, ofYear = near(1), near(2), near(1)
			out = append(out, t.fields("DMY", field{near(-2), "D"}, field{near(-1), "M"}, field{c, year})...)
			out = append(out, t.fields("MDY", field{near(-2), "M"}, field{near(-1), "D"}, field{c, year})...)
		}
		if ofYear == nil {
			ofYear = day
		}
		out = append(out, t.fields("YMD", field{c, year}, field{month, "M"}, field{day, "D"})...)
		for _, w := range t.fields("YD", field{c, year}, field{ofYear, "DDD"}) {
			if month == nil || month == ofYear || w.suits(month) {
				out = append(out, w)
			}
		}
	}
	return out
}

// suits reports whether the months of most rows are those of a column, if it
// holds months at all.
func (w *timing) suits(month *column) bool {
	if !month.isOf(1, 12) || !w.try(len(month.values)) {
		return true
	}
	n, same := 0, 0
	for row, v := range month.values {
		if d, ok := w.day(row); ok && !math.IsNaN(v) {
			_, m, _ := d.Date()
			if n++; int(m) == int(v) {
				same++
			}
		}
	}
	return same*10 >= n*9
}

// called returns the column for which a date's field is the name.
func (t *table) called(words ...string) *column {
	for _, c := range t.columns {
		if n := len(c.words); n > 0 && n <= 3 && c.has(words...) && c.isOf(0, 366) {
			return c
		}
	}
	return nil
}

// yearField returns the field that reads the column's years; "" if it has none.
func (c *column) yearField() string {
	switch {
	case !c.isRun():
	case c.shape.runs[0].is(4) && c.isOf(firstYear, lastYear):
		return "YYYY"
	case c.shape.runs[0].is(2) && c.has("year", "yr", "yy"):
		return "YY"
	}
	return ""
}

// isRun reports whether the cells are digits only.
func (c *column) isRun() bool {
	return c.shape != nil && len(c.shape.runs) == 1 && c.shape.between[0] == "" && c.shape.between[1] == ""
}

// field is a column that holds a field of a date.
type field struct {
	column *column
	field  string
}

// fields returns the ways to read a date from columns of its fields, and with
// the hour and minute beside it.
func (t *table) fields(order string, list ...field) []*timing {
	w := &timing{form: form{order: order}}
	for _, f := range list {
		most := map[string]float64{"M": 12, "D": 31, "DDD": 366}[f.field]
		if f.column == nil || slices.Contains(w.columns, f.column) || !f.column.isRun() || most > 0 && !f.column.isOf(1, most) {
			return nil
		}
		name := f.field
		if f.field == "M" || f.field == "D" {
			name = f.column.shape.runs[0].short(f.field, false)
		}
		w.add(f.column, name)
	}
	out := []*timing{w} // the finest first
	hour := t.named("hour", "hr", "hh", "time")
	if last := w.columns[len(w.columns)-1].index; hour == nil && last+1 < len(t.columns) && t.columns[last+1].name == "" {
		hour = t.columns[last+1]
	}
	if hour == nil || hour.shape == nil || slices.Contains(w.columns, hour) {
		return out
	}
	f, ok := hour.shape.clock()
	if !ok || !hasHour(f.format) {
		return out
	}
	timed := &timing{form: form{format: w.format, zone: f.zone, order: order}, columns: slices.Clone(w.columns)}
	timed.add(hour, f.format)
	out = slices.Insert(out, 0, timed)
	minute := t.named("minute", "minutes")
	if next := hour.index + 1; minute == nil && next < len(t.columns) && t.columns[next].has("min", "mn", "mi") && t.columns[next].isOf(0, 59) {
		minute = t.columns[next]
	}
	if minute != nil && minute.isRun() && len(f.format) <= 2 && minute.shape.runs[0].is(2) {
		finer := &timing{form: timed.form, columns: slices.Clone(timed.columns)}
		finer.add(minute, "mm")
		out = slices.Insert(out, 0, finer)
	}
	return out
}

func (w *timing) add(c *column, format string) {
	if len(w.columns) > 0 {
		w.format += " "
	}
	w.columns, w.format = append(w.columns, c), w.format+format
}

// named returns the first column that a word names.
func (t *table) named(words ...string) *column {
	for _, c := range t.columns {
		if c.has(words...) && len(c.words) <= 3 {
			return c
		}
	}
	return nil
}
