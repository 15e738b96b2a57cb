package text

import (
	"math"
	"strconv"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// A figure that is shown never says other than the figure that was judged: what
// is below its design value is shown below it, what is past it past it.
func TestFiguresAreNotRoundedAcross(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		ref := rapid.Float64Range(1, 9000).Draw(t, "design value")
		v := ref + rapid.SampledFrom([]float64{0, 0.02, -0.02, 0.4, -0.4, 0.5, 3, -300}).Draw(t, "margin")
		if v < 0 {
			v = 0
		}
		u := unitOf(rapid.SampledFrom([]pipeline.IndexUnit{"", pipeline.DegFDays}).Draw(t, "unit"))
		f := u.index(ref, v, ref)
		shown, err := strconv.ParseFloat(f[0], 64)
		if err != nil {
			t.Fatal(err)
		}
		limit, err := strconv.ParseFloat(f[1], 64)
		if err != nil {
			t.Fatal(err)
		}
		switch {
		case v < ref && shown >= limit, v > ref && shown <= limit, v == ref && f[0] != f[1]:
			t.Fatalf("%v of %v is shown as %s of %s", v, ref, f[0], f[1])
		}
		if math.Abs(shown-v*u.factor) > 0.51 {
			t.Fatalf("%v is shown as %s", v, f[0])
		}
	})
}

func TestFigures(t *testing.T) {
	c := unitOf("")
	for _, test := range []struct {
		ref  float64
		v    []float64
		want string
	}{
		{1700, []float64{1703.2, 1700}, "1703 1700"},
		{1700, []float64{1699.7, 1700}, "1699.7 1700"},
		{1700, []float64{1700.04, 1700}, "1700.04 1700"},
		{1700, []float64{1700, 1700}, "1700 1700"},
		{1700.5, []float64{1600, 1700.5}, "1600 1700.5"},
		{1700, []float64{1650, 1699.9, 1700}, "1650.0 1699.9 1700"},
		{0, []float64{-0.2}, "-0.2"},
	} {
		if got := strings.Join(c.index(test.ref, test.v...), " "); got != test.want {
			t.Errorf("%v by %v: %s, want %s", test.v, test.ref, got, test.want)
		}
	}
	if got := fixed(-0.2, 0); got != "0" {
		t.Errorf("-0.2 without decimals is %s", got)
	}
}

func TestPercent(t *testing.T) {
	for share, want := range map[float64]string{1: "100 %", 1.002: "100.2 %", 0.9998: "99.98 %", 0.9125: "91 %", 0: "0 %", 1.31: "131 %"} {
		if got := percent(share); got != want {
			t.Errorf("%v: %s, want %s", share, got, want)
		}
	}
}

// Offsets from the tz database, as Go has it: Anchorage is on UTC-8 in August
// and on UTC-9 in January.
func TestClock(t *testing.T) {
	zone, err := time.LoadLocation("America/Anchorage")
	if err != nil {
		t.Fatal(err)
	}
	for _, test := range []struct {
		at   time.Time
		zone *time.Location
		want string
	}{
		{time.Date(2031, 8, 21, 14, 0, 0, 0, time.UTC), zone, "06:00 on 21 August 2031 (UTC-08:00)"},
		{time.Date(2031, 1, 21, 14, 0, 0, 0, time.UTC), zone, "05:00 on 21 January 2031 (UTC-09:00)"},
		{time.Date(2031, 8, 21, 14, 0, 0, 0, zone), nil, "22:00 on 21 August 2031 (UTC)"},
	} {
		if got := clock(test.at, test.zone); got != test.want {
			t.Errorf("%s, want %s", got, test.want)
		}
	}
}

func TestLasting(t *testing.T) {
	for d, want := range map[time.Duration]string{
		time.Minute: "1 minute", 119 * time.Minute: "119 minutes", 2 * time.Hour: "2 hours", 47 * time.Hour: "47 hours",
		48 * time.Hour: "2 days", 17 * 24 * time.Hour: "17 days",
	} {
		if got := lasting(d); got != want {
			t.Errorf("%v: %s, want %s", d, got, want)
		}
	}
}

func TestOrdinal(t *testing.T) {
	for n, want := range map[int]string{1: "1st", 2: "2nd", 3: "3rd", 4: "4th", 11: "11th", 12: "12th", 13: "13th", 21: "21st", 111: "111th"} {
		if got := ordinal(n); got != want {
			t.Errorf("%d: %s", n, got)
		}
	}
}

func TestRank(t *testing.T) {
	for _, test := range []struct {
		place, of int
		want      string
	}{
		{1, 31, "The highest of 31 seasons on record at this date."},
		{2, 31, "The 2nd highest of 31 seasons on record at this date."},
		{29, 31, "The 3rd lowest of 31 seasons on record at this date."},
		{31, 31, "The lowest of 31 seasons on record at this date."},
		{1, 1, ""},
	} {
		if got := rank(&delivery.Item{Rank: &delivery.Rank{Place: test.place, Of: test.of}}); got != test.want {
			t.Errorf("%d of %d: %q", test.place, test.of, got)
		}
	}
}

// Every way from one state to another has words of its own that fit: none says
// that the design value is passed unless it is.
func TestSaysFitsEveryChange(t *testing.T) {
	states := append([]pipeline.State{""}, order...)
	for _, kind := range []delivery.Kind{delivery.News, delivery.Update, delivery.Withdrawal, delivery.Reminder, delivery.Drill} {
		for _, direction := range []pipeline.Direction{pipeline.NotAbove, pipeline.NotBelow} {
			for _, from := range states {
				for _, to := range order {
					central := 1500.0
					i := delivery.Item{Kind: kind, Direction: direction, From: from, To: to, Index: pipeline.Thaw,
						ToDate: delivery.Figures{Central: &central}, Design: delivery.Design{CDays: 1700}}
					got := says(&i)
					if past := strings.Contains(got, "index past its design value"); past != (to == pipeline.Exceeded && kind != delivery.Withdrawal && kind != delivery.Drill) {
						t.Errorf("%s %s %s -> %s: %q", kind, direction, from, to, got)
					}
					if kind == delivery.Withdrawal && !strings.Contains(got, "after all") {
						t.Errorf("%s -> %s withdrawn: %q", from, to, got)
					}
				}
			}
		}
	}
}
