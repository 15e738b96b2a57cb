package csvfeed

import (
	"maps"
	"slices"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// condition is a column and the texts of which a row has to have one there.
type condition struct {
	column string
	texts  []string
}

// conditions returns those of a value, all of which have to hold.
func conditions(c *pipeline.ValueColumn) []condition {
	var when []condition
	for _, column := range slices.Sorted(maps.Keys(c.When)) {
		when = append(when, condition{column, slices.Clone(c.When[column])})
	}
	return when
}

// apart reports whether no row can fulfil both: whether there is a column in
// which they ask for different texts.
func apart(a, b []condition) bool {
	for _, x := range a {
		for _, y := range b {
			if x.column == y.column && !slices.ContainsFunc(x.texts, func(text string) bool { return slices.Contains(y.texts, text) }) {
				return true
			}
		}
	}
	return false
}

// choose finds the values that are of the row.
func (d *decoder) choose() {
	d.chosen = d.chosen[:0]
	for i := range d.plan.values {
		if d.applies(i) {
			d.chosen = append(d.chosen, i)
		}
	}
}

// applies reports whether the row has what value i asks for.
func (d *decoder) applies(i int) bool {
conditions:
	for k, w := range d.plan.values[i].when {
		cell := normal.Trim(d.cells.list[d.columns.when[i][k]])
		for _, text := range w.texts {
			if string(cell) == text {
				continue conditions
			}
		}
		return false
	}
	return true
}
