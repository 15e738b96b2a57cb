package csvfeed

import (
	"fmt"
	"slices"
	"strings"

	"thawledger/ingest/normal"
)

// columns is where a file has what the layout names; indices are from 0.
type columns struct {
	time    []int
	station int // -1 if no column says it
	values  []int
	flags   []int   // by value; -1 for none
	when    [][]int // by value, those of its conditions
	names   []string
	width   int // cells that a row has; 0 until it is known
	need    int // cells that hold all that is mapped
}

// resolve finds the layout's columns among names, which are those of line; names
// is nil if the file has none.
func (p *Plan) resolve(names []string, line int64) (*columns, error) {
	r := resolver{names: names}
	c := &columns{names: names, width: len(names), station: -1}
	for _, names := range p.timeColumns {
		c.time = append(c.time, r.find(names))
	}
	if p.stationColumn != nil {
		c.station = r.find(p.stationColumn)
	}
	for i := range p.values {
		v := &p.values[i]
		n := r.find(v.columns)
		for j, other := range c.values {
			if other == n && n >= 0 && !apart(p.values[j].when, v.when) {
				r.fault(v.columns[0], fmt.Sprintf("columns %q and %q of the layout are one", p.values[j].columns[0], v.columns[0]))
				break
			}
		}
		c.values = append(c.values, n)
		flag := -1
		if v.flag != nil {
			flag = r.find(v.flag)
		}
		c.flags = append(c.flags, flag)
		var when []int
		for _, w := range v.when {
			when = append(when, r.find([]string{w.column}))
		}
		c.when = append(c.when, when)
	}
	c.need = r.most + 1
	if len(r.faults) == 0 {
		return c, nil
	}
	text := strings.Join(r.faults, "; ")
	if r.absent {
		text += "; the columns are " + list(names)
	}
	return nil, &HoldError{Line: line, Column: r.column, Text: text}
}

// resolver finds columns and gathers what cannot be found.
type resolver struct {
	names  []string
	most   int // highest index found
	column string
	faults []string
	absent bool
}

// find returns the index of a column that the layout names by name or number, or
// by several names of which the file has to have one; -1 after a fault.
func (r *resolver) find(names []string) int {
	if len(names) == 1 {
		return r.findOne(names[0])
	}
	var there []string
	for _, name := range names {
		if slices.Contains(r.names, trim(name)) {
			there = append(there, name)
		}
	}
	switch len(there) {
	case 0:
		r.absent = true
		r.fault(names[0], "there is none of the columns "+list(names))
		return -1
	case 1:
		return r.findOne(there[0])
	}
	r.fault(names[0], fmt.Sprintf("the columns %s are there together, and the layout takes them for one; name the right one only", list(there)))
	return -1
}

func (r *resolver) findOne(name string) int {
	n, isNumber := columnNumber(name)
	if r.names == nil {
		r.most = max(r.most, n-1)
		return n - 1
	}
	at := slices.Index(r.names, trim(name))
	if at >= 0 {
		if again := slices.Index(r.names[at+1:], trim(name)); again >= 0 {
			r.fault(name, fmt.Sprintf("columns %d and %d are both named %q; give the number of the right one", at+1, at+2+again, name))
			return -1
		}
		r.most = max(r.most, at)
		return at
	}
	switch {
	case isNumber && n <= len(r.names):
		r.most = max(r.most, n-1)
		return n - 1
	case isNumber:
		r.fault(name, fmt.Sprintf("there is no column %d; the last is %d", n, len(r.names)))
	default:
		r.absent = true
		text := fmt.Sprintf("there is no column %q", name)
		if near := nearest(name, r.names); near != "" {
			text += fmt.Sprintf(", the nearest is %q", near)
		}
		r.fault(name, text)
	}
	return -1
}

func (r *resolver) fault(name, text string) {
	if len(r.faults) == 0 {
		r.column = name
	}
	if !slices.Contains(r.faults, text) {
		r.faults = append(r.faults, text)
	}
}

// describe names a column for a message, by its index.
func (c *columns) describe(i int) string {
	if name := c.name(i); name != "" {
		return fmt.Sprintf("column %d %s", i+1, normal.Quote([]byte(name)))
	}
	return fmt.Sprintf("column %d", i+1)
}

func (c *columns) name(i int) string {
	if i < len(c.names) {
		return c.names[i]
	}
	return ""
}

// maxListed is how many names a message lists.
const maxListed = 40

// list writes names for a message.
func list(names []string) string {
	var quoted []string
	for _, name := range names[:min(len(names), maxListed)] {
		quoted = append(quoted, normal.Quote([]byte(name)))
	}
	text := strings.Join(quoted, ", ")
	if more := len(names) - maxListed; more > 0 {
		text += fmt.Sprintf(" and %d more", more)
	}
	return text
}

// Of how many names, and of how many letters of each, the nearest is sought.
const (
	maxCompared = 1000
	maxLetters  = 64
)

// nearest returns the name that the fewest changed letters make of want; "" if
// that would be more than half of them.
func nearest(want string, names []string) string {
	w := letters(want)
	best, fewest := "", len(w)/2+1
	for _, name := range names[:min(len(names), maxCompared)] {
		if d := distance(w, letters(name)); d < fewest {
			best, fewest = name, d
		}
	}
	return best
}

func letters(s string) []rune {
	r := []rune(strings.ToLower(s[:min(len(s), 4*maxLetters)]))
	return r[:min(len(r), maxLetters)]
}

// distance counts the letters to be put in, left out or changed to turn a into b
// (V. I. Levenshtein, Soviet Physics Doklady 10, 1966, 707-710).
func distance(a, b []rune) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i, x := range a {
		diagonal := row[0]
		row[0] = i + 1
		for j, y := range b {
			change := diagonal
			if x != y {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
