package daily

import (
	"cmp"
	"fmt"
	"slices"

	"thawledger/pipeline"
)

// Input is a reading, with what decides between several of the same.
type Input struct {
	Feed     string
	Rank     int // of the feed: the higher wins
	Sensor   string
	Variable pipeline.Variable
	SpanS    int32
	StartS   int64 // s since 1970-01-01T00:00:00Z
	ValueC   float64
	Quality  pipeline.Quality
}

const (
	hourS = 3600
	dayS  = 86400
)

// Make returns the value of a station's day from its readings, in any order;
// those of other days are not looked at.
//
// The mean is made by the station's rule:
//   - max_min: (max + min) / 2 of the maximum and minimum that cover the
//     station's day, as in US and Canadian climatology (ISO 13793:2001, A.2,
//     allows it too);
//   - as_reported: the mean that covers the station's day;
//   - hourly: the mean of the hours that have a value, an hour's value being the
//     mean of its readings: instants within the hour, and means over less than a
//     day that start in it and end within the day. It takes MinHours hours, and
//     no run of more than MaxHole hours without one (common practice, no source).
//
// A day with too little is missing, with the widest plausible bounds. Maximum
// and minimum are given whenever they are known, whatever the rule.
//
// Of readings of the same variable, start and span one is used: that of the
// highest rank, then of the first feed by name, then of the first sensor by
// name. Marked missing, or no temperature at all (not finite, beyond 1e6 degC), a
// reading is as if it were not there.
// Marked wrong it is not used either, and it keeps out readings of lower rank
// that name the same sensor: what a check has struck out does not come back from
// a raw feed. A maximum below the minimum marks the day inconsistent; it stays.
//
// Make panics if the station's rule is unknown.
func Make(st *pipeline.Station, d pipeline.Day, in []Input) Value {
	v := Value{
		Day: d, Origin: pipeline.Missing, LowC: lowestC, HighC: highestC, Rule: st.Mean, Quality: pipeline.QualityMissing,
	}
	from := st.DayStart(d).Unix()
	var memory [32]Input // a day of hourly values needs no allocation
	used := ofDay(memory[:0], in, from)
	used = chosen(used)

	var hours hourly
	var maxMark, minMark, meanMark pipeline.Quality
	var meanC float64
	hasMean := false
	for _, r := range used {
		switch {
		case r.SpanS != dayS:
			hours.add(int((r.StartS-from)/hourS), r.ValueC, r.Quality)
		case r.Variable == pipeline.AirTempMax:
			v.MaxC, v.HasMax, maxMark = r.ValueC, true, r.Quality
		case r.Variable == pipeline.AirTempMin:
			v.MinC, v.HasMin, minMark = r.ValueC, true, r.Quality
		default:
			meanC, hasMean, meanMark = r.ValueC, true, r.Quality
		}
	}
	switch st.Mean {
	case pipeline.MeanMaxMin:
		if v.HasMax && v.HasMin {
			v.observe((v.MaxC+v.MinC)/2, worse(maxMark, minMark))
		}
	case pipeline.MeanAsReported:
		if hasMean {
			v.observe(meanC, meanMark)
		}
	case pipeline.MeanHourly:
		mean, n, hole := hours.mean()
		v.Hours, v.LongestHole = int16(n), int16(hole)
		if n > 0 && n >= st.MinHours && hole <= st.MaxHole {
			v.observe(mean, hours.mark)
		}
	default:
		panic(fmt.Sprintf("daily: station %s has no rule for the mean: %q", st.ID, string(st.Mean)))
	}
	if v.Origin == pipeline.Observed && v.HasMax && v.HasMin && v.MaxC < v.MinC {
		v.Quality = pipeline.QualityInconsistent
	}
	return v
}

// ofDay appends to out the readings that belong to the day that starts at from.
func ofDay(out, in []Input, from int64) []Input {
	for i := range in {
		r := &in[i]
		if r.Quality != pipeline.QualityWrong && severity(r.Quality) < 0 || !isTemperature(r.ValueC) {
			continue
		}
		whole := r.SpanS == dayS && r.StartS == from && r.Variable != pipeline.AirTemp
		part := r.SpanS < dayS && (r.Variable == pipeline.AirTemp || r.Variable == pipeline.AirTempMean) &&
			from <= r.StartS && r.StartS < from+dayS && r.StartS+int64(r.SpanS) <= from+dayS
		if whole || part {
			out = append(out, *r)
		}
	}
	return out
}

// chosen sorts readings and keeps one of each variable, start and span.
func chosen(rs []Input) []Input {
	slices.SortFunc(rs, func(a, b Input) int {
		if c := same(&a, &b); c != 0 {
			return c
		}
		return cmp.Or(cmp.Compare(b.Rank, a.Rank), cmp.Compare(a.Feed, b.Feed), cmp.Compare(a.Sensor, b.Sensor),
			// not between readings of different keys; so that the order of rs never matters
			cmp.Compare(severity(a.Quality), severity(b.Quality)), cmp.Compare(a.ValueC, b.ValueC))
	})
	kept := rs[:0]
	for i := 0; i < len(rs); {
		j := i + 1
		for j < len(rs) && same(&rs[i], &rs[j]) == 0 {
			j++
		}
		if r, ok := first(rs[i:j]); ok {
			kept = append(kept, r)
		}
		i = j
	}
	return kept
}

func same(a, b *Input) int {
	if c := cmp.Compare(a.StartS, b.StartS); c != 0 {
		return c
	}
	return cmp.Or(cmp.Compare(a.Variable, b.Variable), cmp.Compare(a.SpanS, b.SpanS))
}

// first returns the first of readings in order of precedence that may be used.
func first(rs []Input) (Input, bool) {
	for i, r := range rs {
		struckOut := func(by Input) bool {
			return by.Quality == pipeline.QualityWrong && by.Rank > r.Rank && by.Sensor == r.Sensor
		}
		if r.Quality != pipeline.QualityWrong && !slices.ContainsFunc(rs[:i], struckOut) {
			return r, true
		}
	}
	return Input{}, false
}

// hourly gathers the readings of a day's hours, in order of time.
type hourly struct {
	sum  [24]float64
	n    [24]int
	mark pipeline.Quality // worst so far, from good
}

func (h *hourly) add(hour int, c float64, q pipeline.Quality) {
	h.sum[hour] += c
	h.n[hour]++
	h.mark = worse(h.mark, q)
}

// mean returns the mean of the hours that have a value, how many have, and the
// longest run of hours that have none.
func (h *hourly) mean() (meanC float64, hours, hole int) {
	run := 0
	for i, n := range h.n {
		if n == 0 {
			run++
			hole = max(hole, run)
			continue
		}
		run = 0
		hours++
		meanC += h.sum[i] / float64(n)
	}
	return meanC / float64(max(hours, 1)), hours, hole
}
