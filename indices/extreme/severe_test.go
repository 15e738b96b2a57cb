package extreme

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

func seasonsOf(first int, values ...float64) []Season {
	out := make([]Season, len(values))
	for i, v := range values {
		out[i] = Season{Start: pipeline.DayOf(first+i, 1, 15), Label: fmt.Sprint(first + i), Low: v, High: v, Over: true}
	}
	return out
}

func labels(seasons []Season) []string {
	var out []string
	for _, s := range seasons {
		out = append(out, s.Label)
	}
	return out
}

// Example of 30 thawing indices, worked independently: the three warmest are 1957,
// 1941 and 1922, their mean is 1940.0. Rule: US Army TM 5-852-1.
var thirty = []float64{
	1812, 1755, 1900, 1688, 1734, 1922, 1850, 1795, 1766, 1701, 1880, 1843, 1779, 1811, 1690, 1745, 1798,
	1864, 1957, 1722, 1835, 1788, 1810, 1770, 1899, 1941, 1756, 1803, 1868, 1830,
}

func TestThreeWarmest(t *testing.T) {
	seasons := append(seasonsOf(1961, 5000, 4000), seasonsOf(1963, thirty...)...)
	open := Season{Start: pipeline.DayOf(1993, 1, 15), Label: "1993", Low: 2100, High: 9000}
	s, err := MostSevere(append(seasons, open), Upper, 3, 30)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "design index", s.Low, 1940, 1e-12)
	if !s.Settled() || !slices.Equal(labels(s.Used), []string{"1981", "1988", "1968"}) || s.Unended != 1 ||
		s.Seasons[0].Label != "1963" || len(s.Seasons) != 30 {
		t.Errorf("%v to %v, used %v, of %s on", s.Low, s.High, labels(s.Used), s.Seasons[0].Label)
	}
	if _, err := MostSevere(seasonsOf(1964, thirty[1:]...), Upper, 3, 30); err == nil {
		t.Error("29 seasons will do for 30")
	}
}

// Source of the record: CRREL Report 96-14, table 20; the figures from it worked
// independently: three coldest 1477, 1331, 1274, coldest of the latest 10 1227.
func TestColdestOfCRREL(t *testing.T) {
	seasons := seasonsOf(1969, crrel()...)
	ten, err := MostSevere(seasons, Upper, 1, 10)
	if err != nil {
		t.Fatal(err)
	}
	three, err := MostSevere(seasons, Upper, 3, 21)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "coldest of 10", ten.Low, 1227, 0)
	near(t, "three coldest", three.Low, 1360.666667, 5e-7)
	mild, err := MostSevere(seasons, Lower, 1, 10)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "mildest of 10", mild.High, 467, 0)
}

// A season with missing days is left out only if it could not be among the
// warmest; by hand.
func TestIncompleteSeasonIsALowerBound(t *testing.T) {
	for _, tc := range []struct {
		name          string
		low, high     float64 // of 1990, in place of 1770
		from, to      float64
		open, leftOut []string
	}{
		{"could not be among them", 300, 1922, 1940, 1940, nil, []string{"1986"}},
		{"may be", 300, 1928, 1940, (1957 + 1941 + 1928) / 3.0, []string{"1986"}, nil},
		{"is already", 1950, 2000, (1957 + 1950 + 1941) / 3.0, (2000 + 1957 + 1941) / 3.0, []string{"1986"}, nil},
	} {
		seasons := seasonsOf(1963, thirty...)
		seasons[23].Low, seasons[23].High = tc.low, tc.high
		s, err := MostSevere(seasons, Upper, 3, 30)
		if err != nil {
			t.Fatal(err)
		}
		near(t, tc.name+", low", s.Low, tc.from, 1e-9)
		near(t, tc.name+", high", s.High, tc.to, 1e-9)
		if !slices.Equal(labels(s.Open), tc.open) || !slices.Equal(labels(s.LeftOut), tc.leftOut) {
			t.Errorf("%s: open %v, left out %v", tc.name, labels(s.Open), labels(s.LeftOut))
		}
	}
	// By the rule for the mild side it is the low bound that tells.
	seasons := seasonsOf(1963, thirty...)
	seasons[23].Low, seasons[23].High = 1700, 3000 // the mildest are 1688, 1690, 1701
	s, err := MostSevere(seasons, Lower, 3, 30)
	if err != nil {
		t.Fatal(err)
	}
	near(t, "mild, low", s.Low, (1688+1690+1700)/3.0, 1e-9)
	near(t, "mild, high", s.High, (1688+1690+1701)/3.0, 1e-9)
}

// Whatever the missing days were, the value is within its bounds; it is settled
// exactly if no season leaves it open; and both bounds can come true.
func TestBoundsOfMostSevere(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(3, 12).Draw(t, "n")
		count := rapid.IntRange(1, n).Draw(t, "count")
		tail := rapid.SampledFrom([]Tail{Upper, Lower}).Draw(t, "tail")
		seasons := seasonsOf(2000, make([]float64, n)...)
		truth := make([]Season, n)
		for i := range seasons {
			low := float64(rapid.IntRange(0, 20).Draw(t, "low"))
			more := float64(rapid.IntRange(0, 5).Draw(t, "more"))
			seasons[i].Low, seasons[i].High = low, low+more
			truth[i] = seasons[i]
			v := low + more*rapid.Float64Range(0, 1).Draw(t, "share")
			truth[i].Low, truth[i].High = v, v
		}
		s, err := MostSevere(seasons, tail, count, n)
		if err != nil {
			t.Fatal(err)
		}
		real, err := MostSevere(truth, tail, count, n)
		if err != nil {
			t.Fatal(err)
		}
		if real.Low != real.High || real.Low < s.Low-1e-9 || real.High > s.High+1e-9 {
			t.Fatalf("%v outside %v to %v", real.Low, s.Low, s.High)
		}
		if s.Settled() != (len(s.Open) == 0) && math.Abs(s.High-s.Low) > 1e-12 {
			t.Fatalf("%v to %v, open %v", s.Low, s.High, labels(s.Open))
		}
	})
}
