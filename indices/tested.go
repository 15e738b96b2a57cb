package indices

import (
	"math"
	"slices"

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
	for i, o := range quality.Daily(rec, quality.Options{Medium: medium(st)}) {
		v := &values[i]
		v.TestsMade = v.TestsMade&^dayTests | uint32(o.Tested)
		v.TestsFailed = v.TestsFailed&^dayTests | uint32(o.Failed)
	}
}

// Of the bits of tests the lower half is that of a day's values, and the upper
// half that of its readings of less than a day.
const (
	dayTests     = 1<<16 - 1
	readingTests = 16
)

func medium(st *pipeline.Station) quality.Medium {
	if st.Measures == pipeline.OfTheSurface {
		return quality.Surface
	}
	return quality.Air
}

// testReadings makes the quality tests of a day's readings of less than a day,
// series by series, and keeps what came of them with the day. in is sorted by time.
func testReadings(st *pipeline.Station, v *daily.Value, in []daily.Input) {
	const dayS = 86400
	type series struct {
		feed, sensor string
		variable     pipeline.Variable
		spanS        int32
	}
	var done []series
	var readings []pipeline.Reading
	for i := range in {
		r := &in[i]
		of := series{r.Feed, r.Sensor, r.Variable, r.SpanS}
		if r.SpanS >= dayS || r.Variable != pipeline.AirTemp && r.Variable != pipeline.AirTempMean || slices.Contains(done, of) {
			continue
		}
		done = append(done, of)
		readings = readings[:0]
		for k := i; k < len(in); k++ {
			n := &in[k]
			if (series{n.Feed, n.Sensor, n.Variable, n.SpanS}) != of || !(math.Abs(n.ValueC) <= 1e6) || len(readings) > 0 && n.StartS <= readings[len(readings)-1].StartS {
				continue
			}
			readings = append(readings, pipeline.Reading{StartS: n.StartS, ValueC: n.ValueC, Quality: n.Quality})
		}
		o := quality.Hours(v.Day, readings, quality.Options{Medium: medium(st)})
		v.TestsMade |= uint32(o.Tested) << readingTests
		v.TestsFailed |= uint32(o.Failed) << readingTests
	}
}

// isDoubtful says whether an observed day's mean rests on a value that its source
// marks doubtful or inconsistent, or that failed a test. Such a day stays in the
// indices, and the indices without it are shown beside them.
func isDoubtful(d *store.DayRow) bool {
	return d.Origin == pipeline.Observed &&
		(d.Quality == pipeline.QualityDoubtful || d.Quality == pipeline.QualityInconsistent || d.TestsFailed != 0)
}
