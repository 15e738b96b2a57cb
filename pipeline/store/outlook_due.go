package store

import (
	"context"
	"fmt"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Adverse returns the chance of ending on the wrong side of the design value, at
// its lowest and at its highest: of passing it, or of falling short of it.
func (r *OutlookRow) Adverse(direction pipeline.Direction) (low, high float64) {
	if direction == pipeline.NotBelow {
		return 1 - r.ProbabilityHigh, 1 - r.ProbabilityLow
	}
	return r.ProbabilityLow, r.ProbabilityHigh
}

// OutlooksDue returns the stations whose outlooks are to be made anew and that
// have nothing else to wait for.
func (db *DB) OutlooksDue(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select station from thaw.stations s where outlook_wanted > outlook_made and not (recompute or reindex or refill)
		and not exists (select from thaw.batch_parts p where p.station = s.station and (`+open+`)) order by station`)
	if err != nil {
		return nil, fmt.Errorf("read outlooks to be made: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// BeginOutlook returns a station's rules and how often its outlooks have been
// asked for: what OutlookMade is told when they have been made.
func (db *DB) BeginOutlook(ctx context.Context, station string) (st *pipeline.Station, wanted int64, err error) {
	err = db.within(ctx, func(tx pgx.Tx) error {
		if err := tx.QueryRow(ctx, `select outlook_wanted from thaw.stations where station = $1`, station).Scan(&wanted); err != nil {
			return fmt.Errorf("begin outlook of %s: %w", station, err)
		}
		st, err = (&Take{tx: tx, station: station}).Station(ctx)
		return err
	})
	return st, wanted, err
}

// OutlookMade records that the outlooks which were asked for have been made; from
// is nil if there are none, or the day from which the judge has to look at them.
func (db *DB) OutlookMade(ctx context.Context, station string, wanted int64, from *pipeline.Day) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		if _, err := tx.Exec(ctx, `update thaw.stations set outlook_made = $2 where station = $1`, station, wanted); err != nil {
			return fmt.Errorf("record outlook of %s: %w", station, err)
		}
		if from == nil {
			return nil
		}
		return addChange(ctx, tx, station, *from)
	})
}

const outlookWanted = `update thaw.stations set outlook_wanted = outlook_wanted + 1 where station = $1`
