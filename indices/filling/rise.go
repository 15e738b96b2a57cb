package filling

import (
	"math/rand/v2"
	"slices"

	"thawledger/indices/degreeday"
)

// As many sets of errors as paths are drawn where a season's low or high is in
// question: the standard error then is known to about 1/sqrt(2 paths), 1.1 %, and
// less well where few sets touch the index at all. A place further above the low
// (below the high) than farSE standard errors of what is between them is not in
// question.
const (
	paths = 4000
	farSE = 5
)

// rise returns mean and standard deviation of the largest rise of a curve whose
// filled days have errors, given the rise of the estimates.
//
// If it is beyond doubt where low and high are, that is the rise itself and the
// standard deviation of the sum of the errors between them. If not, errors with
// the covariances that they have are drawn, always the same ones, and the rise is
// worked out for each set: so a day counts as often as it lies inside the season.
// The mean then is above the rise of the estimates, since the curve has its low
// and its high wherever errors make the rise the largest.
func (w *weigher) rise(excess []float64, track degreeday.Track) (mean, sd float64) {
	low, high := track.First, track.Last+1
	rise := 0.0
	if len(excess) > 0 {
		rise = track.ToDate[len(excess)-1]
	}
	if !w.inQuestion(excess, low, high) {
		return rise, w.between(max(low, 0), high)
	}
	rigid := w.rigid(excess)
	lower := w.cholesky()
	random := rand.New(rand.NewPCG(0x746861776c656467, 0x6572207269736573))
	drawn := make([]float64, len(w.at))
	sum, squares := 0.0, 0.0 // about rise
	for range paths {
		for i := range drawn {
			drawn[i] = random.NormFloat64()
		}
		running, most := rigid[0].after(0, 0)
		for i, at := range w.at {
			x := excess[at]
			for j, r := range lower[i] {
				x += float64(r * drawn[j])
			}
			running += x // below 0 is mended by the part that follows, be it empty
			most = max(most, running)
			running, most = rigid[i+1].after(running, most)
		}
		sum += most - rise
		squares += square(most - rise)
	}
	mean = sum / paths
	return rise + mean, standard(squares/paths - square(mean))
}

// inQuestion reports whether errors may move the low, at or before a place in the
// curve, or the high; also where the estimates have no rise but errors may.
func (w *weigher) inQuestion(excess []float64, low, high int) bool {
	if low < 0 {
		for i, at := range w.at {
			if excess[at]+farSE*w.se[i] > 0 {
				return true
			}
		}
		return false
	}
	fromLow := 0.0
	for i := low - 1; i >= 0; i-- { // the curve before the low is above it by -fromLow
		fromLow += excess[i]
		if -fromLow < farSE*w.between(i, low) {
			return true
		}
	}
	fromLow = 0
	for i := low; i < high; i++ {
		fromLow += excess[i]
		if se := w.between(low, i+1); i+1 < high && fromLow < farSE*se {
			return true
		}
	}
	toHigh := 0.0
	for i := high - 1; i > low; i-- {
		toHigh += excess[i]
		if toHigh < farSE*w.between(i, high) {
			return true
		}
	}
	toHigh = 0
	for i := high; i < len(excess); i++ {
		toHigh += excess[i]
		if -toHigh < farSE*w.between(high, i+1) {
			return true
		}
	}
	return false
}

// between returns the standard error of the sum of the days at places from
// through before to.
func (w *weigher) between(from, to int) float64 {
	a, _ := slices.BinarySearch(w.at, from)
	b, _ := slices.BinarySearch(w.at, to)
	return standard(w.upTo[b][b] - w.upTo[a][b] - w.upTo[b][a] + w.upTo[a][a])
}

// part is a part of the curve between two filled days: errors move it as a whole.
type part struct {
	sum       float64 // of its excesses
	low, high float64 // lowest and highest value, from 0 before its first day
	rise      float64 // largest rise inside
}

// rigid returns the parts before, between and after the filled days.
func (w *weigher) rigid(excess []float64) []part {
	out := make([]part, 0, len(w.at)+1)
	from := 0
	for k := range len(w.at) + 1 {
		to := len(excess)
		if k < len(w.at) {
			to = w.at[k]
		}
		var p part
		for _, x := range excess[from:to] {
			p.sum += x
			p.low, p.high = min(p.low, p.sum), max(p.high, p.sum)
			p.rise = max(p.rise, p.sum-p.low)
		}
		out = append(out, p)
		from = to + 1
	}
	return out
}

// after returns what the running value and the largest so far come to at the end
// of the part.
func (p *part) after(running, most float64) (float64, float64) {
	return max(running+p.sum, p.sum-p.low), max(most, p.rise, running+p.high)
}

// cholesky returns the lower triangle L with L L' the covariances. What rounding,
// or correlations that were each estimated alone, have made negative is 0.
func (w *weigher) cholesky() [][]float64 {
	out := make([][]float64, len(w.cov))
	for i := range out {
		out[i] = make([]float64, i+1)
		for j := range i + 1 {
			v := w.cov[i][j]
			for k := range j {
				v -= float64(out[i][k] * out[j][k])
			}
			switch {
			case i == j:
				out[i][i] = standard(v)
			case out[j][j] > 1e-6*w.se[j]:
				out[i][j] = v / out[j][j]
			}
		}
	}
	return out
}
