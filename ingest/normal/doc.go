// Package normal turns the text of cells into times, numbers and temperatures:
//
//	"2031-07-20 13:00" -> civil day and second -> UTC, once the zone is known
//	"54.5"             -> number -> degC
//
// It promises one reading of each text, the same for ever, and an error that
// says what was found and what would be right. It refuses what could be read in
// two ways (a decimal comma or a date without its century that was not announced,
// a time that a zone's clocks show twice and no rule is given for), dates that no
// calendar has, and fractions of a second. A zone is a fixed offset, as a station's
// standard time is, or a named one. Nothing here keeps state, and the way of good
// input allocates nothing.
package normal

import (
	"strconv"
	"unicode/utf8"
)

// maxQuoted is how many bytes of a cell an error repeats.
const maxQuoted = 60

// Quote returns text in double quotes for a message, cut if it is long.
func Quote(text []byte) string {
	if len(text) <= maxQuoted {
		return strconv.Quote(string(text))
	}
	end := maxQuoted
	for end > maxQuoted-utf8.UTFMax && !utf8.RuneStart(text[end]) {
		end--
	}
	return strconv.Quote(string(text[:end])) + "..."
}

// Trim returns text without leading and trailing blanks (space and tab).
func Trim(text []byte) []byte {
	for len(text) > 0 && (text[0] == ' ' || text[0] == '\t') {
		text = text[1:]
	}
	for len(text) > 0 && (text[len(text)-1] == ' ' || text[len(text)-1] == '\t') {
		text = text[:len(text)-1]
	}
	return text
}

// found quotes the character at byte i of text and says where it is.
func found(text []byte, i int) string {
	r, size := utf8.DecodeRune(text[i:])
	c := strconv.QuoteRune(r)
	if r == utf8.RuneError && size == 1 {
		c = `'\x` + strconv.FormatUint(uint64(text[i])|0x100, 16)[1:] + "'"
	}
	return "found " + c + " at character " + strconv.Itoa(utf8.RuneCount(text[:i])+1)
}
