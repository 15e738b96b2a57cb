package propose

import (
	"fmt"
	"slices"
	"strings"
	"unicode"
)

// takeNames sets the columns, with their names, and returns the rows.
func (t *table) takeNames(rows []row, width int) []row {
	namesLike := t.namesLike(rows, width)
	first := slices.IndexFunc(rows, func(r row) bool { return !namesLike(r) })
	if first < 0 {
		first = len(rows)
	}
	var names []string
	var units [][]string
	for _, r := range rows[:first] {
		if r.number == 0 || r.number > maxNamesLine {
			break
		}
		if names == nil || filled(r.cells) > filled(names) && filled(names)*2 < width {
			if names != nil {
				units = append(units, names)
			}
			names, t.byNumber = r.cells, r.remark
		} else {
			units = append(units, r.cells)
			t.byNumber = t.byNumber || !r.remark
		}
		if !r.remark {
			t.namesLine = r.number
		}
	}
	for i := range width {
		c := &column{index: i}
		if names != nil {
			c.setName(names[i])
			c.callable = !t.byNumber && callable(names[i]) && count(names, names[i]) == 1
			for _, u := range units {
				c.unit += " " + u[i]
			}
		}
		t.columns = append(t.columns, c)
	}
	rows = rows[first:]
	kept := slices.DeleteFunc(rows, namesLike)
	if n := len(rows) - len(kept); n > 0 && names != nil {
		t.notes = append(t.notes, fmt.Sprintf("%d lines further on look like names again; they will be set aside", n))
	}
	if t.byNumber && t.namesLine > 0 {
		t.notes = append(t.notes, fmt.Sprintf("there are several lines of names and units, down to line %d: columns are called by number, so that none of these lines counts as a row", t.namesLine))
	}
	return kept
}

// headerShare is the share of cells that may look like data in a line of names
// (judgement, no source).
const headerShare = 0.2

// maxNamesLine is the highest names_line that settings take.
const maxNamesLine = 1000

// namesLike returns what tells names, and units, from rows: text where the other
// lines have data.
func (t *table) namesLike(rows []row, width int) func(row) bool {
	typed := make([]bool, width)
	for i := range typed {
		data, text := 0, 0
		for _, r := range rows {
			if isData(r.cells[i]) {
				data++
			} else if r.cells[i] != "" {
				text++
			}
		}
		typed[i] = data > 0 && data*3 >= text
	}
	if !slices.Contains(typed, true) { // there are no rows but, it may be, names
		return func(row) bool { return true }
	}
	return func(r row) bool {
		data, text := 0, 0
		for i, cell := range r.cells {
			switch {
			case !typed[i] || cell == "":
			case isData(cell):
				data++
			default:
				text++
			}
		}
		return text > 0 && float64(data) <= headerShare*float64(data+text)
	}
}

func count(list []string, text string) (n int) {
	for _, s := range list {
		if s == text {
			n++
		}
	}
	return n
}

func filled(cells []string) (n int) {
	for _, c := range cells {
		if c != "" {
			n++
		}
	}
	return n
}

// remarkedNames returns the comments before the first line that may hold names.
func (t *table) remarkedNames(remarks []line, first line, char byte, width int) (out []row) {
	for _, r := range remarks {
		if r.number == 0 || first.number > 0 && r.number > first.number {
			break
		}
		cells, ok := split(strings.TrimLeft(r.text, t.comment+" "), char, nil)
		if ok && len(cells) == width && !slices.ContainsFunc(cells, isData) {
			out = append(out, row{cells, r.number, true})
		}
	}
	return out
}

// passOver makes a comment of a line before the rows that has not as many columns
// as they have: no names line can be it, and no row is to be counted by it.
func (t *table) passOver(head line, lines []line) {
	text := []rune(head.text)
	for n := 1; n <= min(len(text), longestMark); n++ {
		mark := string(text[:n])
		alone := n >= min(4, len(text)) && !strings.ContainsRune(mark, unicode.ReplacementChar)
		for _, l := range lines {
			alone = alone && (l == head || !strings.HasPrefix(l.text, mark))
		}
		if alone && isPrintable(mark) {
			t.comment = mark
			t.notes = append(t.notes, fmt.Sprintf("%s, %s, has not as many columns as the rows, so columns are called by number; to be passed over it is declared as a comment", at(head.number), shown(head.text)))
			return
		}
	}
}

// longestMark is how long a comment mark is made.
const longestMark = 20

// shortNames takes names from a line that lacks but the end of the rows, where
// they have nothing.
func (t *table) shortNames(head line, char byte, rows []row) {
	names, ok := split(head.text, char, nil)
	if !ok || len(names) != len(t.columns)-1 || slices.ContainsFunc(names, isData) || char == 0 {
		return
	}
	if slices.ContainsFunc(rows, func(r row) bool { return r.cells[len(names)] != "" }) {
		return
	}
	for i, name := range names {
		t.columns[i].setName(name)
	}
}
