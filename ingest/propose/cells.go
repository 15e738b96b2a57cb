package propose

import (
	"strings"

	"thawledger/ingest/normal"
)

// split cuts a line into cells by the rules of csvfeed: quotes as RFC 4180 has
// them, within the line, and blanks around a cell let be. Delimiter 0 is any run
// of blanks. ok is false if the quotes do not fit or there are too many cells.
func split(text string, delimiter byte, cells []string) (_ []string, ok bool) {
	ends := func(c byte) bool { return c == delimiter || delimiter == 0 && (c == ' ' || c == '\t') }
	skip := func(i int) int {
		for delimiter == 0 && i < len(text) && (text[i] == ' ' || text[i] == '\t') {
			i++
		}
		return i
	}
	for i := skip(0); ; {
		if len(cells) == maxColumns {
			return cells, false
		}
		var cell string
		if i < len(text) && text[i] == '"' {
			end := i + 1
			for {
				n := strings.IndexByte(text[end:], '"')
				if n < 0 {
					return cells, false
				}
				if end += n + 1; end == len(text) || text[end] != '"' {
					break
				}
				end++
			}
			if end < len(text) && !ends(text[end]) {
				return cells, false
			}
			cell = strings.ReplaceAll(text[i+1:end-1], `""`, `"`)
			i = end
		} else {
			end := i
			for end < len(text) && !ends(text[end]) {
				if text[end] == '"' {
					return cells, false
				}
				end++
			}
			cell = text[i:end]
			i = end
		}
		cells = append(cells, strings.Trim(cell, " \t"))
		if i == len(text) {
			return cells, true
		}
		if i = skip(i + 1); delimiter == 0 && i == len(text) {
			return cells, true
		}
	}
}

// isNumber reports whether a cell is a number such as the layout could read.
func isNumber(cell string) bool {
	_, err := normal.ParseNumber([]byte(cell))
	return err == nil
}

// hasDecimalComma reports whether a cell is a number but for its comma.
func hasDecimalComma(cell string) bool {
	return strings.Count(cell, ",") == 1 && !strings.Contains(cell, ".") && isNumber(strings.Replace(cell, ",", ".", 1))
}

// isDateLike reports whether a cell looks like a date or a time of the day, be
// it one that no layout reads.
func isDateLike(cell string) bool {
	digits, marks, letters := 0, 0, 0
	for i := range len(cell) {
		switch c := cell[i]; {
		case c >= '0' && c <= '9':
			digits++
		case strings.IndexByte("-/:.", c) >= 0:
			marks++
		case strings.IndexByte(" TZ+", c) >= 0:
		case c|0x20 >= 'a' && c|0x20 <= 'z':
			letters++ // of a month, or AM
		default:
			return false
		}
	}
	return digits >= 3 && marks >= 1 && (letters == 0 || letters <= 3 && digits >= 4) && cell[0] >= '0' && cell[0] <= '9'
}

// isData reports whether a cell is what rows have and names have not.
func isData(cell string) bool { return isNumber(cell) || isDateLike(cell) || hasDecimalComma(cell) }
