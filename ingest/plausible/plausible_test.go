package plausible

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

// climate is that of ten years of an invented place, 8 degC of scatter in winter
// and 4 in summer.
func climate(random *rand.Rand) *Climate {
	stats := make([]DateStats, 366)
	for i := range stats {
		stats[i].YearDay = i + 1
		for range 10 {
			c := typical(i+1) + scatter(i+1)*random.NormFloat64()
			stats[i].N, stats[i].Sum, stats[i].Squares = stats[i].N+1, stats[i].Sum+c, stats[i].Squares+c*c
		}
	}
	return NewClimate(stats)
}

func typical(yearDay int) float64 { return -10 + 20*math.Sin(2*math.Pi*float64(yearDay-110)/365) }
func scatter(yearDay int) float64 { return 6 - 2*math.Sin(2*math.Pi*float64(yearDay-110)/365) }

func verdict(c *Climate, random *rand.Rand, first pipeline.Day, days int, warmer float64, wrong func(float64) float64) string {
	k := NewCheck(c)
	for d := first; d < first+pipeline.Day(days); d++ {
		n := d.Time().YearDay()
		v := typical(n) + warmer + scatter(n)*random.NormFloat64()
		k.Add(d, wrong(v+3))
		k.Add(d, wrong(v-3))
	}
	return k.Verdict()
}

func same(c float64) float64 { return c }

// degF are read as degC are, and the other way about: by the definitions of the units.
func TestVerdict(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 1))
	c := climate(random)
	july, january := pipeline.DayOf(2031, time.July, 1), pipeline.DayOf(2031, time.January, 10)
	for _, tc := range []struct {
		name  string
		first pipeline.Day
		days  int
		warm  float64
		wrong func(float64) float64
		says  string
	}{
		{"as it should be", july, 30, 0, same, ""},
		{"a month ten degrees too warm", july, 30, 10, same, ""},
		{"fifteen degrees too warm in winter", january, 30, 15, same, ""},
		{"degF for degC, July", july, 30, 0, func(v float64) float64 { return v*1.8 + 32 }, "degF, declared as degC"},
		{"degF for degC, a whole year", january, 365, 0, func(v float64) float64 { return v*1.8 + 32 }, "degF, declared as degC"},
		{"degC for degF", july, 30, 0, func(v float64) float64 { return (v - 32) / 1.8 }, "degC, declared as degF"},
		{"tenths", july, 30, 0, func(v float64) float64 { return v * 10 }, "tenths, declared as whole"},
		{"four days only", july, 4, 0, func(v float64) float64 { return v*1.8 + 32 }, ""},
	} {
		t.Run(tc.name, func(t *testing.T) {
			if got := verdict(c, random, tc.first, tc.days, tc.warm, tc.wrong); got == "" != (tc.says == "") || !strings.Contains(got, tc.says) {
				t.Errorf("%q; want %q", got, tc.says)
			}
		})
	}
	if got := verdict(NewClimate(nil), random, july, 30, 0, func(v float64) float64 { return v*1.8 + 32 }); got != "" {
		t.Errorf("without a record: %q", got)
	}
}

// Spells up to twelve degrees off, whatever the season, are not taken for a wrong
// unit.
func TestNoFalseVerdict(t *testing.T) {
	random := rand.New(rand.NewPCG(2, 2))
	c := climate(random)
	for range 2000 {
		first := pipeline.DayOf(2031, time.January, 1) + pipeline.Day(random.IntN(365))
		if got := verdict(c, random, first, 5+random.IntN(60), 24*random.Float64()-12, same); got != "" {
			t.Fatalf("%s: %s", first, got)
		}
	}
}
