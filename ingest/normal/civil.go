package normal

import (
	"errors"
	"fmt"

	"thawledger/pipeline"
)

// Civil is a date and time of the day without a zone.
type Civil struct {
	Day     pipeline.Day
	SecondS int32 // since 00:00 of Day; 86400 where the text says 24:00
}

// UnixS returns the seconds since 1970-01-01T00:00:00Z that the time would be if
// its zone were UTC.
func (c Civil) UnixS() int64 { return int64(c.Day)*86400 + int64(c.SecondS) }

// Parse reads the whole of text. Ranges are those of the calendar: 29 February
// in leap years only, day of the year to 365 or 366, no leap second. 24:00 and
// 24:00:00 are taken if the format has hours and minutes, and are the end of
// the day named: the same instant as 00:00 of the next. What the format does
// not state is 0. Of a count of seconds the result is the civil time of UTC.
func (f *TimeFormat) Parse(text []byte) (Civil, error) {
	if f.epoch > 0 {
		return f.parseEpoch(text)
	}
	var v [numKinds]int
	i := 0
	for k := range f.parts {
		p := &f.parts[k]
		if p.kind == literal {
			if i >= len(text) || text[i] != p.char {
				return Civil{}, f.misfit(text, i, k)
			}
			i++
			continue
		}
		if p.how > hourMinute {
			n, size := p.read(text[i:])
			if size < 0 {
				return Civil{}, f.misfit(text, i, k)
			}
			v[p.kind] = n
			i += size
			continue
		}
		n, first := 0, i
		for i < len(text) && i-first < p.max && text[i]-'0' <= 9 {
			n = n*10 + int(text[i]-'0')
			i++
		}
		if i-first < p.min {
			return Civil{}, f.misfit(text, i, k)
		}
		if p.kind == year && p.max == 2 {
			n += 1900
			if n < 1969 {
				n += 100
			}
		}
		if p.how == hourMinute {
			v[minute] = n % 100
			n /= 100
		}
		v[p.kind] = n
	}
	if i < len(text) {
		return Civil{}, f.misfit(text, i, len(f.parts))
	}
	if !f.has[yearDay] {
		v[yearDay] = 1
	}
	if !f.has[month] {
		v[month], v[day] = 1, 1
	}
	if why := f.outside(&v); why != nil {
		return Civil{}, fmt.Errorf("%s is no time of the form %s: %w", Quote(text), f.text, why)
	}
	switch {
	case v[half] == 1 && v[hour] == 12:
		v[hour] = 0
	case v[half] == 2 && v[hour] < 12:
		v[hour] += 12
	}
	return Civil{
		Day:     pipeline.Day(daysFromCivil(v[year], v[month], v[day]) + v[yearDay] - 1),
		SecondS: int32(v[hour]*3600 + v[minute]*60 + v[second]),
	}, nil
}

// outside says which field no calendar or clock has; nil if all are well.
func (f *TimeFormat) outside(v *[numKinds]int) error {
	switch {
	case v[year] < 1:
		return errors.New("year 0 is not 1 to 9999")
	case v[month] < 1 || v[month] > 12:
		return fmt.Errorf("month %d is not 1 to 12", v[month])
	case v[day] < 1 || v[day] > daysIn(v[year], v[month]):
		return fmt.Errorf("day %d is not 1 to %d, the days of %04d-%02d", v[day], daysIn(v[year], v[month]), v[year], v[month])
	case v[yearDay] < 1 || v[yearDay] > 365+leap(v[year]):
		return fmt.Errorf("day of the year %d is not 1 to %d, the days of %04d", v[yearDay], 365+leap(v[year]), v[year])
	case f.has[half] && (v[hour] < 1 || v[hour] > 12):
		return fmt.Errorf("hour %d is not 1 to 12, the hours beside AM and PM", v[hour])
	case v[fraction] != 0:
		return errFraction
	case v[hour] == 24 && f.has[minute] && v[minute] == 0 && v[second] == 0:
		return nil
	case v[hour] == 24 && f.has[minute]:
		return errors.New("hour 24 has no time after 24:00")
	case v[hour] > 23:
		return fmt.Errorf("hour %d is not 0 to 23", v[hour])
	case v[minute] > 59:
		return fmt.Errorf("minute %d is not 0 to 59", v[minute])
	case v[second] > 59:
		return fmt.Errorf("second %d is not 0 to 59", v[second])
	}
	return nil
}

var errFraction = errors.New("the second has a fraction that is not 0, and readings are at whole seconds")

