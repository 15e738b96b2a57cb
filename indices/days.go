package indices

import (
	"context"
	"time"

	"thawledger/indices/daily"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// runGap is how many days without a change are read along rather than asked for
// in two questions.
const runGap = 40

// makeDays makes the daily values of the given days from the readings, as edits
// leave them.
func makeDays(ctx context.Context, t *store.Take, st *pipeline.Station, edits []daily.Edit, days []pipeline.Day) ([]daily.Value, error) {
	values := make([]daily.Value, 0, len(days))
	var in []daily.Input
	for i := 0; i < len(days); {
		j := i + 1
		for j < len(days) && days[j]-days[j-1] <= runGap {
			j++
		}
		run := days[i:j]
		next := 0 // the day of run that readings are being gathered for
		finish := func(upTo pipeline.Day) {
			for next < len(run) && run[next] < upTo {
				v := daily.Make(st, run[next], in)
				testReadings(st, &v, in)
				values = append(values, v)
				in = in[:0]
				next++
			}
		}
		err := eachEdited(ctx, t, st, edits, st.DayStart(run[0]), st.DayStart(run[len(run)-1]+1), func(r daily.Input) {
			day := st.DayAt(time.Unix(r.StartS, 0))
			finish(day)
			if next < len(run) && run[next] == day {
				in = append(in, r)
			}
		})
		if err != nil {
			return nil, err
		}
		finish(run[len(run)-1] + 1)
		i = j
	}
	return values, nil
}

func editsOf(ctx context.Context, t *store.Take, st *pipeline.Station) ([]daily.Edit, error) {
	kept, err := t.Edits(ctx, st)
	if err != nil {
		return nil, err
	}
	edits := make([]daily.Edit, len(kept))
	for i, e := range kept {
		_, variable := e.Variable.Of()
		edits[i] = daily.Edit{Kind: e.Kind, Variable: variable, Sensor: e.Sensor, Feed: e.Feed, FromS: e.FromUTC.Unix(), ToS: e.ToUTC.Unix(), Amount: e.ValueC}
		if e.Kind == pipeline.EditShift {
			edits[i].Amount = float64(e.ShiftS)
		}
	}
	return edits, nil
}

// eachEdited calls f for the station's readings of what it measures whose spans
// start in [from, to), once edits have been applied, in order of time.
func eachEdited(ctx context.Context, t *store.Take, st *pipeline.Station, edits []daily.Edit, from, to time.Time, f func(daily.Input)) error {
	each := func(from, to time.Time, f func(daily.Input)) error {
		return t.EachReading(ctx, from, to, func(s *store.SeriesInfo, startS int64, valueC float64, q pipeline.Quality) {
			if medium, variable := s.Variable.Of(); medium == st.Measures {
				f(daily.Input{Feed: s.Feed, Rank: s.Rank, Sensor: s.Sensor, Variable: variable, SpanS: s.SpanS, StartS: startS, ValueC: valueC, Quality: q})
			}
		})
	}
	if len(edits) == 0 {
		return each(from, to, f)
	}
	reach := time.Duration(daily.Reach(edits)) * time.Second
	var in []daily.Input
	if err := each(from.Add(-reach), to.Add(reach), func(r daily.Input) { in = append(in, r) }); err != nil {
		return err
	}
	for _, r := range daily.Edited(edits, in) {
		if from.Unix() <= r.StartS && r.StartS < to.Unix() {
			f(r)
		}
	}
	return nil
}
