package propose

import (
	"errors"
	"fmt"
	"slices"
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
	triedLines  = 400 // lines by which the delimiter is found
	leastShare  = 0.5 // of lines that must have the same number of columns
	headerShare = 0.2 // of cells that may look like data in a line of names
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
	for _, l := range lines {
		if cells, ok := split(l.text, char, nil); ok && len(cells) == width {
			rows = append(rows, row{cells, l.number, false})
		} else {
			t.others = append(t.others, l.text)
		}
	}
	rows = t.takeNames(rows, width)
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
				if cell == "" || isNumber(cell) || isDateLike(cell) || d.char != ',' && hasDecimalComma(cell) {
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
			if score > best+1e-9 || score > best-1e-9 && d.name == t.delimiter && w > width {
				best, t.delimiter, char, width = score, d.name, d.char, w
			}
		}
	}
	return char, width
}

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
