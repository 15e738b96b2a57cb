package pipeline

import (
	"fmt"
	"time"
)

// Day is a civil date, counted in days from 1970-01-01 (proleptic Gregorian).
// It says nothing of a zone: a station's day boundary and standard-time offset
// turn it into instants (see Station.DayStart).
type Day int32

// DayOf returns the Day of a civil date. Values outside the usual ranges are
// normalised as time.Date does.
func DayOf(year int, month time.Month, day int) Day {
	return Day(floorDiv(time.Date(year, month, day, 0, 0, 0, 0, time.UTC).Unix(), secondsPerDay))
}

// ParseDay reads a date in the form 2031-07-20.
func ParseDay(s string) (Day, error) {
	t, err := time.Parse(time.DateOnly, s)
	if err != nil {
		return 0, fmt.Errorf("%q is not a date such as 2031-07-20", s)
	}
	return Day(floorDiv(t.Unix(), secondsPerDay)), nil
}

const secondsPerDay = 86400

func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

// Time returns the day's first instant if its civil date is taken as UTC.
func (d Day) Time() time.Time { return time.Unix(int64(d)*secondsPerDay, 0).UTC() }

// Date returns the civil date.
func (d Day) Date() (year int, month time.Month, day int) { return d.Time().Date() }

// String returns the date in the form 2031-07-20.
func (d Day) String() string { return d.Time().Format(time.DateOnly) }

// MonthDay is a date without a year, as used for season boundaries.
type MonthDay struct {
	Month time.Month
	Day   int
}

// In returns the day in the given year.
func (m MonthDay) In(year int) Day { return DayOf(year, m.Month, m.Day) }

// String returns the form 01-15.
func (m MonthDay) String() string { return fmt.Sprintf("%02d-%02d", int(m.Month), m.Day) }
