package propose

import (
	"bytes"
	"errors"
	"fmt"
	"unicode/utf8"
)

// Bounds of what is looked at.
const (
	MaxSample  = 512 << 10 // bytes of all samples together; the rest is not looked at
	maxLine    = 16 << 10  // bytes of a line; rows of readings are far shorter
	maxColumns = 1000
)

// namesWithin is how many lines may be in another character set, as names may.
const namesWithin = 5

// badShare is the share of lines that may hold bytes that are no text: loggers
// that lost power leave a few (common practice, no source).
const badShare = 0.1

// sample is the text of a sample, by lines.
type sample struct {
	bytes []byte // the samples joined, as they are read by the proposed layout
	lines []line // without those that are blank or no text
	notes []string
}

// line is a line of the sample. Its number in the file is known in the first
// sample only; 0 otherwise.
type line struct {
	text   string
	number int
}

var byteOrderMark = []byte("\ufeff")

// gather splits samples into lines and refuses what is not text.
func gather(samples [][]byte) (*sample, error) {
	s := &sample{}
	left, bad, badLine, total := MaxSample, 0, 0, 0
	for i, piece := range samples {
		if len(piece) > left {
			piece = piece[:left]
			piece = piece[:bytes.LastIndexAny(piece, "\r\n")+1]
		}
		left -= len(piece)
		if i == 0 {
			if err := refuse(piece); err != nil {
				return nil, err
			}
			piece = bytes.TrimPrefix(piece, byteOrderMark)
		}
		if n := len(s.bytes); n > 0 && s.bytes[n-1] != '\n' && s.bytes[n-1] != '\r' {
			s.bytes = append(s.bytes, '\n')
		}
		s.bytes = append(s.bytes, piece...)
		number := 0
		for len(piece) > 0 {
			var text []byte
			text, piece = cutLine(piece)
			number++
			n := number
			if i > 0 {
				n = 0
			}
			if len(text) > maxLine {
				return nil, fmt.Errorf("%s is longer than %d bytes: that is no row of readings", at(n), maxLine)
			}
			if len(bytes.TrimSpace(text)) == 0 {
				continue
			}
			total++
			// Names may be in another character set: they are only shown.
			if bytes.IndexByte(text, 0) >= 0 || !utf8.Valid(text) && (i > 0 || total > namesWithin) {
				if bad++; badLine == 0 {
					badLine = n
				}
				continue
			}
			s.lines = append(s.lines, line{string(text), n})
		}
	}
	switch {
	case total == 0:
		return nil, errors.New("the file is empty: there is no line with text in it")
	case float64(bad) > badShare*float64(total):
		return nil, fmt.Errorf("%d of %d lines hold bytes that are no UTF-8 text, %s the first: save the file as UTF-8", bad, total, at(badLine))
	case bad > 0:
		s.notes = append(s.notes, fmt.Sprintf("%d of %d lines hold bytes that are no UTF-8 text; they will be set aside", bad, total))
	}
	return s, nil
}

// cutLine returns the first line, without its end, and what follows.
func cutLine(b []byte) (text, rest []byte) {
	i := bytes.IndexAny(b, "\r\n")
	if i < 0 {
		return b, nil
	}
	n := i + 1
	if b[i] == '\r' && n < len(b) && b[n] == '\n' {
		n++
	}
	return b[:i], b[n:]
}

// refuse says what a file that is not text is.
func refuse(b []byte) error {
	for _, known := range []struct{ begin, what string }{
		{"\x1f\x8b", "a gzip file: unpack it"},
		{"PK\x03\x04", "a zip file or a spreadsheet: unpack it, or save the sheet as CSV"},
		{"\xd0\xcf\x11\xe0", "an old spreadsheet: save the sheet as CSV"},
		{"%PDF", "a PDF document"},
		{"\x28\xb5\x2f\xfd", "a zstd file: unpack it"},
		{"\xff\xfe", "UTF-16 text: save it as UTF-8"},
		{"\xfe\xff", "UTF-16 text: save it as UTF-8"},
	} {
		if bytes.HasPrefix(b, []byte(known.begin)) {
			return errors.New("this is no table but " + known.what)
		}
	}
	odd := 0
	for _, c := range b {
		if c < ' ' && c != '\t' && c != '\r' && c != '\n' {
			odd++
		}
	}
	if odd*3 > len(b) {
		return fmt.Errorf("%d of %d bytes are no text, the first at byte %d: this is a binary file, or UTF-16 text that has to be saved as UTF-8",
			odd, len(b), 1+bytes.IndexFunc(b, func(r rune) bool { return r < ' ' && r != '\t' && r != '\r' && r != '\n' }))
	}
	return nil
}

// at names a line for a message.
func at(number int) string {
	if number == 0 {
		return "a line further on"
	}
	return fmt.Sprintf("line %d", number)
}
