package daily

import (
	"fmt"

	"thawledger/pipeline"
)

// Complete returns every day from the first to the last observed day of values,
// and the record's extremes, which bound days before and after it too. values
// are in order of date, each day at most once; of those not observed only what
// is their own (see Value.Own) is looked at, so that a completed record may be
// completed again. Without an observed day there are no days.
//
// A gap of at most fillDays days is filled on a straight line between the
// observed days beside it (common practice, no source): Interpolated, marked
// estimated. The days of a longer gap are Missing, with the bounds of
// Extremes.Bounds. Either keeps its maximum, minimum and hours, where known.
//
// Values before the first and after the last observed day are not returned. A
// caller who keeps them takes their bounds from the extremes.
//
// Complete panics if the days are not in order or an observed mean is not
// finite or beyond 1e6 degC.
func Complete(values []Value, fillDays int) ([]Value, *Extremes) {
	first, last := -1, -1
	for i := range values {
		v := &values[i]
		if i > 0 && v.Day <= values[i-1].Day {
			panic(fmt.Sprintf("daily: day %s after %s; days must be in order, each at most once", v.Day, values[i-1].Day))
		}
		if v.Origin != pipeline.Observed {
			continue
		}
		if !isTemperature(v.MeanC) {
			panic(fmt.Sprintf("daily: mean %v degC of %s is not a temperature", v.MeanC, v.Day))
		}
		if first < 0 {
			first = i
		}
		last = i
	}
	extremes := extremesOf(values)
	if first < 0 {
		return nil, extremes
	}
	out := make([]Value, 0, int(values[last].Day-values[first].Day)+1)
	before := first // the observed day before
	for i := first; i <= last; i++ {
		v := values[i]
		if v.Origin != pipeline.Observed {
			continue
		}
		out = appendGap(out, values[before], v, values[min(before+1, i):i], fillDays, extremes)
		v.LowC, v.HighC = v.MeanC, v.MeanC
		out = append(out, v)
		before = i
	}
	return out, extremes
}

// appendGap appends the days between two observed ones; known are values of some
// of them.
func appendGap(out []Value, before, after Value, known []Value, fillDays int, extremes *Extremes) []Value {
	n := int(after.Day-before.Day) - 1
	for i := 1; i <= n; i++ {
		v := Value{Day: before.Day + pipeline.Day(i), Rule: before.Rule}
		if v.Rule == pipeline.MeanHourly {
			v.LongestHole = 24
		}
		if len(known) > 0 && known[0].Day == v.Day {
			if known[0].Own() {
				v = known[0]
				v.ErrorC, v.HasError, v.From = 0, false, "" // of an earlier filling
			}
			known = known[1:]
		}
		if n <= fillDays {
			rise := float64((after.MeanC - before.MeanC) * (float64(i) / float64(n+1)))
			v.Origin, v.MeanC, v.Quality = pipeline.Interpolated, before.MeanC+rise, pipeline.QualityEstimated
			v.LowC, v.HighC = v.MeanC, v.MeanC
		} else {
			v.Origin, v.MeanC, v.Quality = pipeline.Missing, 0, pipeline.QualityMissing
			v.LowC, v.HighC = extremes.Bounds(v.Day)
		}
		out = append(out, v)
	}
	return out
}
