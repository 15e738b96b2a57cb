package trend

import (
	"cmp"
	"fmt"
	"math"
	"slices"
)

// Point is a value at a time.
type Point struct {
	Time  float64 // years
	Value float64 // any unit
}

// MinPoints is the least number of points: with fewer no test can find anything.
const MinPoints = 4

// most is the largest magnitude of a time or value.
const most = 1e12

// ordered returns the points in order of time, or says why they will not do.
func ordered(points []Point) ([]Point, error) {
	if len(points) < MinPoints {
		return nil, fmt.Errorf("%d points are too few for a trend: at least %d are needed", len(points), MinPoints)
	}
	out := slices.SortedFunc(slices.Values(points), func(a, b Point) int { return cmp.Compare(a.Time, b.Time) })
	for i, p := range out {
		if !(math.Abs(p.Time) <= most && math.Abs(p.Value) <= most) { // true for NaN too
			return nil, fmt.Errorf("point (%v, %v) is not of finite numbers of at most %g", p.Time, p.Value, most)
		}
		if i > 0 && p.Time == out[i-1].Time {
			return nil, fmt.Errorf("two points have the time %g", p.Time)
		}
		// Two times closer than this would make a slope beyond float64.
		if i > 0 && p.Time-out[i-1].Time < 1e-6 {
			return nil, fmt.Errorf("two points have times less than 1e-6 apart, about %g", p.Time)
		}
	}
	return out, nil
}
