package filling

import (
	"fmt"

	"thawledger/pipeline"
)

// MostLine is the longest gap, in days, that a straight line may ever be asked to bridge.
const MostLine = 5

// LineSpread is how far straight lines over gaps of a length were off, had the
// days been missing, in a month and the two beside it.
type LineSpread struct {
	Gaps int // that could be tried
	// C are the mean products of the errors of the gap's days, degC squared: C[i][i]
	// the mean square of day i, from 0.
	C [MostLine][MostLine]float64
}

// lines are the spreads by month and length less one.
type lines [12][MostLine]LineSpread

// linesOf tries every stretch of observed days as if its inner ones were missing.
func linesOf(target []Point, most int) *lines {
	l := &lines{}
	for n := 1; n <= min(most, MostLine); n++ {
		for i := 0; i+n+1 < len(target); i++ {
			if target[i+n+1].Day-target[i].Day != pipeline.Day(n)+1 {
				continue
			}
			var e [MostLine]float64
			for k := 1; k <= n; k++ {
				e[k-1] = onLine(target[i], target[i+n+1], target[i+k].Day) - target[i+k].MeanC
			}
			_, month, _ := placeOf(target[i+(n+1)/2].Day)
			for off := 11; off <= 13; off++ {
				s := &l[(month+off)%12][n-1]
				s.Gaps++
				for a := range n {
					for b := range n {
						s.C[a][b] += e[a] * e[b]
					}
				}
			}
		}
	}
	for m := range l {
		for n := range l[m] {
			s := &l[m][n]
			for a := range s.C {
				for b := range s.C {
					s.C[a][b] /= float64(max(s.Gaps, 1))
				}
			}
		}
	}
	return l
}

func onLine(before, after Point, d pipeline.Day) float64 {
	share := float64(d-before.Day) / float64(after.Day-before.Day)
	return before.MeanC + (after.MeanC-before.MeanC)*share
}

// enoughGaps is how many gaps must have been tried: judgement, no source.
const enoughGaps = 60

// at returns the spread for a gap of n days in a day's month; nil if too few
// gaps could be tried.
func (l *lines) at(d pipeline.Day, n int) *LineSpread {
	if n < 1 || n > MostLine {
		return nil
	}
	_, month, _ := placeOf(d)
	if s := &l[month][n-1]; s.Gaps >= enoughGaps {
		return s
	}
	return nil
}

// covariance is that of the errors of two days of one gap.
func (l *lines) covariance(a, b *Filled) float64 {
	if a.Day-pipeline.Day(a.Place) != b.Day-pipeline.Day(b.Place) || a.Gap != b.Gap {
		return 0
	}
	if a.Place < 1 || a.Place > a.Gap || b.Place < 1 || b.Place > b.Gap || a.Gap > MostLine {
		panic(fmt.Sprintf("filling: day %s is at place %d of a gap of %d on a line", a.Day, a.Place, a.Gap))
	}
	s := l.at(a.Day-pipeline.Day(a.Place-1), a.Gap) // one month for the whole gap
	if s == nil {
		return 0
	}
	return s.C[a.Place-1][b.Place-1]
}