// read reads a field that is not digits alone from the beginning of text, and
// returns how many bytes it has; -1 if it is not there.
func (p *part) read(text []byte) (n, size int) {
	switch p.how {
	case monthName:
		const names = "janfebmaraprmayjunjulaugsepoctnovdec"
		for m := 0; len(text) >= 3 && m < 12; m++ {
			if text[0]|0x20 == names[3*m] && text[1]|0x20 == names[3*m+1] && text[2]|0x20 == names[3*m+2] {
				return m + 1, 3
			}
		}
	case amPM:
		if len(text) >= 2 && text[1]|0x20 == 'm' {
			switch text[0] | 0x20 {
			case 'a':
				return 1, 2
			case 'p':
				return 2, 2
			}
		}
	default: // zeros
		if len(text) == 0 || text[0] != p.char {
			return 0, 0
		}
		for size = 1; size < len(text) && size <= p.max && text[size]-'0' <= 9; size++ {
			n |= int(text[size] - '0')
		}
		if size > 1 {
			return n, size
		}
	}
	return 0, -1
}

// Seconds since 1970 of the years 1 to 9999.
const (
	firstS = -62135596800
	lastS  = 253402300799
)

// parseEpoch reads a count of seconds or milliseconds.
func (f *TimeFormat) parseEpoch(text []byte) (Civil, error) {
	if len(text) == 0 {
		return Civil{}, fmt.Errorf("there is no time; %s is right, such as %d", f.text, 1767225600*f.epoch)
	}
	i, n := 0, int64(0)
	if text[0] == '-' {
		i++
	}
	first := i
	for ; i < len(text) && text[i]-'0' <= 9; i++ {
		n = min(n*10+int64(text[i]-'0'), 1e16)
	}
	fail := func(why error) (Civil, error) {
		return Civil{}, fmt.Errorf("%s is no time of the form %s: %w", Quote(text), f.text, why)
	}
	if i == first || i < len(text) && text[i] != '.' {
		what := "it ends"
		if i < len(text) {
			what = found(text, i)
		}
		return fail(errors.New(what + " where a digit is right"))
	}
	if i < len(text) {
		p := part{how: zeros, char: '.', max: maxFraction}
		part, size := p.read(text[i:])
		switch {
		case size < 0 || i+size < len(text):
			return fail(errors.New("after the point only zeros are right"))
		case part != 0:
			return fail(errFraction)
		}
	}
	if text[0] == '-' {
		n = -n
	}
	if n%f.epoch != 0 {
		return fail(errFraction)
	}
	n /= f.epoch
	if n < firstS || n > lastS {
		return fail(errors.New("that is not in the years 1 to 9999"))
	}
	d := n / 86400
	if n%86400 < 0 {
		d--
	}
	return Civil{Day: pipeline.Day(d), SecondS: int32(n - d*86400)}, nil
}

// misfit says where text leaves the format: at byte i, where part k is due.
func (f *TimeFormat) misfit(text []byte, i, k int) error {
	if len(text) == 0 {
		return fmt.Errorf("there is no time; %s is right", f.text)
	}
	what := "it ends"
	if i < len(text) {
		what = found(text, i)
	}
	due := "the end"
	if k < len(f.parts) {
		switch p := f.parts[k]; {
		case p.how == monthName:
			due = p.field + " (Jan to Dec)"
		case p.how == amPM:
			due = "AM or PM"
		case p.how == zeros:
			due = p.field + " (zeros)"
		case p.kind == literal:
			due = fmt.Sprintf("%q", p.char)
		case p.min == p.max:
			due = fmt.Sprintf("%s (%d digits)", p.field, p.max)
		default:
			due = fmt.Sprintf("%s (%d to %d digits)", p.field, p.min, p.max)
		}
	}
	return fmt.Errorf("%s is no time of the form %s: %s where %s is right", Quote(text), f.text, what, due)
}

var monthDays = [13]int{0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31}

func daysIn(year, month int) int {
	if month == 2 {
		return 28 + leap(year)
	}
	return monthDays[month]
}

// leap returns 1 for a leap year of the Gregorian calendar, otherwise 0.
func leap(year int) int {
	if year%4 == 0 && (year%100 != 0 || year%400 == 0) {
		return 1
	}
	return 0
}

// daysFromCivil counts the days from 1970-01-01 to a proleptic Gregorian date of
// the years 1 to 9999: whole years from 1 March, so that the leap day comes
// last, and 719468 days from 0000-03-01 to 1970-01-01 (H. Hinnant, chrono-
// compatible low-level date algorithms, 2013, days_from_civil; from memory).
func daysFromCivil(y, m, d int) int {
	if m <= 2 {
		y--
		m += 12
	}
	return 365*y + y/4 - y/100 + y/400 + (153*(m-3)+2)/5 + d - 1 - 719468
}
