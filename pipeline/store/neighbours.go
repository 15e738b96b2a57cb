package store

import (
	"context"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// stateNeighbours brings the stations that others are filled from into line. A
// station whose neighbours change is marked to be filled anew.
func stateNeighbours(ctx context.Context, tx pgx.Tx, s Stated) error {
	for _, st := range s.Stations {
		before, err := neighbours(ctx, tx, st.ID)
		if err != nil {
			return err
		}
		if slices.Equal(before, st.Neighbours) {
			continue
		}
		for _, sql := range []string{`delete from thaw.station_neighbours where station = $1`, `update thaw.stations set refill = true where station = $1`} {
			if _, err := tx.Exec(ctx, sql, st.ID); err != nil {
				return fmt.Errorf("state neighbours of %s: %w", st.ID, err)
			}
		}
		for i, n := range st.Neighbours {
			_, err := tx.Exec(ctx, `insert into thaw.station_neighbours (station, place, neighbour) values ($1, $2, $3)`, st.ID, i+1, n)
			if err != nil {
				return fmt.Errorf("state neighbours of %s: %w", st.ID, err)
			}
		}
	}
	return nil
}

func neighbours(ctx context.Context, q querier, station string) ([]string, error) {
	rows, err := q.Query(ctx, `select neighbour from thaw.station_neighbours where station = $1 order by place`, station)
	if err != nil {
		return nil, fmt.Errorf("read neighbours of %s: %w", station, err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowTo[string])
	if err != nil {
		return nil, fmt.Errorf("read neighbours of %s: %w", station, err)
	}
	return out, nil
}

// ObservedChanged says that the station's observed days are not what they were:
// AddChange then marks the stations that are filled from it.
func (t *Take) ObservedChanged() { t.observed = true }

// markNeighbours marks the stations that are filled from this one to be filled
// anew, even if they are already, see Reindexed.
func (t *Take) markNeighbours(ctx context.Context) error {
	_, err := t.tx.Exec(ctx, `update thaw.stations set refill = true
		where station in (select station from thaw.station_neighbours where neighbour = $1)`, t.station)
	if err != nil {
		return fmt.Errorf("mark stations filled from %s: %w", t.station, err)
	}
	return nil
}

// basesText writes bases by date as the column holds them.
func basesText(bases []pipeline.BaseFrom) string {
	out := make([]string, len(bases))
	for i, b := range bases {
		out[i] = b.From.String() + " " + strconv.FormatFloat(b.BaseC, 'g', -1, 64)
	}
	return strings.Join(out, ", ")
}

func parseBases(text string) ([]pipeline.BaseFrom, error) {
	if text == "" {
		return nil, nil
	}
	var out []pipeline.BaseFrom
	for one := range strings.SplitSeq(text, ", ") {
		var b pipeline.BaseFrom
		if _, err := fmt.Sscanf(one, "%02d-%02d %g", &b.From.Month, &b.From.Day, &b.BaseC); err != nil {
			return nil, fmt.Errorf("%q is no base by date: %w", one, err)
		}
		out = append(out, b)
	}
	return out, nil
}

// Breaks returns the days after which the station's record may not compare with
// what it was before: changes of sensor, shield, height, place, calibration.
func (t *Take) Breaks(ctx context.Context) ([]pipeline.Day, error) {
	rows, err := t.tx.Query(ctx, `select (day - date '1970-01-01')::int from thaw.record_breaks where station = $1 and what <> 'rule' order by 1`, t.station)
	if err != nil {
		return nil, fmt.Errorf("read history of %s: %w", t.station, err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowTo[pipeline.Day])
	if err != nil {
		return nil, fmt.Errorf("read history of %s: %w", t.station, err)
	}
	return out, nil
}
