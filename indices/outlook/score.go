package outlook

import (
	"math"
	"slices"
)

// CRPS returns the continuous ranked probability score of an ensemble, in its
// unit: mean |x - y| less half the mean |x - x'| over all pairs of members, the
// pair of a member with itself among them. It is 0 at best, and the absolute
// error for a single value. T. Gneiting and A. E. Raftery (2007, "Strictly proper
// scoring rules, prediction, and estimation", Journal of the American
// Statistical Association 102), equation 21 from memory. The members are sorted.
func CRPS(sortedMembers []float64, outcome float64) float64 {
	far, apart := spreads(sortedMembers, outcome)
	n := float64(len(sortedMembers))
	return far/n - apart/(n*n)
}

// FairCRPS is CRPS with the mean over pairs of different members: what an
// ensemble of any size would score on average if it had endless members of the
// same kind (C. A. T. Ferro, 2014, "Fair scores for ensemble forecasts",
// Quarterly Journal of the Royal Meteorological Society 140; from memory). It
// may be negative for one outcome. It takes at least two members.
func FairCRPS(sortedMembers []float64, outcome float64) float64 {
	far, apart := spreads(sortedMembers, outcome)
	n := float64(len(sortedMembers))
	return far/n - apart/(n*(n-1))
}

// spreads returns the sum of |x - y|, and of |x - x'| over all unordered pairs.
func spreads(sortedMembers []float64, outcome float64) (far, apart float64) {
	n := len(sortedMembers)
	for i, x := range sortedMembers {
		far += math.Abs(x - outcome)
		if i > 0 {
			// i members lie below this gap and n - i above: so many pairs span it.
			apart += float64(i*(n-i)) * (x - sortedMembers[i-1])
		}
	}
	return far, apart
}

// Pinball returns the quantile score of a value given as the quantile for a
// share: share times what the outcome is above it, or 1 - share times what it is
// below. In the unit of the value; 0 at best. R. Koenker and G. Bassett (1978,
// "Regression quantiles", Econometrica 46).
func Pinball(quantile, share, outcome float64) float64 {
	if outcome >= quantile {
		return share * (outcome - quantile)
	}
	return (1 - share) * (quantile - outcome)
}

// Brier returns the mean square of forecast less outcome (G. W. Brier, 1950,
// "Verification of forecasts expressed in terms of probability", Monthly Weather
// Review 78): 0 at best. It panics if there are none, or not as many of both.
func Brier(forecasts []float64, happened []bool) float64 {
	return Decompose(forecasts, happened).Brier()
}

// Decomposition is a Brier score in three parts (A. H. Murphy, 1973, "A new
// vector partition of the probability score", Journal of Applied Meteorology 12).
type Decomposition struct {
	Reliability float64 // how far forecasts are from what happened when they were given; 0 at best
	Resolution  float64 // how much what happened differs between forecasts; the more the better
	Uncertainty float64 // of what happened, whatever was forecast
}

// Brier returns the score.
func (d Decomposition) Brier() float64 { return d.Reliability - d.Resolution + d.Uncertainty }

// Skill returns the share by which the score is better than that of always
// forecasting how often it happened; false if it always or never did.
func (d Decomposition) Skill() (float64, bool) {
	if d.Uncertainty == 0 {
		return 0, false
	}
	return (d.Resolution - d.Reliability) / d.Uncertainty, true
}

// Decompose takes the Brier score apart by equal forecasts, so that the parts add
// up to it exactly. It panics if there are none, or not as many outcomes as
// forecasts.
func Decompose(forecasts []float64, happened []bool) Decomposition {
	if len(forecasts) == 0 || len(forecasts) != len(happened) {
		panic("outlook: as many outcomes as forecasts, and at least one")
	}
	order := make([]int, len(forecasts))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch {
		case forecasts[a] < forecasts[b]:
			return -1
		case forecasts[a] > forecasts[b]:
			return 1
		}
		return 0
	})
	n, hits := float64(len(forecasts)), 0
	for _, h := range happened {
		if h {
			hits++
		}
	}
	base := float64(hits) / n
	d := Decomposition{Uncertainty: base * (1 - base)}
	for i := 0; i < len(order); {
		f, k, count := forecasts[order[i]], 0, 0
		for ; i < len(order) && forecasts[order[i]] == f; i++ {
			count++
			if happened[order[i]] {
				k++
			}
		}
		seen, weight := float64(k)/float64(count), float64(count)/n
		d.Reliability += float64(weight * square(f-seen))
		d.Resolution += float64(weight * square(seen-base))
	}
	return d
}

func square(x float64) float64 { return x * x }
