package gather

import (
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

func zone(t testing.TB, name string) *time.Location {
	t.Helper()
	z, err := time.LoadLocation(name)
	if err != nil {
		t.Fatal(err)
	}
	return z
}

func hours(from, to string) *pipeline.Quiet {
	at := func(s string) time.Duration {
		t, err := time.Parse("15:04", s)
		if err != nil {
			panic(err)
		}
		return t.Sub(time.Date(0, 1, 1, 0, 0, 0, 0, time.UTC))
	}
	return &pipeline.Quiet{From: at(from), To: at(to)}
}

// Clocks in Alaska go forward at 02:00 on the second Sunday of March and back at
// 02:00 on the first of November (15 U.S.C. 260a): 9 March and 2 November 2031.
// Standard time is UTC-9.
func TestAfterQuiet(t *testing.T) {
	alaska := zone(t, "America/Anchorage")
	for _, test := range []struct{ name, from, to, at, want string }{
		{"before", "22:00", "06:00", "2031-07-20T21:59:59-08:00", "2031-07-20T21:59:59-08:00"},
		{"as it begins", "22:00", "06:00", "2031-07-20T22:00:00-08:00", "2031-07-21T06:00:00-08:00"},
		{"after midnight", "22:00", "06:00", "2031-07-21T00:30:00-08:00", "2031-07-21T06:00:00-08:00"},
		{"as it ends", "22:00", "06:00", "2031-07-21T06:00:00-08:00", "2031-07-21T06:00:00-08:00"},
		{"within a day", "12:00", "13:30", "2031-07-21T12:45:10-08:00", "2031-07-21T13:30:00-08:00"},
		{"until midnight", "20:00", "00:00", "2031-07-21T20:00:00-08:00", "2031-07-22T00:00:00-08:00"},
		{"the short night", "22:00", "06:00", "2031-03-08T23:00:00-09:00", "2031-03-09T06:00:00-08:00"},
		{"the long night", "22:00", "06:00", "2031-11-01T23:00:00-08:00", "2031-11-02T06:00:00-09:00"},
		{"ends in the hour that there is not", "22:00", "02:30", "2031-03-08T23:00:00-09:00", "2031-03-09T03:00:00-08:00"},
		{"begins in the hour that there is not", "02:30", "04:00", "2031-03-09T01:59:59-09:00", "2031-03-09T01:59:59-09:00"},
		{"is over in the hour that there is not", "02:00", "03:00", "2031-03-09T01:59:59-09:00", "2031-03-09T01:59:59-09:00"},
		{"ends the first time", "22:00", "01:30", "2031-11-01T23:00:00-08:00", "2031-11-02T01:30:00-08:00"},
		{"begins again", "22:00", "01:30", "2031-11-02T01:10:00-09:00", "2031-11-02T01:30:00-09:00"},
		{"between the two", "22:00", "01:30", "2031-11-02T01:40:00-08:00", "2031-11-02T01:40:00-08:00"},
	} {
		t.Run(test.name, func(t *testing.T) {
			at, err := time.Parse(time.RFC3339, test.at)
			if err != nil {
				t.Fatal(err)
			}
			if got := AfterQuiet(hours(test.from, test.to), alaska, at).In(alaska).Format(time.RFC3339); got != test.want {
				t.Errorf("%s, want %s", got, test.want)
			}
		})
	}
}

// The end of quiet hours is what somebody finds who looks at the clock on the
// wall every minute.
func TestAfterQuietByTheClock(t *testing.T) {
	zones := []*time.Location{time.UTC, zone(t, "America/Anchorage"), zone(t, "Australia/Lord_Howe"), zone(t, "Europe/Oslo"), zone(t, "Asia/Kathmandu")}
	rapid.Check(t, func(t *rapid.T) {
		z := rapid.SampledFrom(zones).Draw(t, "zone")
		q := &pipeline.Quiet{From: time.Duration(rapid.IntRange(0, 1439).Draw(t, "from")) * time.Minute}
		q.To = (q.From + time.Duration(rapid.IntRange(1, 1439).Draw(t, "minutes"))*time.Minute) % wholeDay
		// About the days on which one of the zones changes its clock, and others.
		day := rapid.SampledFrom([]int{67, 98, 277, 305, 299, 89, 200}).Draw(t, "day")
		at := time.Date(2031, 1, day, 0, rapid.IntRange(0, 2*1440).Draw(t, "minute"), 0, 0, time.UTC)
		want := at
		for {
			h, m, _ := want.In(z).Clock()
			wall := time.Duration(h*60+m) * time.Minute
			inside := wall >= q.From && wall < q.To
			if q.From > q.To {
				inside = wall >= q.From || wall < q.To
			}
			if !inside {
				break
			}
			want = want.Add(time.Minute)
		}
		if got := AfterQuiet(q, z, at); !got.Equal(want) {
			t.Fatalf("%s to %s in %s from %s: %s, want %s", q.From, q.To, z, at, got.In(z), want.In(z))
		}
	})
}

func TestReady(t *testing.T) {
	r := &pipeline.Recipient{Zone: zone(t, "America/Anchorage"), Quiet: hours("22:00", "06:00"), GatherFor: 10 * time.Minute}
	for _, test := range []struct {
		name, first, now string
		busy, yes        bool
		again            string
	}{
		{"gathering", "12:00:00", "12:09:59", false, false, "12:10:00"},
		{"gathered", "12:00:00", "12:10:00", false, true, "12:10:00"},
		{"more may come", "12:00:00", "12:10:00", true, false, "12:30:00"},
		{"it has come long enough", "12:00:00", "12:30:00", true, true, "12:30:00"},
		{"gathered into the night", "21:55:00", "21:58:00", false, false, "06:00:00"},
		{"the night", "21:55:00", "22:05:00", false, false, "06:00:00"},
		{"the morning", "21:55:00", "06:00:00", false, true, "06:00:00"},
	} {
		at := func(s string) time.Time {
			x, err := time.ParseInLocation("2006-01-02 15:04:05", "2031-07-20 "+s, r.Zone)
			if err != nil {
				t.Fatal(err)
			}
			if x.Hour() < 7 {
				x = x.AddDate(0, 0, 1)
			}
			return x
		}
		yes, again := Ready(r, at(test.first), test.busy, at(test.now))
		if yes != test.yes || !again.Equal(at(test.again)) {
			t.Errorf("%s: %v, %s", test.name, yes, again)
		}
	}
}
