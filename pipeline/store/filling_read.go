package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// ObservedMean is an observed daily mean in degC.
type ObservedMean struct {
	Day   pipeline.Day
	MeanC float64
}

// ObservedMeans returns the observed daily means of a station in order of date;
// filled days are not among them.
func (db *DB) ObservedMeans(ctx context.Context, station string) ([]ObservedMean, error) {
	rows, err := db.pool.Query(ctx, `select day, mean_c from thaw.daily_values
		where station = $1 and origin = $2 and mean_c is not null order by day`, station, int16(pipeline.Observed))
	if err != nil {
		return nil, fmt.Errorf("read daily means of %s: %w", station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (ObservedMean, error) {
		var (
			day time.Time
			m   ObservedMean
		)
		err := r.Scan(&day, &m.MeanC)
		m.Day = dayOf(day)
		return m, err
	})
	if err != nil {
		return nil, fmt.Errorf("read daily means of %s: %w", station, err)
	}
	return out, nil
}
