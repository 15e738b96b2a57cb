package text

import (
	"fmt"
	"math"
	"strconv"
	"time"

	"thawledger/pipeline"
)

// unit is the unit that indices are shown in.
type unit struct {
	name   pipeline.IndexUnit
	factor float64 // of degC.d
}

func unitOf(u pipeline.IndexUnit) unit {
	if u == pipeline.DegFDays {
		return unit{u, 1.8} // 1 degC.d = 1.8 degF.d: an index is a sum of differences
	}
	return unit{pipeline.DegCDays, 1}
}

// decimals returns the fewest decimals, up to 4, with which none of the values
// that differ from ref is shown as ref. Figures are whole numbers unless that
// would show a value on the wrong side of its design value.
func decimals(ref float64, values ...float64) int {
	for d := range 4 {
		same := false
		for _, v := range values {
			same = same || v != ref && fixed(v, d) == fixed(ref, d)
		}
		if !same {
			return d
		}
	}
	return 4
}

// fixed writes v with d decimals, and never as -0.
func fixed(v float64, d int) string {
	s := strconv.FormatFloat(v, 'f', d, 64)
	if v < 0 {
		if plain := strconv.FormatFloat(0, 'f', d, 64); s == "-"+plain {
			return plain
		}
	}
	return s
}

// short writes v with as many decimals, up to 4, as its document may have given it.
func short(v float64) string {
	return strconv.FormatFloat(math.Round(v*1e4)/1e4, 'f', -1, 64)
}

// index writes indices in degC.d in this unit, without its name, none of them on
// the wrong side of ref.
func (u unit) index(ref float64, values ...float64) []string {
	scaled := make([]float64, len(values))
	for i, v := range values {
		scaled[i] = v * u.factor
	}
	d := decimals(ref*u.factor, scaled...)
	out := make([]string, len(values))
	for i, v := range scaled {
		out[i] = fixed(v, d)
		if v == ref*u.factor {
			out[i] = short(v)
		}
	}
	return out
}

// percent writes a share in percent, never as 100 % if it is not.
func percent(share float64) string {
	return fixed(share*100, max(decimals(100, share*100), 0)) + " %"
}

func days(n int) string {
	if n == 1 {
		return "1 day"
	}
	return fmt.Sprintf("%d days", n)
}

func ordinal(n int) string {
	switch {
	case n%100 >= 11 && n%100 <= 13:
	case n%10 == 1:
		return fmt.Sprintf("%dst", n)
	case n%10 == 2:
		return fmt.Sprintf("%dnd", n)
	case n%10 == 3:
		return fmt.Sprintf("%drd", n)
	}
	return fmt.Sprintf("%dth", n)
}

// date is as 20 August 2031.
func date(d pipeline.Day) string { return d.Time().Format("2 January 2006") }

// clock is as 06:00 on 21 August 2031 (UTC-08:00).
func clock(t time.Time, zone *time.Location) string {
	if zone == nil {
		zone = time.UTC
	}
	t = t.In(zone)
	offset := "UTC"
	if _, s := t.Zone(); s != 0 {
		offset += t.Format("-07:00")
	}
	return t.Format("15:04 on 2 January 2006") + " (" + offset + ")"
}

// lasting writes how long something is, in the unit that a person would use.
func lasting(d time.Duration) string {
	count := func(n int, one string) string {
		if n == 1 {
			return "1 " + one
		}
		return fmt.Sprintf("%d %ss", n, one)
	}
	switch {
	case d < 2*time.Hour:
		return count(int(d.Round(time.Minute)/time.Minute), "minute")
	case d < 48*time.Hour:
		return count(int(d.Round(time.Hour)/time.Hour), "hour")
	}
	return count(int(d.Round(24*time.Hour)/(24*time.Hour)), "day")
}
