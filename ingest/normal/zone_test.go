package normal_test

import (
	"testing"
	"time"
	_ "time/tzdata"

	"pgregory.net/rapid"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

func civil(t interface{ Fatal(...any) }, text string) normal.Civil {
	f, err := normal.CompileTime("YYYY-MM-DD hh:mm:ss")
	if err != nil {
		t.Fatal(err)
	}
	c, err := f.Parse([]byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// Dates of the changes are those of the tz database that Go 1.26 carries: the
// test below holds every answer against package time.
func TestNamedZone(t *testing.T) {
	const twice, never = "twice", "never"
	tests := []struct {
		name, zone, text string
		earlier, later   string // UTC; the same twice where nothing is in doubt
		err              string
	}{
		{"winter", "America/Edmonton", "2024-01-15 12:00:00", "2024-01-15 19:00:00", "", ""},
		{"summer", "America/Edmonton", "2024-07-15 12:00:00", "2024-07-15 18:00:00", "", ""},
		{"last second before spring", "America/Edmonton", "2024-03-10 01:59:59", "2024-03-10 08:59:59", "", ""},
		{"first that is skipped", "America/Edmonton", "2024-03-10 02:00:00", "2024-03-10 09:00:00", "", never},
		{"last that is skipped", "America/Edmonton", "2024-03-10 02:59:59", "2024-03-10 09:59:59", "", never},
		{"first of summer", "America/Edmonton", "2024-03-10 03:00:00", "2024-03-10 09:00:00", "", ""},
		{"before the hour that is there twice", "America/Edmonton", "2024-11-03 00:59:59", "2024-11-03 06:59:59", "", ""},
		{"first that is there twice", "America/Edmonton", "2024-11-03 01:00:00", "2024-11-03 07:00:00", "2024-11-03 08:00:00", twice},
		{"last that is there twice", "America/Edmonton", "2024-11-03 01:59:59", "2024-11-03 07:59:59", "2024-11-03 08:59:59", twice},
		{"first of winter", "America/Edmonton", "2024-11-03 02:00:00", "2024-11-03 09:00:00", "", ""},
		{"24:00 before the change", "America/Edmonton", "2024-11-02 24:00:00", "2024-11-03 06:00:00", "", ""},

		{"south, skipped", "Pacific/Auckland", "2024-09-29 02:30:00", "2024-09-28 14:30:00", "", never},
		{"south, twice", "Pacific/Auckland", "2024-04-07 02:30:00", "2024-04-06 13:30:00", "2024-04-06 14:30:00", twice},
		{"south, summer", "Pacific/Auckland", "2024-01-15 12:00:00", "2024-01-14 23:00:00", "", ""},

		{"half an hour skipped", "Australia/Lord_Howe", "2024-10-06 02:29:59", "2024-10-05 15:59:59", "", never},
		{"half an hour later", "Australia/Lord_Howe", "2024-10-06 02:30:00", "2024-10-05 15:30:00", "", ""},
		{"half an hour twice", "Australia/Lord_Howe", "2024-04-07 01:30:00", "2024-04-06 14:30:00", "2024-04-06 15:00:00", twice},
		{"before the half hour", "Australia/Lord_Howe", "2024-04-07 01:29:59", "2024-04-06 14:29:59", "", ""},

		{"two hours skipped", "Antarctica/Troll", "2024-03-31 02:30:00", "2024-03-31 02:30:00", "", never},
		{"a day that was skipped", "Pacific/Kwajalein", "1993-08-21 12:00:00", "1993-08-22 00:00:00", "", never},
		{"before there were zones", "Europe/Berlin", "1800-01-01 00:00:00", "1799-12-31 23:06:32", "", ""},
		{"long from now", "Europe/Berlin", "2400-07-01 12:00:00", "2400-07-01 10:00:00", "", ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			c := civil(t, tt.text)
			if tt.later == "" {
				tt.later = tt.earlier
			}
			for rule, want := range map[pipeline.Ambiguous]string{pipeline.AmbiguousEarlier: tt.earlier, pipeline.AmbiguousLater: tt.later} {
				z, err := normal.LoadZone(tt.zone, rule, pipeline.SkippedShift)
				if err != nil {
					t.Fatal(err)
				}
				s, resolved, err := z.UnixS(c, &normal.Offset{})
				if got := time.Unix(s, 0).UTC().Format(time.DateTime); got != want || resolved != (tt.err != "") || err != nil {
					t.Errorf("%s: got %s, %v, %v; want %s", rule, got, resolved, err, want)
				}
			}
			z, err := normal.LoadZone(tt.zone, pipeline.AmbiguousSetAside, pipeline.SkippedSetAside)
			if err != nil {
				t.Fatal(err)
			}
			want := map[string]string{twice: "the clocks of " + tt.zone + " showed " + tt.text + " twice", never: "the clocks of " + tt.zone + " never showed " + tt.text}[tt.err]
			if _, resolved, err := z.UnixS(c, &normal.Offset{}); errText(err) != want || resolved {
				t.Errorf("set aside: got %v, %v; want %s", resolved, err, want)
			}
		})
	}
}

func TestLoadZoneRefuses(t *testing.T) {
	tests := []struct{ name, err string }{
		{"Local", `"Local" is no named zone such as America/Edmonton`},
		{"MST", `"MST" is no named zone such as America/Edmonton`},
		{"America/Tarn", `there is no zone "America/Tarn" such as America/Edmonton`},
		{"../../etc/passwd", `there is no zone "../../etc/passwd" such as America/Edmonton`},
		{"/etc/localtime", `there is no zone "/etc/localtime" such as America/Edmonton`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := normal.LoadZone(tt.name, "earlier", "shift"); errText(err) != tt.err {
				t.Errorf("got %v, want %s", err, tt.err)
			}
		})
	}
}

// TestZoneAgainstStandardLibrary: an instant's civil time is read back as that
// instant, or as one of those with the same civil time; a civil time that no
// instant has is moved on by as much as the clocks were.
func TestZoneAgainstStandardLibrary(t *testing.T) {
	for _, name := range []string{"America/Edmonton", "Pacific/Auckland", "Australia/Lord_Howe", "Antarctica/Troll", "America/St_Johns", "Africa/Casablanca", "Pacific/Apia", "Asia/Manila"} {
		t.Run(name, func(t *testing.T) {
			loc, err := time.LoadLocation(name)
			if err != nil {
				t.Fatal(err)
			}
			early, err1 := normal.LoadZone(name, pipeline.AmbiguousEarlier, pipeline.SkippedShift)
			late, err2 := normal.LoadZone(name, pipeline.AmbiguousLater, pipeline.SkippedShift)
			if err1 != nil || err2 != nil {
				t.Fatal(err1, err2)
			}
			wall := func(s int64) int64 {
				_, offset := time.Unix(s, 0).In(loc).Zone()
				return s + int64(offset)
			}
			var last1, last2 normal.Offset
			rapid.Check(t, func(t *rapid.T) {
				// A time near a change, where there is one after it.
				at := time.Unix(rapid.Int64Range(-5e9, 6e9).Draw(t, "instant"), 0).In(loc)
				if _, end := at.ZoneBounds(); !end.IsZero() && rapid.Bool().Draw(t, "near a change") {
					at = end
				}
				local := wall(at.Unix()) + rapid.Int64Range(-3*86400, 3*86400).Draw(t, "from it")
				c := normal.Civil{Day: pipeline.Day(local / 86400), SecondS: int32(local % 86400)}
				if c.SecondS < 0 {
					c.Day, c.SecondS = c.Day-1, c.SecondS+86400
				}
				a, doubtA, err1 := early.UnixS(c, &last1)
				b, doubtB, err2 := late.UnixS(c, &last2)
				if err1 != nil || err2 != nil || doubtA != doubtB || !doubtA && a != b {
					t.Fatalf("got %d, %v, %v and %d, %v, %v", a, doubtA, err1, b, doubtB, err2)
				}
				// What time.Date makes of it: an instant with that civil time if there is one.
				d := time.Date(1970, 1, 1, 0, 0, int(local), 0, loc)
				exists := wall(d.Unix()) == local
				switch {
				case exists && (wall(a) != local || wall(b) != local || d.Unix() != a && d.Unix() != b):
					t.Fatalf("civil %d: got %d and %d, package time has %d", local, a, b, d.Unix())
				case !exists:
					start, _ := time.Unix(a, 0).In(loc).ZoneBounds()
					_, before := start.Add(-time.Second).In(loc).Zone()
					if !doubtA || a != b || a+int64(before) != local {
						t.Fatalf("civil %d is not there: got %d, %v, whose clocks were at %d before the change", local, a, doubtA, before)
					}
				case doubtA && !(a < b):
					t.Fatalf("civil %d: %d is not before %d", local, a, b)
				}
			})
		})
	}
}

// TestZoneAtTheEndsOfYears: around New Year of years to come package time has
// bounds of an offset's spell that end before they begin (Go 1.26); its offsets
// are right, and no clock is changed on those days.
func TestZoneAtTheEndsOfYears(t *testing.T) {
	for _, name := range []string{"Pacific/Auckland", "Australia/Lord_Howe", "America/Edmonton", "Antarctica/Troll"} {
		loc, err := time.LoadLocation(name)
		if err != nil {
			t.Fatal(err)
		}
		z, err := normal.LoadZone(name, pipeline.AmbiguousSetAside, pipeline.SkippedSetAside)
		if err != nil {
			t.Fatal(err)
		}
		for year := 2036; year < 2200; year++ {
			for hour := range 96 {
				d := time.Date(year, 12, 30, hour, 0, 0, 0, time.UTC)
				want := time.Date(year, 12, 30, hour, 0, 0, 0, loc).Unix()
				c := normal.Civil{Day: pipeline.Day(d.Unix() / 86400), SecondS: int32(d.Unix() % 86400)}
				if got, resolved, err := z.UnixS(c, &normal.Offset{}); got != want || resolved || err != nil {
					t.Fatalf("%s, %s: got %d, %v, %v; want %d", name, d, got, resolved, err, want)
				}
			}
		}
	}
}

func TestZoneAllocatesNothing(t *testing.T) {
	z, err := normal.LoadZone("Pacific/Auckland", pipeline.AmbiguousEarlier, pipeline.SkippedShift)
	if err != nil {
		t.Fatal(err)
	}
	day, i := civil(t, "2024-04-05 00:00:00").Day, int32(0)
	var last normal.Offset
	n := testing.AllocsPerRun(200, func() {
		if _, _, err := z.UnixS(normal.Civil{Day: day + pipeline.Day(i/24), SecondS: i % 24 * 3600}, &last); err != nil {
			t.Fatal(err)
		}
		i++
	})
	if n != 0 {
		t.Errorf("%v allocations for a time, want none", n)
	}
}
