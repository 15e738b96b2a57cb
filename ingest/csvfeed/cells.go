package csvfeed

import (
	"bytes"
	"fmt"
	"unicode/utf8"

	"thawledger/ingest/normal"
)

// cells splits a line into its cells, with the quoting of RFC 4180 if at all.
type cells struct {
	delimiter byte
	blanks    bool  // any run of blanks delimits; delimiter does not count then
	widths    []int // characters of each cell, if nothing delimits them
	unquoted  bool  // quotes are text
	need      int   // how many cells are wanted; the others are only counted

	list  [][]byte // the first need cells, valid until the next split
	width int      // cells of the line
	plain []byte   // cells whose doubled quotes are made single
}

// quoteFault is a quote where RFC 4180 has none.
type quoteFault struct {
	column int // from 1
	at     int // byte of the line, from 0
	kind   quoteKind
}

type quoteKind string

const (
	notClosed   quoteKind = "is not closed on its line; a quote inside a quoted cell is written twice"
	insidePlain quoteKind = "stands inside a cell that does not begin with one; such a cell is quoted whole and its quotes written twice"
	textAfter   quoteKind = "closes its cell, but more text follows; a quote inside a quoted cell is written twice"
)

// text says where the stray quote of line is and what would be right.
func (f quoteFault) text(line []byte) string {
	return fmt.Sprintf("the quote at character %d, in column %d, %s", len(bytes.Runes(line[:f.at]))+1, f.column, f.kind)
}

// split splits one line; ok is false if its quotes do not fit.
func (c *cells) split(line []byte) (fault quoteFault, ok bool) {
	c.list, c.plain, c.width = c.list[:0], c.plain[:0], 0
	if c.widths != nil {
		c.cut(line)
		return fault, true
	}
	quoted := !c.unquoted && bytes.IndexByte(line, '"') >= 0
	i := 0
	if c.blanks {
		i = skipBlanks(line, 0)
		if i == len(line) {
			return fault, true
		}
	}
	for {
		if !quoted && !c.blanks && c.width == c.need {
			c.width += bytes.Count(line[i:], []byte{c.delimiter}) + 1
			return fault, true
		}
		var cell []byte
		if quoted && i < len(line) && line[i] == '"' {
			var end int
			if cell, end, ok = c.quotedCell(line, i); !ok {
				return quoteFault{c.width + 1, i, notClosed}, false
			}
			if end < len(line) && !c.delimits(line[end]) {
				return quoteFault{c.width + 1, end - 1, textAfter}, false
			}
			i = end
		} else {
			end := c.plainEnd(line, i)
			cell = line[i:end]
			if quoted {
				if q := bytes.IndexByte(cell, '"'); q >= 0 {
					return quoteFault{c.width + 1, i + q, insidePlain}, false
				}
			}
			i = end
		}
		if c.width < c.need {
			c.list = append(c.list, cell)
		}
		c.width++
		if i == len(line) {
			return fault, true
		}
		i++
		if c.blanks {
			if i = skipBlanks(line, i); i == len(line) {
				return fault, true
			}
		}
	}
}

// cut takes cells by their widths in characters; the last has all that is left.
// Those that the line does not reach are empty: editors cut blanks at its end.
func (c *cells) cut(line []byte) {
	c.width = len(c.widths)
	for i, width := range c.widths[:min(c.width, c.need)] {
		end := len(line)
		if i < c.width-1 {
			for end = 0; width > 0 && end < len(line); width-- {
				if line[end] < utf8.RuneSelf {
					end++
					continue
				}
				_, size := utf8.DecodeRune(line[end:])
				end += size
			}
		}
		c.list = append(c.list, line[:end])
		line = line[end:]
	}
}

// quotedCell returns the text of the quoted cell that begins at i, and the byte
// after its closing quote.
func (c *cells) quotedCell(line []byte, i int) (cell []byte, end int, ok bool) {
	i++
	n := bytes.IndexByte(line[i:], '"')
	if n < 0 {
		return nil, 0, false
	}
	if end = i + n + 1; end == len(line) || line[end] != '"' {
		return line[i : i+n], end, true
	}
	from := len(c.plain)
	for {
		c.plain = append(c.plain, line[i:i+n]...)
		i += n + 1
		if i == len(line) || line[i] != '"' {
			return c.plain[from:], i, true
		}
		c.plain = append(c.plain, '"')
		i++
		if n = bytes.IndexByte(line[i:], '"'); n < 0 {
			return nil, 0, false
		}
	}
}

// plainEnd returns the byte after the unquoted cell that begins at i. Cells are
// short, so a plain loop beats a search.
func (c *cells) plainEnd(line []byte, i int) int {
	for i < len(line) && !c.delimits(line[i]) {
		i++
	}
	return i
}

func (c *cells) delimits(b byte) bool {
	return b == c.delimiter || c.blanks && b == '\t'
}

func skipBlanks(line []byte, i int) int {
	for i < len(line) && (line[i] == ' ' || line[i] == '\t') {
		i++
	}
	return i
}

// blank reports whether a line holds blanks only. A blank that delimits is a cell's.
func (c *cells) blank(line []byte) bool {
	rest := normal.Trim(line)
	return len(rest) == 0 && (c.blanks || bytes.IndexByte(line, c.delimiter) < 0)
}
