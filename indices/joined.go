package indices

import (
	"context"

	"thawledger/indices/daily"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// joined makes the daily values of a record that takes those of other stations,
// one after another. Each member's values are adjusted by month and marked
// changed where that is not nothing; the indices are worked out from the joined
// daily values and never adjusted themselves.
func joined(ctx context.Context, t *store.Take, st *pipeline.Station) ([]daily.Value, error) {
	var out []daily.Value
	var after *pipeline.Day // days up to it are another member's
	for _, m := range st.Joined {
		rows, err := t.DaysOf(ctx, m.Station)
		if err != nil {
			return nil, err
		}
		for i := range rows {
			v := fromRow(&rows[i])
			if after != nil && v.Day <= *after || m.Until != nil && v.Day > *m.Until || !v.Own() {
				continue
			}
			out = append(out, adjusted(v, &m.AdjustC))
		}
		after = m.Until
	}
	return out, nil
}

func adjusted(v daily.Value, byMonth *[12]float64) daily.Value {
	_, month, _ := v.Day.Date()
	c := byMonth[month-1]
	if c == 0 {
		return v
	}
	if v.Origin == pipeline.Observed {
		v.MeanC += c
		v.LowC, v.HighC = v.MeanC, v.MeanC
		v.Quality = daily.MarkChanged(v.Quality)
	}
	v.MaxC, v.MinC = v.MaxC+c, v.MinC+c
	return v
}
