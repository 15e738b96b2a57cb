package filling

import (
	"slices"

	"thawledger/pipeline"
)

// Ladder fills, up the ladder, the days from first through last that target does
// not have. Days that no rung fills are left out. climate says whether the rung
// climate may be used. Series are as in Fit, and may be longer than first to last.
func (m *Model) Ladder(first, last pipeline.Day, target []Point, neighbours []Neighbour, climate bool) []Filled {
	var out []Filled
	means := make([]NeighbourMean, 0, len(neighbours))
	for d := first; d <= last; d++ {
		i, seen := at(target, d)
		if seen {
			continue
		}
		f := Filled{Day: d}
		between := i > 0 && i < len(target)
		if between {
			f.Gap, f.Place = int(target[i].Day-target[i-1].Day)-1, int(d-target[i-1].Day)
		}
		ok := false
		if between {
			f.Rung = ByLine
			f.MeanC, f.SEC, ok = m.FillLine(target[i-1], target[i], d)
		}
		if !ok {
			means = means[:0]
			for k := range neighbours {
				if j, seen := at(neighbours[k].Points, d); seen {
					means = append(means, NeighbourMean{neighbours[k].Station, neighbours[k].Points[j].MeanC})
				}
			}
			f.Rung = ByNeighbour
			f.MeanC, f.SEC, f.Neighbour, ok = m.Fill(d, means)
		}
		if !ok && climate {
			f.Rung = ByClimate
			f.MeanC, f.SEC, ok = m.FillClimate(d)
		}
		if ok {
			out = append(out, f)
		}
	}
	return out
}

// at returns where a day is, or would be, in a series.
func at(points []Point, d pipeline.Day) (int, bool) {
	return slices.BinarySearchFunc(points, d, func(p Point, d pipeline.Day) int { return int(p.Day) - int(d) })
}
