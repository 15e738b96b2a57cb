package propose

import (
	"math"
	"slices"
)

// likeliest keeps the columns with frost, if any has, and those that go with
// one: no humidity, rain or wind is below 0.
func likeliest(all []*column) []*column {
	frost := slices.IndexFunc(all, func(c *column) bool { lo, _, _ := c.bounds(); return lo < 0 })
	if frost < 0 {
		return all
	}
	return slices.DeleteFunc(slices.Clone(all), func(c *column) bool {
		lo, _, _ := c.bounds()
		return lo >= 0 && correlation(c, all[frost]) < leastTogether
	})
}

// correlation returns Pearson's coefficient of two columns; 0 if there is none.
func correlation(a, b *column) float64 {
	var n, sa, sb, saa, sbb, sab float64
	for i, x := range a.values {
		if y := b.values[i]; !math.IsNaN(x) && !math.IsNaN(y) {
			n, sa, sb = n+1, sa+x, sb+y
			saa, sbb, sab = saa+x*x, sbb+y*y, sab+x*y
		}
	}
	if d := (n*saa - sa*sa) * (n*sbb - sb*sb); d > 0 {
		return (n*sab - sa*sb) / math.Sqrt(d)
	}
	return 0
}

// pair returns the first two columns that go together and of which one is never
// below the other, and mostly above: a max and its min.
func pair(all []*column) (over, under *column) {
	for i, a := range all {
		for _, b := range all[i+1 : min(len(all), i+4)] {
			n, above, below := 0, 0, 0
			for k, v := range a.values {
				switch w := b.values[k]; {
				case math.IsNaN(v) || math.IsNaN(w):
					continue
				case v > w:
					above++
				case v < w:
					below++
				}
				n++
			}
			switch least := int(math.Ceil(leastOver * float64(n))); {
			case n < leastDistinct || correlation(a, b) < leastTogether:
			case n-below >= least && above*2 > n:
				return a, b
			case n-above >= least && below*2 > n:
				return b, a
			}
		}
	}
	return nil, nil
}
