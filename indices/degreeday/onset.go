package degreeday

import "thawledger/indices/compensated"

// LeastPast is from how many past seasons on their relapses say when an onset
// holds; with fewer it does above 50 degC.d. Both are common practice, no source.
const LeastPast = 10

// LargestFall returns the largest fall of the cumulative curve C of daily
// excesses, in degC.d, that begins at place from or later and ends at place to at
// the latest: the maximum over from <= i < j <= to of C(i) - C(j), with C(i) that
// at the end of the day at i. It is 0 if there is none.
//
// With to the day of a season's high it is the largest relapse that a thaw
// (freeze) under way on the day at from has still met with.
func LargestFall(excessC []float64, from, to int) float64 {
	var since compensated.Sum // C less its highest value since from
	largest := 0.0
	for i := from + 1; i <= to && i < len(excessC); i++ {
		since.Add(excessC[i])
		fall := -since.Value()
		if fall <= 0 {
			since = compensated.Sum{}
		}
		largest = max(largest, fall)
	}
	return largest
}

// Settle says whether the season's onset is provisional still: it is until the
// season is over or even the lowest filling has risen above the largest relapse
// that a past season has met with from this date on. relapses are those of past
// seasons without missing days.
func (s *Season) Settle(relapses []float64) {
	if s.Over || len(relapses) < LeastPast {
		return
	}
	largest := 0.0
	for _, r := range relapses {
		largest = max(largest, r)
	}
	s.Curve.OnsetProvisional = s.Curve.Index.Low <= largest
}
