package propose

import (
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"thawledger/ingest/normal"
)

// column is what the rows have at one place.
type column struct {
	index    int
	name     string // as the header has it; "" for none
	unit     string // what further header lines say
	words    []string
	callable bool // a layout may call it by name

	shape    *shape // of the cells; nil for none
	cells    []string
	filled   int // cells that are not empty
	numeric  int
	values   []float64      // of each row; NaN where there is no number
	texts    map[string]int // of cells that are no numbers
	distinct map[string]int
	whole    bool     // all numbers are whole
	missing  []string // texts that stand for no value
	doubtful []string // those of missing that are numbers
	unknown  []string // texts that are neither numbers nor known to stand for none
}

// maxDistinct is how many different texts of a column are told apart.
const maxDistinct = 400

// callable reports whether a layout may call a column by this name, and a person
// type it.
func callable(name string) bool {
	if name == "" || !utf8.ValidString(name) || strings.ContainsRune(name, utf8.RuneError) || len(name) > 100 {
		return false
	}
	_, err := strconv.Atoi(name)
	return err != nil && !strings.ContainsFunc(name, func(r rune) bool { return !strconv.IsPrint(r) })
}

func (c *column) setName(name string) {
	c.name = strings.ToValidUTF8(name, "\ufffd")
	c.words = wordsOf(c.name)
}

// ref is how a layout calls the column.
func (c *column) ref() string {
	if c.callable {
		return c.name
	}
	return strconv.Itoa(c.index + 1)
}

// called is how a question calls it.
func (c *column) called() string {
	if c.callable || c.name == "" {
		return shown(c.ref())
	}
	return c.ref() + " (" + shown(c.name) + ")"
}

func (c *column) has(words ...string) bool {
	return slices.ContainsFunc(words, func(w string) bool { return slices.Contains(c.words, w) })
}

// fill takes the column's cells from the rows.
func (c *column) fill(rows []row, at int) {
	c.cells, c.values = make([]string, len(rows)), make([]float64, len(rows))
	c.texts, c.distinct, c.whole = map[string]int{}, map[string]int{}, true
	for i, r := range rows {
		cell := r.cells[at]
		c.cells[i], c.values[i] = cell, math.NaN()
		if cell == "" {
			continue
		}
		c.filled++
		if n, seen := c.distinct[cell]; seen || len(c.distinct) < maxDistinct {
			c.distinct[cell] = n + 1
		}
		v, err := normal.ParseNumber([]byte(cell))
		if err != nil {
			if n, seen := c.texts[cell]; seen || len(c.texts) < maxDistinct {
				c.texts[cell] = n + 1
			}
			continue
		}
		c.numeric++
		c.values[i] = v
		c.whole = c.whole && v == math.Trunc(v)
	}
	c.findMissing()
}

// bounds returns the lowest and highest value; ok is false if there is none.
func (c *column) bounds() (lo, hi float64, ok bool) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, v := range c.values {
		if !math.IsNaN(v) {
			lo, hi = min(lo, v), max(hi, v)
		}
	}
	return lo, hi, lo <= hi
}

// isOf reports whether all numbers are whole and within bounds, and there is
// hardly anything else.
func (c *column) isOf(lo, hi float64) bool {
	l, h, ok := c.bounds()
	return ok && c.whole && l >= lo && h <= hi && c.numeric*10 >= c.filled*9
}

// shown quotes a text of the file for a message.
func shown(text string) string {
	if strings.ContainsFunc(text, func(r rune) bool { return !strconv.IsPrint(r) || r == '"' || r == '\\' }) || len(text) > 60 {
		return normal.Quote([]byte(text))
	}
	return `"` + text + `"`
}
