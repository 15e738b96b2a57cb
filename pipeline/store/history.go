package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// stateHistory keeps, adds and retires dated facts. A station whose days of
// maintenance change is marked to be made anew, one whose possible breaks change
// to have its indices worked out anew.
func stateHistory(ctx context.Context, tx pgx.Tx, s Stated) error {
	kept := []int64{}
	for _, st := range s.Stations {
		for _, f := range st.Facts {
			var id int64
			var isNew bool
			err := tx.QueryRow(ctx, `with there as (select history_id from thaw.station_history
					where station = $1 and what = $2 and from_day = $3 and to_day = $4 and note = $5 and retired_at is null),
				added as (insert into thaw.station_history (station, what, from_day, to_day, note)
					select $1, $2, $3, $4, $5 where not exists (select from there) returning history_id)
				select history_id, false from there union all select history_id, true from added`,
				st.ID, string(f.What), f.From.Time(), f.To.Time(), f.Note).Scan(&id, &isNew)
			if err != nil {
				return fmt.Errorf("state history of station %s: %w", st.ID, err)
			}
			kept = append(kept, id)
			if !isNew {
				continue
			}
			if f.What == pipeline.Maintenance {
				err = markAnew(ctx, tx, st.ID)
			} else if f.What != pipeline.Visit && f.What != pipeline.Outage {
				_, err = tx.Exec(ctx, `update thaw.stations set reindex = true where station = $1`, st.ID)
			}
			if err != nil {
				return fmt.Errorf("mark station %s: %w", st.ID, err)
			}
		}
	}
	_, err := tx.Exec(ctx, `with gone as (update thaw.station_history set retired_at = clock_timestamp()
			where retired_at is null and not history_id = any($1) returning station, what)
		update thaw.stations s set recompute = recompute or maintained, reindex = reindex or broken
		from (select station, bool_or(what = 'maintenance') as maintained, bool_or(what <> 'maintenance') as broken
			from gone where what not in ('visit', 'outage') group by station) g where g.station = s.station`, kept)
	if err != nil {
		return fmt.Errorf("retire station history: %w", err)
	}
	return nil
}

// maintenance returns the station's days of maintenance as exclusions.
func (t *Take) maintenance(ctx context.Context, st *pipeline.Station) ([]Edit, error) {
	rows, err := t.tx.Query(ctx, `select from_day, to_day, note from thaw.station_history
		where station = $1 and what = 'maintenance' and retired_at is null order by from_day, to_day`, t.station)
	if err != nil {
		return nil, fmt.Errorf("read history of %s: %w", t.station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (Edit, error) {
		var from, to time.Time
		e := Edit{Station: t.station, Kind: pipeline.EditExclude, Author: "settings"}
		err := r.Scan(&from, &to, &e.Reason)
		e.FromUTC, e.ToUTC = st.DayStart(dayOf(from)), st.DayStart(dayOf(to)+1)
		return e, err
	})
	if err != nil {
		return nil, fmt.Errorf("read history of %s: %w", t.station, err)
	}
	return out, nil
}

// stateMembers brings joined records into line. One whose members change is
// marked to be made anew.
func stateMembers(ctx context.Context, tx pgx.Tx, s Stated) error {
	for _, st := range s.Stations {
		before, err := members(ctx, tx, st.ID)
		if err != nil {
			return err
		}
		if sameMembers(before, st.Joined) {
			continue
		}
		if _, err := tx.Exec(ctx, `delete from thaw.station_members where station = $1`, st.ID); err != nil {
			return fmt.Errorf("state members of %s: %w", st.ID, err)
		}
		for i, m := range st.Joined {
			_, err := tx.Exec(ctx, `insert into thaw.station_members (station, place, member, until_day, adjust_c, error_c, source)
				values ($1, $2, $3, $4, $5, $6, $7)`, st.ID, i+1, m.Station, dateOf(m.Until), m.AdjustC[:], m.ErrorC, m.Source)
			if err != nil {
				return fmt.Errorf("state members of %s: %w", st.ID, err)
			}
		}
		if err := markAnew(ctx, tx, st.ID); err != nil {
			return fmt.Errorf("mark station %s: %w", st.ID, err)
		}
	}
	return nil
}

func sameMembers(a, b []pipeline.Member) bool {
	if len(a) != len(b) {
		return false
	}
	for i := range a {
		x, y := a[i], b[i]
		if (x.Until == nil) != (y.Until == nil) || x.Until != nil && *x.Until != *y.Until {
			return false
		}
		x.Until, y.Until = nil, nil
		if x != y {
			return false
		}
	}
	return true
}

func (t *Take) members(ctx context.Context) ([]pipeline.Member, error) {
	return members(ctx, t.tx, t.station)
}

func members(ctx context.Context, q querier, station string) ([]pipeline.Member, error) {
	rows, err := q.Query(ctx, `select member, until_day, adjust_c, error_c, source from thaw.station_members where station = $1 order by place`, station)
	if err != nil {
		return nil, fmt.Errorf("read members of %s: %w", station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (pipeline.Member, error) {
		var m pipeline.Member
		var until *time.Time
		var adjust []float64
		err := r.Scan(&m.Station, &until, &adjust, &m.ErrorC, &m.Source)
		copy(m.AdjustC[:], adjust)
		if until != nil {
			d := dayOf(*until)
			m.Until = &d
		}
		return m, err
	})
	if err != nil {
		return nil, fmt.Errorf("read members of %s: %w", station, err)
	}
	return out, nil
}

// SideBySide compares two records in one month of the year, over the days on
// which both were observed.
type SideBySide struct {
	Month int
	Days  int
	MeanC float64 // first less second, degC
	SDC   float64 // standard deviation of the days, degC
}

// Compare compares the observed daily means of two stations, month by month, and
// returns how many days they have side by side and between which dates.
func (db *DB) Compare(ctx context.Context, first, second string) (months []SideBySide, err error) {
	rows, err := db.pool.Query(ctx, `select extract(month from a.day)::int as month, count(*)::int as days,
			avg(a.mean_c - b.mean_c) as mean_c, coalesce(stddev_samp(a.mean_c - b.mean_c), 0) as sd_c
		from thaw.daily_values a join thaw.daily_values b using (day)
		where a.station = $1 and b.station = $2 and a.origin = 1 and b.origin = 1 group by 1 order by 1`, first, second)
	if err != nil {
		return nil, fmt.Errorf("compare %s and %s: %w", first, second, err)
	}
	return pgx.CollectRows(rows, pgx.RowToStructByPos[SideBySide])
}
