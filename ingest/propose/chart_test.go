package propose

import (
	"math"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"
)

// Drawn by hand: a rise from -10 to 10 degC in four days, with the third missing.
func TestChart(t *testing.T) {
	points := []Point{{on(2031, 5, 1), -10}, {on(2031, 5, 2), -3}, {on(2031, 5, 4), 10}}
	// 21 columns for 3 days and a second: day 2 in column 21/3 = 7 but for the
	// second, that is the last of 6; ten half lines of 2 degC.
	want := strings.Join([]string{
		"   10.0 ┤                    ▀",
		"        │",
		"      0 ┤·····················",
		"        │      ▀",
		"  -10.0 ┤▄",
		"   degC └─────────────────────",
		"         2031-05-01 2031-05-04",
		"",
	}, "\n")
	if diff := cmp.Diff(want, Chart(points, 30, 7)); diff != "" {
		t.Errorf("chart (-want +got):\n%s", diff)
	}
	if got := Chart(nil, 80, 10); got != "no values to draw\n" {
		t.Errorf("without points %q", got)
	}
	if got := Chart([]Point{{on(2031, 5, 1), math.NaN()}}, 80, 10); got != "no values to draw\n" {
		t.Errorf("without values %q", got)
	}
}

// Whatever the points, the chart is as large as asked and has a mark for each
// column of time with values.
func TestChartFits(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		width, height := rapid.IntRange(-5, 500).Draw(t, "width"), rapid.IntRange(-5, 120).Draw(t, "height")
		points := rapid.SliceOfN(rapid.Custom(func(t *rapid.T) Point {
			return Point{time.Unix(rapid.Int64Range(-1e10, 1e10).Draw(t, "at"), 0), rapid.Float64Range(-100, 100).Draw(t, "value")}
		}), 1, 50).Draw(t, "points")
		lines := strings.Split(strings.TrimSuffix(Chart(points, width, height), "\n"), "\n")
		if want := min(max(height, leastHeight), mostHeight); len(lines) != want {
			t.Fatalf("%d lines, want %d", len(lines), want)
		}
		marks := 0
		for _, l := range lines {
			if n := utf8.RuneCountInString(l); n > min(max(width, leastWidth), mostWidth) {
				t.Fatalf("a line of %d characters, %d wide", n, width)
			}
			marks += strings.Count(l, "█") + strings.Count(l, "▀") + strings.Count(l, "▄")
		}
		if marks == 0 {
			t.Fatalf("nothing is drawn:\n%s", strings.Join(lines, "\n"))
		}
	})
}
