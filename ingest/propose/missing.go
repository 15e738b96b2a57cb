package propose

import (
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// noValue are texts that stand for no value in the files of many stations
// (common practice, no source).
var noValue = []string{"nan", "na", "n/a", "#n/a", "m", "null", "none", "nil", "missing", "miss", "nd", "n.d.", "no data", "nodata"}

// A number stands for no value if it is far outside the rest, and is made of
// nines or comes again and again. Judgement, no source.
const (
	farOutside  = 15.0 // in the column's own unit, and
	farPart     = 0.5  // of the range of the rest
	oftenEnough = 3
	manyPeeled  = 6
)

// findMissing finds texts that stand for no value, and takes those that are
// numbers out of the values.
func (c *column) findMissing() {
	for _, text := range sortedKeys(c.texts) {
		switch {
		case standsForNothing(text):
			c.missing = append(c.missing, text)
		case utf8.ValidString(text) && len(text) <= 20:
			c.unknown = append(c.unknown, text)
		}
	}
	if c.numeric == 0 {
		return
	}
	counts := map[float64]int{}
	for _, v := range c.values {
		if !math.IsNaN(v) {
			counts[v]++
		}
	}
	values := make([]float64, 0, len(counts))
	for v := range counts {
		values = append(values, v)
	}
	slices.Sort(values)
	gone := map[float64]bool{}
	for range manyPeeled {
		n := len(values)
		if n < 2 {
			break
		}
		gap := func(inner []float64, d float64) bool {
			return d > max(farOutside, farPart*(inner[len(inner)-1]-inner[0]))
		}
		odd := func(v float64) bool { return ofNines(v) || counts[v] >= oftenEnough }
		switch {
		case odd(values[0]) && gap(values[1:], values[1]-values[0]):
			gone[values[0]] = true
			values = values[1:]
		case odd(values[n-1]) && gap(values[:n-1], values[n-1]-values[n-2]):
			gone[values[n-1]] = true
			values = values[:n-1]
		default:
			n = 0
		}
		if n == 0 {
			break
		}
	}
	if len(values) == 1 && ofNines(values[0]) && (values[0] < 0 || values[0] >= 999) {
		gone[values[0]] = true // the column has nothing else
	}
	if len(gone) == 0 {
		return
	}
	for i, v := range c.values {
		if gone[v] {
			c.values[i] = math.NaN()
			if !slices.Contains(c.doubtful, c.cells[i]) && len(c.doubtful) < manyPeeled {
				c.doubtful = append(c.doubtful, c.cells[i])
			}
		}
	}
	slices.Sort(c.doubtful)
	c.missing = append(c.missing, c.doubtful...)
}

func standsForNothing(text string) bool {
	return slices.Contains(noValue, strings.ToLower(text)) || strings.Trim(text, "-*.?_/") == ""
}

// ofNines reports whether a number is written with nines only, from 99 on, as
// 99.9 and -9999.0 are, or has such a number's thousands, as -6999 has.
func ofNines(v float64) bool {
	text := strconv.FormatFloat(math.Abs(v), 'f', -1, 64)
	text = strings.Replace(text, ".", "", 1)
	if len(text) == 4 && (text == "6999" || text == "7999" || text == "8999") {
		return true
	}
	return len(text) >= 2 && math.Abs(v) >= 99 && strings.Trim(text, "9") == ""
}

func sortedKeys(m map[string]int) []string {
	keys := make([]string, 0, len(m))
	for k := range m {
		keys = append(keys, k)
	}
	slices.Sort(keys)
	return keys
}
