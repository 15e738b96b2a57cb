package store

import (
	"context"
	"fmt"
	"time"

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

// OutlookMade stores the outlooks that were made, in the place of all that stand
// for the seasons which are open at the end of the record: those begun on thaw
// and freeze or later. Of these only outlooks of earlier days stay, and only where
// one could be made: what a longer record, or one with more past years, let expect
// no longer holds. It records that what was asked for, as BeginOutlook said, is
// done, and leaves a line for the judge if anything stood or stands.
func (db *DB) OutlookMade(ctx context.Context, station string, wanted int64, through, thaw, freeze pipeline.Day, made []OutlookRow) error {
	ids, seasons := make([]int64, 0, len(made)), make([]time.Time, 0, len(made))
	for i := range made {
		if made[i].DesignValueID != nil {
			ids, seasons = append(ids, *made[i].DesignValueID), append(seasons, made[i].SeasonStart.Time())
		}
	}
	return db.within(ctx, func(tx pgx.Tx) error {
		gone, err := tx.Exec(ctx, `delete from thaw.outlooks where station = $1
			and season_start >= case kind when 'thaw' then $3::date else $4::date end
			and (through_day > $2 or not (design_value_id, season_start) in (select * from unnest($5::bigint[], $6::date[])))`,
			station, through.Time(), thaw.Time(), freeze.Time(), ids, seasons)
		if err != nil {
			return fmt.Errorf("clear outlooks of %s: %w", station, err)
		}
		if err := writeOutlooks(ctx, tx, made); err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, `update thaw.stations set outlook_made = $2 where station = $1`, station, wanted); err != nil {
			return fmt.Errorf("record outlook of %s: %w", station, err)
		}
		if gone.RowsAffected() == 0 && len(made) == 0 {
			return nil
		}
		return addChange(ctx, tx, station, min(through, thaw, freeze))
	})
}

const outlookWanted = `update thaw.stations set outlook_wanted = outlook_wanted + 1 where station = $1`
