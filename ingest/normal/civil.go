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
// not state is 0.
func (f *TimeFormat) Parse(text []byte) (Civil, error) {
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
