package indices

import (
	"thawledger/indices/daily"
	"thawledger/indices/quality"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// test makes the quality tests of every day of a record and keeps their
// outcomes with the days. They take nothing out.
func test(st *pipeline.Station, values []daily.Value) {
	rec := make(quality.Record, len(values))
	for i := range values {
		v := &values[i]
		rec[i] = quality.DayValue{Day: v.Day, MeanC: v.MeanC, MaxC: v.MaxC, MinC: v.MinC, HasMax: v.HasMax, HasMin: v.HasMin,
			Observed: v.Origin == pipeline.Observed}
	}
	opt := quality.Options{}
	if st.Measures == pipeline.OfTheSurface {
		opt.Medium = quality.Surface
	}
	for i, o := range quality.Daily(rec, opt) {
		values[i].TestsMade, values[i].TestsFailed = uint32(o.Tested), uint32(o.Failed)
	}
}

// isDoubtful says whether an observed day's mean rests on a value that its source
// marks doubtful or inconsistent, or that failed a test. Such a day stays in the
// indices, and the indices without it are shown beside them.
func isDoubtful(d *store.DayRow) bool {
	return d.Origin == pipeline.Observed &&
		(d.Quality == pipeline.QualityDoubtful || d.Quality == pipeline.QualityInconsistent || d.TestsFailed != 0)
}
