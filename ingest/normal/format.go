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
	epoch int64 // steps in a second of a count from 1970 on; 0 for a date
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
	fraction
	half // of the day: 1 for AM, 2 for PM
	numKinds
)

var kindNames = [numKinds]string{"", "year", "month", "day", "day of the year", "hour", "minute", "second", "fraction of the second", "half of the day"}

// part is a field of a format, or a byte that stands for itself.
type part struct {
	kind     kind
	how      how
	char     byte   // of a literal; of a fraction, the mark before it
	field    string // as the format writes it
	min, max int    // digits
}

// how says how a field is written.
type how uint8

const (
	digits     how = iota
	hourMinute     // 30 is 00:30
	monthName
	amPM
	zeros // a mark and zeros, or nothing
)

// fields are the fields that a format may have but .f, which only ss can be before.
var fields = map[string]part{
	"YYYY": {kind: year, min: 4, max: 4}, "YY": {kind: year, min: 2, max: 2},
	"MM": {kind: month, min: 2, max: 2}, "M": {kind: month, min: 1, max: 2}, "MMM": {kind: month, how: monthName},
	"DD": {kind: day, min: 2, max: 2}, "D": {kind: day, min: 1, max: 2},
	"DDD": {kind: yearDay, min: 1, max: 3},
	"hh":  {kind: hour, min: 2, max: 2}, "h": {kind: hour, min: 1, max: 2},
	"hmm": {kind: hour, how: hourMinute, min: 1, max: 4},
	"mm":  {kind: minute, min: 2, max: 2}, "ss": {kind: second, min: 2, max: 2},
	"AM": {kind: half, how: amPM},
}

const fieldNames = "YYYY YY MMM MM M D DD DDD hh h hmm mm ss .f AM"

// epochs are the formats that count from 1970-01-01T00:00:00Z.
var epochs = map[string]int64{"epoch": 1, "epoch_ms": 1000}

// maxFraction is the most digits that a fraction of a second may have.
const maxFraction = 12

// CompileTime makes a format ready. Its fields are YYYY YY MMM MM M D DD DDD (day
// of the year) hh h hmm mm ss .f AM; any other character stands for itself, T and
// Z included. M, D and h take one or two digits, DDD one to three; the others
// take as many as they have letters. YY is 1969 to 2068, as POSIX strptime has it.
// DDD takes exactly three digits where a field follows at once; M, D, h and hmm
// must not be followed so, since nothing would say where they end.
//
// MMM is the English name of the month, its first three letters, and AM is AM or
// PM with hours of 1 to 12; capitals do not matter in either. hmm is hours and
// minutes in one to four digits, 30 being 00:30. The fraction of a second .f (or
// ,f), right after ss, may be left out and has to be 0: readings are at whole
// seconds.
//
// A format needs a year and either month and day or the day of the year, and
// no minutes without hours, nor seconds without minutes. Instead it may be epoch
// or epoch_ms: seconds or milliseconds since 1970-01-01T00:00:00Z, of whole
// seconds.
func CompileTime(format string) (*TimeFormat, error) {
	f := &TimeFormat{text: format, epoch: epochs[format]}
	if f.epoch > 0 {
		return f, nil
	}
	for i := 0; i < len(format); {
		token := f.token(i)
		if token == "" {
			f.parts = append(f.parts, part{kind: literal, char: format[i]})
			i++
			continue
		}
		p, known := fields[token]
		if token == ".f" || token == ",f" {
			p, known = part{kind: fraction, how: zeros, char: token[0], min: 1, max: maxFraction}, true
		}
		if !known {
			return nil, fmt.Errorf("format %q: %s is no field; fields are %s", format, token, fieldNames)
		}
		p.field = token
		for _, k := range p.kinds() {
			if f.has[k] {
				return nil, fmt.Errorf("format %q: the %s is there twice", format, kindNames[k])
			}
			f.has[k] = true
		}
		f.parts = append(f.parts, p)
		i += len(token)
	}
	if err := f.checkWidths(); err != nil {
		return nil, err
	}
	if err := f.checkFields(); err != nil {
		return nil, fmt.Errorf("format %q: %w", format, err)
	}
	return f, nil
}

// kinds returns what a field states.
func (p *part) kinds() []kind {
	if p.how == hourMinute {
		return []kind{hour, minute}
	}
	return []kind{p.kind}
}

// token returns what looks like a field at byte i of the format; "" for none.
func (f *TimeFormat) token(i int) string {
	run := func(i int) (end int) {
		for end = i; end < len(f.text) && f.text[end] == f.text[i]; end++ {
		}
		return end
	}
	end := run(i)
	switch c := f.text[i]; {
	case c == 'A' && strings.HasPrefix(f.text[i:], "AM") && run(i+1) == i+2:
		end = i + 2
	case (c == '.' || c == ',') && strings.HasPrefix(f.text[i+1:], "f") && len(f.parts) > 0 && f.parts[len(f.parts)-1].kind == second:
		end = run(i + 1)
	case c == 'h' && end == i+1 && end < len(f.text) && f.text[end] == 'm' && run(end) == end+2:
		end += 2
	case !strings.ContainsRune("YMDhms", rune(c)):
		return ""
	}
	return f.text[i:end]
}

// checkWidths sees to it that every field's end can be told.
func (f *TimeFormat) checkWidths() error {
	for i := range len(f.parts) - 1 {
		p, next := &f.parts[i], f.parts[i+1]
		digit := next.kind != literal && next.how <= hourMinute || '0' <= next.char && next.char <= '9'
		if p.min == p.max || !digit {
			continue
		}
		switch {
		case p.kind == yearDay:
			p.min = p.max
		case p.how == zeros:
			return fmt.Errorf("format %q: nothing tells where %s ends; it stands before a blank or at the end", f.text, p.field)
		default:
			return fmt.Errorf("format %q: nothing tells where %s ends; write %c%s", f.text, p.field, p.field[0], p.field)
		}
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
	case f.has[half] && !f.has[hour]:
		return errors.New("AM stands there without hours; add hh")
	}
	return nil
}

// HasHour reports whether the format states a time of the day.
func (f *TimeFormat) HasHour() bool { return f.has[hour] || f.epoch > 0 }

// IsEpoch reports whether times are counted from 1970-01-01T00:00:00Z.
func (f *TimeFormat) IsEpoch() bool { return f.epoch > 0 }

// String returns the format as it was declared.
func (f *TimeFormat) String() string { return f.text }
