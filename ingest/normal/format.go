package normal

import (
	"errors"
	"fmt"
	"strings"
)

// TimeFormat is a declared form of times, made ready for reading. It may be
// used by several goroutines at once.
type TimeFormat struct {
	text  string
	parts []part
	has   [numKinds]bool
}

// kind is what a part of a format stands for.
type kind uint8

const (
	literal kind = iota
	year         // YYYY, and YY with its century added
	month
	day
	yearDay
	hour
	minute
	second
	numKinds
)

var kindNames = [numKinds]string{"", "year", "month", "day", "day of the year", "hour", "minute", "second"}

// part is a field of a format, or a byte that stands for itself.
type part struct {
	kind     kind
	char     byte   // of a literal
	field    string // as the format writes it
	min, max int    // digits
}

// fields are the fields that a format may have: YYYY YY MM M D DD DDD hh h mm ss.
var fields = map[string]part{
	"YYYY": {kind: year, min: 4, max: 4}, "YY": {kind: year, min: 2, max: 2},
	"MM": {kind: month, min: 2, max: 2}, "M": {kind: month, min: 1, max: 2},
	"DD": {kind: day, min: 2, max: 2}, "D": {kind: day, min: 1, max: 2},
	"DDD": {kind: yearDay, min: 1, max: 3},
	"hh":  {kind: hour, min: 2, max: 2}, "h": {kind: hour, min: 1, max: 2},
	"mm": {kind: minute, min: 2, max: 2}, "ss": {kind: second, min: 2, max: 2},
}

// CompileTime makes a format ready. Its fields are YYYY YY MM M D DD DDD (day of
// the year) hh h mm ss; any other character stands for itself, T and Z
// included. M, D and h take one or two digits, DDD one to three; the others take
// as many as they have letters. YY is 1969 to 2068, as POSIX strptime has it.
// DDD takes exactly three digits where a field follows at once; M, D and h must
// not be followed so, since nothing would say where they end.
//
// A format needs a year and either month and day or the day of the year, and
// no minutes without hours, nor seconds without minutes.
func CompileTime(format string) (*TimeFormat, error) {
	f := &TimeFormat{text: format}
	for i := 0; i < len(format); {
		c := format[i]
		if !strings.ContainsRune("YMDhms", rune(c)) {
			f.parts = append(f.parts, part{kind: literal, char: c})
			i++
			continue
		}
		end := i + 1
		for end < len(format) && format[end] == c {
			end++
		}
		p, known := fields[format[i:end]]
		if !known {
			return nil, fmt.Errorf("format %q: %s is no field; fields are YYYY YY MM M D DD DDD hh h mm ss", format, format[i:end])
		}
		if f.has[p.kind] {
			return nil, fmt.Errorf("format %q: the %s is there twice", format, kindNames[p.kind])
		}
		p.field = format[i:end]
		f.has[p.kind] = true
		f.parts = append(f.parts, p)
		i = end
	}
	if err := f.checkWidths(); err != nil {
		return nil, err
	}
	if err := f.checkFields(); err != nil {
		return nil, fmt.Errorf("format %q: %w", format, err)
	}
	return f, nil
}

// checkWidths sees to it that every field's end can be told.
func (f *TimeFormat) checkWidths() error {
	for i := range len(f.parts) - 1 {
		p, next := &f.parts[i], f.parts[i+1]
		digits := next.kind != literal || '0' <= next.char && next.char <= '9'
		if p.min == p.max || !digits {
			continue
		}
		if p.kind != yearDay {
			return fmt.Errorf("format %q: nothing tells where %s ends; write %s%s", f.text, p.field, p.field, p.field)
		}
		p.min = p.max
	}
	return nil
}

func (f *TimeFormat) checkFields() error {
	switch {
	case !f.has[year]:
		return errors.New("there is no year; add YYYY")
	case f.has[yearDay] && (f.has[month] || f.has[day]):
		return errors.New("the day of the year DDD stands beside a month or a day; keep one of them")
	case !f.has[yearDay] && !(f.has[month] && f.has[day]):
		return errors.New("there is no full date; it needs month and day, or the day of the year DDD")
	case f.has[minute] && !f.has[hour]:
		return errors.New("there are minutes without hours; add hh")
	case f.has[second] && !f.has[minute]:
		return errors.New("there are seconds without minutes; add mm")
	}
	return nil
}

// HasHour reports whether the format states a time of the day.
func (f *TimeFormat) HasHour() bool { return f.has[hour] }

// String returns the format as it was declared.
func (f *TimeFormat) String() string { return f.text }
