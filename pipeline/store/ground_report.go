package store

import (
	"context"
	"fmt"
	"time"
)

// GroundSeason is a season of the station that a surface is on, with the n-factor
// that the surface has for it.
type GroundSeason struct {
	Kind           string
	Definition     string
	SeasonStart    time.Time
	Season         string
	NFactor        *float64 // nil if the surface has none of the kind
	NLow, NHigh    *float64 // its range; NFactor where none is stated
	IndexLowCDays  float64  // of the air, degC.d
	IndexHighCDays float64
	StartDay       *time.Time
	EndDay         *time.Time
	ThroughDay     time.Time
	SeasonOver     bool
	Complete       bool
	DaysMissing    int
	BaseC          float64
}

// GroundSeasons returns all seasons of the station that the surface's site draws on,
// by both definitions, in order of time.
func (db *DB) GroundSeasons(ctx context.Context, site, surface string) ([]GroundSeason, error) {
	rows, err := db.pool.Query(ctx, `select i.kind, i.definition, i.season_start, i.season,
			n.n_factor, coalesce(n.n_low, n.n_factor) as n_low, coalesce(n.n_high, n.n_factor) as n_high,
			i.index_low_c_days, i.index_high_c_days, i.start_day, i.end_day, i.through_day, i.season_over, i.complete,
			i.days_missing::int as days_missing, i.base_c
		from thaw.surfaces s join thaw.sites using (site) join thaw.air_index_season i using (station)
			left join lateral (select f.n_factor, f.n_low, f.n_high from thaw.n_factors f
				where (f.site, f.surface, f.kind) = (s.site, s.surface, i.kind) and f.valid_from <= i.season_start and f.retired_at is null
				order by f.valid_from desc limit 1) n on true
		where s.site = $1 and s.surface = $2 order by i.season_start, i.kind, i.definition`, site, surface)
	if err != nil {
		return nil, fmt.Errorf("read seasons of %s/%s: %w", site, surface, err)
	}
	return collect[GroundSeason](rows, "seasons")
}
