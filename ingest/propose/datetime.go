package propose

import (
	"slices"
	"strings"
)

// form is a way to read the text of a time: the format, and what the text says
// of the zone.
type form struct {
	format string
	zone   string // "" if the text does not say
	order  string // of year, month and day, such as YMD; YD for the day of the year
}

// forms returns the ways in which the shape may be a date, or a date and time.
func (s *shape) forms() (out []form) {
	for _, d := range s.dates() {
		if f, ok := s.finish(d.format, d.used); ok {
			f.order = d.order
			out = append(out, f)
		}
	}
	return out
}

// clock returns the way in which the shape may be a time of the day.
func (s *shape) clock() (form, bool) { return s.finish("", 0) }

type datePart struct {
	format, order string
	used          int // runs
}

func (s *shape) dates() (out []datePart) {
	r := s.runs
	if s.between[0] != "" {
		return nil
	}
	one := func(order string, formats ...string) {
		for _, f := range formats {
			out = append(out, datePart{f, order, 1})
		}
	}
	switch {
	case !(r[0].least == r[0].most):
	case r[0].most == 6:
		one("YMD", "YYMMDD")
		one("DMY", "DDMMYY")
		one("MDY", "MMDDYY")
	case r[0].most == 7:
		one("YD", "YYYYDDD")
	case r[0].most == 8:
		one("YMD", "YYYYMMDD")
		one("DMY", "DDMMYYYY")
		one("MDY", "MMDDYYYY")
		one("YDM", "YYYYDDMM")
	case r[0].most == 10:
		one("YMD", "YYYYMMDDhh")
	case r[0].most == 11:
		one("YD", "YYYYDDDhhmm")
	case r[0].most == 12:
		one("YMD", "YYYYMMDDhhmm")
		one("DMY", "DDMMYYYYhhmm")
		one("MDY", "MMDDYYYYhhmm")
	case r[0].most == 14:
		one("YMD", "YYYYMMDDhhmmss")
	}
	if len(r) < 2 {
		return out
	}
	two := func(order string, fields ...string) {
		out = append(out, datePart{fields[0] + s.between[1] + fields[1], order, 2})
	}
	if s.between[1] != "" && r[0].is(4) && r[1].most == 3 {
		two("YD", "YYYY", "DDD")
	}
	if s.between[1] != "" && r[0].most == 3 && r[1].is(4) {
		two("YD", "DDD", "YYYY")
	}
	if len(r) < 3 || s.between[1] == ":" || s.between[2] == ":" {
		return out
	}
	three := func(order string, fields ...string) {
		out = append(out, datePart{fields[0] + s.between[1] + fields[1] + s.between[2] + fields[2], order, 3})
	}
	short, pad := func(i int) bool { return r[i].most <= 2 }, s.padded()
	switch {
	case r[0].is(4) && short(1) && short(2):
		three("YMD", "YYYY", r[1].short("M", pad), r[2].short("D", pad))
		three("YDM", "YYYY", r[1].short("D", pad), r[2].short("M", pad))
	case short(0) && short(1) && r[2].is(4):
		three("DMY", r[0].short("D", pad), r[1].short("M", pad), "YYYY")
		three("MDY", r[0].short("M", pad), r[1].short("D", pad), "YYYY")
	case short(0) && short(1) && short(2):
		if r[0].is(2) {
			three("YMD", "YY", r[1].short("M", pad), r[2].short("D", pad))
		}
		if r[2].is(2) {
			three("DMY", r[0].short("D", pad), r[1].short("M", pad), "YY")
			three("MDY", r[0].short("M", pad), r[1].short("D", pad), "YY")
		}
	}
	return out
}

// finish adds the time of the day, from run used on, and the zone to a format.
func (s *shape) finish(format string, used int) (f form, ok bool) {
	r := s.runs[used:]
	between := s.between[used:]
	f.format = format
	hasHour, pad := strings.Contains(format, "h"), used > 0 && s.padded()
	add := func(fields ...string) {
		for i, field := range fields {
			f.format += between[i] + field
		}
		r, between = r[len(fields):], between[len(fields):]
	}
	switch {
	case hasHour || len(r) == 0:
	case len(r) >= 3 && between[1] == ":" && between[2] == ":" && r[0].most <= 2 && r[1].is(2) && r[2].is(2):
		add(r[0].short("h", pad), "mm", "ss")
	case len(r) >= 2 && between[1] == ":" && r[0].most <= 2 && r[1].is(2):
		add(r[0].short("h", pad), "mm")
	case r[0].is(6):
		add("hhmmss")
	case r[0].is(4):
		add("hhmm")
	case r[0].most <= 2:
		add(r[0].short("h", pad))
	}
	// What may follow is the same in all cells: parts of a second, an offset.
	for i, rest := range r {
		switch {
		case rest.varies || !hasHour && f.format == format:
			return f, false
		case i == 0 && (between[0] == "+" || between[0] == "-"):
			f.zone = offsetOf(between[0], r, between[1:])
		case i == 0 && between[0] == "." && strings.HasSuffix(f.format, "ss"):
		case i == 1 && f.zone != "":
		default:
			return f, false
		}
		f.format += between[i] + rest.same
	}
	tail := between[len(r)]
	f.format += tail
	switch z := strings.ToUpper(strings.TrimSpace(tail)); z {
	case "Z", "UTC":
		f.zone = utc
	case "":
	default:
		return f, false
	}
	// No letter of a field, and nothing that cannot be typed, stands for itself.
	odd := strings.ContainsFunc(strings.Join(s.between, ""), func(r rune) bool { return r < ' ' || r > '~' || strings.ContainsRune("YMDhms", r) })
	return f, !odd && f.format != "" && (used > 0 || s.between[0] == "")
}

const utc = "+00:00"

// offsetOf returns the offset that runs of digits after a sign are; "" if they
// are none.
func offsetOf(sign string, r []run, between []string) string {
	switch {
	case len(r) == 1 && r[0].is(4):
		return sign + r[0].same[:2] + ":" + r[0].same[2:]
	case len(r) == 2 && r[0].is(2) && r[1].is(2) && between[0] == ":":
		return sign + r[0].same + ":" + r[1].same
	case len(r) == 1 && r[0].is(2):
		return sign + r[0].same + ":00"
	}
	return ""
}

// literal puts what a text has into the places of the fields of a time of the
// day, so that a format reads days: YYYY-MM-DD 12:00.
func literal(format, hours, minutes, seconds string) string {
	for _, f := range []struct{ field, text string }{{"hh", hours}, {"h", hours}, {"mm", minutes}, {"ss", seconds}} {
		format = strings.Replace(format, f.field, f.text, 1)
	}
	return format
}

// unreadable says what of a text of times no layout reads; "" if it is nothing
// known.
func unreadable(cell string) string {
	lower := strings.ToLower(cell)
	digits := strings.IndexFunc(cell, func(r rune) bool { return r < '0' || r > '9' }) < 0
	months := []string{"jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec"}
	hasDigit := strings.ContainsAny(cell, "0123456789")
	switch {
	case hasDigit && (strings.HasSuffix(lower, "am") || strings.HasSuffix(lower, "pm") || strings.HasSuffix(lower, ".m.")):
		return "the 12-hour clock (AM, PM)"
	case hasDigit && len(cell) <= 40 && slices.ContainsFunc(months, func(m string) bool { return strings.Contains(lower, m) }):
		return "the name of a month"
	case digits && (len(cell) == 10 || len(cell) == 13) && cell[0] == '1':
		return "seconds since 1970"
	}
	return ""
}
