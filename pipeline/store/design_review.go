package store

import (
	"context"
	"fmt"
	"time"
)

// DesignInForce is a design value that holds for the first season that is not
// over, with what is needed to hold the record against it.
type DesignInForce struct {
	Site          string
	Surface       string
	Station       string
	Kind          string
	Definition    string
	IndexOf       string
	Direction     string
	BaseC         float64
	ValidFrom     time.Time
	DesignStated  float64
	UnitStated    string
	DesignCDays   float64
	Source        string
	ThisSeason    *time.Time // first day of the first season that is not over; nil without a record
	NFactor       *float64   // in force for ThisSeason; nil if there is none
	NFactorSource *string
	NFactors      int64 // how many there are, of different dates
}

// DesignsInForce returns the design values in force, of one site and surface only
// where these are not "": of each kind, definition, place and direction the latest
// that holds for the first season that is not over.
func (db *DB) DesignsInForce(ctx context.Context, site, surface string) ([]DesignInForce, error) {
	rows, err := db.pool.Query(ctx, `select distinct on (d.site, d.surface, d.kind, d.definition, d.index_of, d.direction)
			d.site, d.surface, t.station, d.kind, d.definition, d.index_of, d.direction, d.base_c, d.valid_from,
			d.design_stated, d.unit_stated, d.design_c_days, d.source, now.season as this_season,
			n.n_factor, n.source as n_factor_source,
			(select count(*) from thaw.n_factors m where m.retired_at is null
				and (m.site, m.surface, m.kind) = (d.site, d.surface, d.kind)) as n_factors
		from thaw.design_values d join thaw.sites t using (site)
		cross join lateral (select coalesce(min(i.season_start) filter (where not i.season_over),
				(max(i.season_start) + interval '1 year')::date) as season
			from thaw.air_index_season i where i.station = t.station and i.kind = d.kind and i.definition = 'curve') now
		left join lateral (select m.n_factor, m.source from thaw.n_factors m where m.retired_at is null
				and (m.site, m.surface, m.kind) = (d.site, d.surface, d.kind)
				and m.valid_from <= coalesce(now.season, 'infinity') order by m.valid_from desc limit 1) n on true
		where d.retired_at is null and d.valid_from <= coalesce(now.season, 'infinity')
			and ($1 = '' or d.site = $1) and ($2 = '' or d.surface = $2)
		order by d.site, d.surface, d.kind, d.definition, d.index_of, d.direction, d.valid_from desc`, site, surface)
	if err != nil {
		return nil, fmt.Errorf("read design values: %w", err)
	}
	return collect[DesignInForce](rows, "design values")
}

// SeasonOfRecord is a season of a station's record by one definition.
type SeasonOfRecord struct {
	SeasonStart    time.Time
	Season         string
	IndexLowCDays  float64
	IndexHighCDays float64
	SeasonOver     bool
	Complete       bool
	NoSeason       bool
	DaysMissing    int
	MeanRule       string
	BaseC          float64
}

// SeasonsOfRecord returns a station's seasons by a kind and definition, in order.
func (db *DB) SeasonsOfRecord(ctx context.Context, station, kind, definition string) ([]SeasonOfRecord, error) {
	rows, err := db.pool.Query(ctx, `select season_start, season, index_low_c_days, index_high_c_days, season_over, complete,
			no_season, days_missing, mean_rule, base_c
		from thaw.air_index_season where station = $1 and kind = $2 and definition = $3 order by season_start`, station, kind, definition)
	if err != nil {
		return nil, fmt.Errorf("read seasons of %s: %w", station, err)
	}
	return collect[SeasonOfRecord](rows, "seasons")
}

// BreakOfRecord is something that happened to a station and may have broken its
// record.
type BreakOfRecord struct {
	What    string
	FromDay time.Time
	Note    string
}

// BreaksOfRecord returns a station's possible breaks within some days, in order.
func (db *DB) BreaksOfRecord(ctx context.Context, station string, from, to time.Time) ([]BreakOfRecord, error) {
	rows, err := db.pool.Query(ctx, `select what, day as from_day, note from thaw.record_breaks
		where station = $1 and what not in ('handed over', 'rule') and day between $2 and $3 order by day, what, note`, station, from, to)
	if err != nil {
		return nil, fmt.Errorf("read history of %s: %w", station, err)
	}
	return collect[BreakOfRecord](rows, "station history")
}
