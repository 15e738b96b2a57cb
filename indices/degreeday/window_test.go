package degreeday

import (
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

func day(t *testing.T, s string) pipeline.Day {
	t.Helper()
	d, err := pipeline.ParseDay(s)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func TestWindowAt(t *testing.T) {
	january, july := pipeline.MonthDay{Month: time.January, Day: 15}, pipeline.MonthDay{Month: time.July, Day: 15}
	cases := []struct {
		name            string
		starts          pipeline.MonthDay
		at, first, last string
		days            int
		label           string
	}{
		{"northern thaw", january, "2031-07-20", "2031-01-15", "2032-01-14", 365, "2031"},
		{"northern thaw, first day", january, "2031-01-15", "2031-01-15", "2032-01-14", 365, "2031"},
		{"northern thaw, day before", january, "2031-01-14", "2030-01-15", "2031-01-14", 365, "2030"},
		{"thaw with 29 February", january, "2032-02-29", "2032-01-15", "2033-01-14", 366, "2032"},
		{"northern freeze", july, "2031-12-31", "2031-07-15", "2032-07-14", 366, "2031-32"},
		{"northern freeze after the new year", july, "2032-07-14", "2031-07-15", "2032-07-14", 366, "2031-32"},
		{"southern thaw", july, "2030-12-01", "2030-07-15", "2031-07-14", 365, "2030-31"},
		{"southern freeze", january, "2030-07-01", "2030-01-15", "2031-01-14", 365, "2030"},
		{"over a century", july, "1999-12-31", "1999-07-15", "2000-07-14", 366, "1999-00"},
		{"from December", pipeline.MonthDay{Month: time.December, Day: 15}, "2031-01-01", "2030-12-15", "2031-12-14", 365, "2031"},
		{"from 29 February", pipeline.MonthDay{Month: time.February, Day: 29}, "2033-02-28", "2032-02-29", "2033-02-28", 366, "2032"},
		{"from 29 February, other year", pipeline.MonthDay{Month: time.February, Day: 29}, "2033-03-01", "2033-03-01", "2034-02-28", 365, "2033"},
		{"before 1970", january, "1969-12-31", "1969-01-15", "1970-01-14", 365, "1969"},
	}
	for _, c := range cases {
		t.Run(c.name, func(t *testing.T) {
			w := WindowAt(c.starts, day(t, c.at))
			if w.First.String() != c.first || w.Last.String() != c.last || w.Days() != c.days {
				t.Errorf("%s to %s, %d days; want %s to %s, %d", w.First, w.Last, w.Days(), c.first, c.last, c.days)
			}
			if got := w.Label(); got != c.label {
				t.Errorf("label %q; want %q", got, c.label)
			}
		})
	}
}

// Every day is in one window, and windows adjoin.
func TestWindowsShareOutTheDays(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		starts := pipeline.MonthDay{Month: time.Month(rapid.IntRange(1, 12).Draw(t, "month")), Day: rapid.IntRange(1, 31).Draw(t, "day")}
		d := pipeline.Day(rapid.IntRange(-40000, 60000).Draw(t, "d"))
		w := WindowAt(starts, d)
		if !w.Contains(d) || w.Contains(w.First-1) || w.Contains(w.Last+1) {
			t.Fatalf("window %s to %s for %s", w.First, w.Last, d)
		}
		if w != WindowAt(starts, w.First) || w != WindowAt(starts, w.Last) {
			t.Fatalf("window %s to %s is not that of its own ends", w.First, w.Last)
		}
		if next := WindowAt(starts, w.Last+1); next.First != w.Last+1 {
			t.Fatalf("window after %s to %s starts on %s", w.First, w.Last, next.First)
		}
		if n := w.Days(); n != 365 && n != 366 {
			t.Fatalf("%d days", n)
		}
	})
}
