package propose

import (
	"errors"
	"fmt"
	"strings"
)

// table is a sample cut into columns.
type table struct {
	delimiter string // as a layout has it
	comment   string
	namesLine int
	byNumber  bool // columns cannot be called by name
	columns   []*column
	rows      int
	others    []string // lines that are neither names nor rows
	notes     []string
}

// delimiters are tried in this order; of equals the first is taken.
var delimiters = []struct {
	name string
	char byte
}{{"\t", '\t'}, {";", ';'}, {",", ','}, {"|", '|'}, {"space", 0}}

// Bounds of judgement; no source.
const (
	triedLines = 400 // lines by which the delimiter is found
	leastShare = 0.5 // of lines that must have the same number of columns
)

// tabulate finds the delimiter, the names and the rows.
func tabulate(s *sample) (*table, error) {
	t := &table{}
	t.findComment(s.lines)
	var lines, remarks []line
	for _, l := range s.lines {
		if t.comment != "" && strings.HasPrefix(l.text, t.comment) {
			remarks = append(remarks, l)
			t.others = append(t.others, l.text)
		} else {
			lines = append(lines, l)
		}
	}
	char, width := t.findDelimiter(lines)
	if width < 2 {
		return nil, fmt.Errorf("nothing like a table was found: %s, %s, is not cut into as many columns as the other lines by tab, semicolon, comma, | or blanks",
			at(s.lines[0].number), shown(s.lines[0].text))
	}
	rows := t.remarkedNames(remarks, lines[0], char, width)
	var before []line // that are no rows, before the first
	for _, l := range lines {
		if cells, ok := split(l.text, char, nil); ok && len(cells) == width {
			rows = append(rows, row{cells, l.number, false})
			continue
		}
		t.others = append(t.others, l.text)
		if l.number > 0 && len(rows) == 0 {
			before = append(before, l)
		}
	}
	rows = t.takeNames(rows, width)
	if t.namesLine == 0 && t.comment == "" && len(before) > 0 {
		t.passOver(before[len(before)-1], lines)
		t.shortNames(before[len(before)-1], char, rows)
	}
	if len(rows) == 0 {
		return nil, errors.New("there are column names at most, and no rows with dates and numbers: a layout is found by what is in the rows, so take a file that has some")
	}
	t.rows = len(rows)
	for i, c := range t.columns {
		c.fill(rows, i)
	}
	return t, nil
}

// row is a line that has the table's number of columns.
type row struct {
	cells  []string
	number int  // of the line; 0 if it is not known
	remark bool // it is a comment
}

// findComment takes for a comment mark what no row of readings begins with.
func (t *table) findComment(lines []line) {
	for _, mark := range []string{"#", "//", "!", "%"} {
		n := 0
		for _, l := range lines {
			if strings.HasPrefix(l.text, mark) {
				n++
			}
		}
		if n > 0 && n < len(lines) {
			t.comment = mark
			return
		}
	}
}

// findDelimiter returns the delimiter that cuts the lines most evenly into cells
// like those of a table, and how many columns it gives.
func (t *table) findDelimiter(lines []line) (char byte, width int) {
	step := max(1, len(lines)/triedLines)
	best := 0.0
	var cells []string
	for _, d := range delimiters {
		widths := map[int]int{}
		good := map[int]int{}
		tried := 0
		for i := 0; i < len(lines); i += step {
			tried++
			var ok bool
			if cells, ok = split(lines[i].text, d.char, cells[:0]); !ok {
				continue
			}
			widths[len(cells)]++
			for _, cell := range cells {
				if cell == "" || standsForNothing(cell) || isNumber(cell) || isDateLike(cell) || d.char != ',' && hasDecimalComma(cell) {
					good[len(cells)]++
				}
			}
		}
		for w, n := range widths {
			share := float64(n) / float64(tried)
			if w < 2 || share < leastShare {
				continue
			}
			// Columns of text say nothing for or against a delimiter.
			score := share * (0.1 + float64(good[w])/float64(n*w))
			if d.char == 0 {
				score *= 0.9 // a blank may stand between a date and its time
			}
			if score > best+1e-9 || score > best-1e-9 && d.name == t.delimiter && w > width {
				best, t.delimiter, char, width = score, d.name, d.char, w
			}
		}
	}
	return char, width
}
