package quality

import (
	"fmt"
	"math"
	"slices"
)

// Limits of Neighbour: Durre et al., 2010, second-hand.
const (
	leastPairs       = 40
	leastCorrelation = 0.8
	residualC        = 8.0
	residualZ        = 4.0
)

// neighbours makes Neighbour.
func (s *sheet) neighbours(opt *Options, out []Outcome) {
	if len(opt.Neighbours) < opt.leastNeighbours() {
		return
	}
	own := &s.elements[meanOf]
	expected := make([][]float64, len(out)) // by day: what each neighbour lets expect
	all := make([]float64, len(out)*len(opt.Neighbours))
	for i := range expected {
		first := i * len(opt.Neighbours)
		expected[i] = all[first : first : first+len(opt.Neighbours)]
	}
	for k, rec := range opt.Neighbours {
		s.expect(k, rec, own, opt.bounds(), expected)
	}
	for _, v := range expected {
		slices.Sort(v)
	}
	residual := func(i int) (float64, bool) {
		if !own.has[i] || len(expected[i]) < opt.leastNeighbours() {
			return 0, false
		}
		return own.c[i] - median(expected[i]), true
	}
	var sd [12]float64
	var known [12]bool
	for m, v := range s.byMonth(residual) {
		_, sd[m], known[m] = biweight(sorted(v))
	}
	for i, m := range s.month {
		if r, ok := residual(i); ok && known[m] {
			out[i].note(Neighbour, math.Abs(r) >= residualC && math.Abs(r) >= residualZ*sd[m])
		}
	}
}

// expect adds what one neighbour lets expect.
func (s *sheet) expect(k int, rec Record, own *element, b Bounds, expected [][]float64) {
	usable := func(j int) bool {
		return 0 <= j && j < len(rec) && rec[j].Observed && b.LowestC <= rec[j].MeanC && rec[j].MeanC <= b.HighestC
	}
	at := make([]int, len(s.days)) // first day of the neighbour's that is not before ours
	j := 0
	for i, d := range s.days {
		for j < len(rec) && rec[j].Day < d {
			if j++; j < len(rec) && rec[j].Day <= rec[j-1].Day {
				panic(fmt.Sprintf("quality: day %s after %s in neighbour %d; days must be in order, each at most once", rec[j].Day, rec[j-1].Day, k+1))
			}
		}
		at[i] = j
	}
	lines := s.regress(func(i int) (x, y float64, ok bool) {
		if j := at[i]; own.has[i] && usable(j) && rec[j].Day == s.days[i] {
			return rec[j].MeanC, own.c[i], true
		}
		return 0, 0, false
	})
	for i, d := range s.days {
		l := &lines[s.month[i]]
		if !own.has[i] || !l.ok {
			continue
		}
		best, found := 0.0, false
		for j := at[i] - 1; j <= at[i]+1; j++ {
			if !usable(j) {
				continue
			}
			if apart := rec[j].Day - d; apart < -1 || apart > 1 {
				continue
			}
			if c := l.y + float64(l.slope*(rec[j].MeanC-l.x)); !found || math.Abs(own.c[i]-c) < math.Abs(own.c[i]-best) {
				best, found = c, true
			}
		}
		if found {
			expected[i] = append(expected[i], best)
		}
	}
}

// line is a regression of y on x: y = mean y + slope (x - mean x).
type line struct {
	x, y, slope float64
	ok          bool
}

// regress fits a line for each calendar month by least squares.
func (s *sheet) regress(pair func(i int) (x, y float64, ok bool)) [12]line {
	var n, sumX, sumY [12]float64
	for i, m := range s.month {
		if x, y, ok := pair(i); ok {
			n[m]++
			sumX[m] += x
			sumY[m] += y
		}
	}
	var out [12]line
	for m := range out {
		if n[m] > 0 {
			out[m].x, out[m].y = sumX[m]/n[m], sumY[m]/n[m]
		}
	}
	var xx, xy, yy [12]float64
	for i, m := range s.month {
		if x, y, ok := pair(i); ok {
			dx, dy := x-out[m].x, y-out[m].y
			xx[m] += float64(dx * dx)
			xy[m] += float64(dx * dy)
			yy[m] += float64(dy * dy)
		}
	}
	for m := range out {
		if n[m] < leastPairs || xx[m] == 0 || yy[m] == 0 {
			continue
		}
		out[m].slope = xy[m] / xx[m]
		out[m].ok = xy[m]/math.Sqrt(float64(xx[m]*yy[m])) >= leastCorrelation
	}
	return out
}
