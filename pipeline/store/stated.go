package store

import (
	"cmp"
	"context"
	"fmt"
	"slices"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Stated is what the settings say of the world.
type Stated struct {
	Hash     string // of the settings in force
	YAML     string // the settings, secrets left out
	Program  string
	Stations []pipeline.Station
	Feeds    []pipeline.Feed
	Sites    []pipeline.Site
}

// beginning is the first day of all: what holds "from the beginning", or is to
// be judged from there.
var beginning = pipeline.DayOf(1, time.January, 1)

// State brings the tables into line with the settings, in one transaction.
// Stations and sites that are no longer named stay, with their records; their
// design values and n-factors are retired. A station whose rules changed is
// marked to be made anew, and surfaces that are judged otherwise than before
// get a line in changes.
func (db *DB) State(ctx context.Context, s Stated) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		if err := lock(ctx, tx, lockStated, "settings"); err != nil {
			return err
		}
		_, err := tx.Exec(ctx, `insert into thaw.settings_versions (settings_hash, settings_yaml, program)
			values ($1, $2, $3) on conflict do nothing`, s.Hash, s.YAML, s.Program)
		if err != nil {
			return fmt.Errorf("record settings: %w", err)
		}
		for _, f := range []func(context.Context, pgx.Tx, Stated) error{stateStations, stateHistory, stateMembers, stateNeighbours, stateFeeds, stateSites} {
			if err := f(ctx, tx, s); err != nil {
				return err
			}
		}
		return nil
	})
}

func stateStations(ctx context.Context, tx pgx.Tx, s Stated) error {
	// In the order in which others take their rows: see Take.AddChange.
	stations := slices.SortedFunc(slices.Values(s.Stations), func(a, b pipeline.Station) int { return cmp.Compare(a.ID, b.ID) })
	for _, st := range stations {
		_, err := tx.Exec(ctx, `insert into thaw.stations as o (station, name, latitude_deg, longitude_deg, elevation_m,
				utc_offset_s, day_starts_s, mean_rule, min_hours, max_hole_hours, base_c, fill_days,
				thaw_year_starts, freeze_year_starts, measures, bases, climatology_fills)
			values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14, $15, $16, $17)
			on conflict (station) do update set
				name = excluded.name, latitude_deg = excluded.latitude_deg, longitude_deg = excluded.longitude_deg,
				elevation_m = excluded.elevation_m, utc_offset_s = excluded.utc_offset_s,
				day_starts_s = excluded.day_starts_s, mean_rule = excluded.mean_rule, min_hours = excluded.min_hours,
				max_hole_hours = excluded.max_hole_hours, base_c = excluded.base_c, fill_days = excluded.fill_days,
				thaw_year_starts = excluded.thaw_year_starts, freeze_year_starts = excluded.freeze_year_starts,
				measures = excluded.measures, bases = excluded.bases, climatology_fills = excluded.climatology_fills,
				recorded_at = clock_timestamp(),
				recompute = o.recompute or
					(o.utc_offset_s, o.day_starts_s, o.mean_rule, o.min_hours, o.max_hole_hours, o.measures)
					is distinct from
					(excluded.utc_offset_s, excluded.day_starts_s, excluded.mean_rule, excluded.min_hours,
					 excluded.max_hole_hours, excluded.measures),
				reindex = o.reindex or
					(o.base_c, o.fill_days, o.thaw_year_starts, o.freeze_year_starts, o.bases, o.climatology_fills)
					is distinct from
					(excluded.base_c, excluded.fill_days, excluded.thaw_year_starts, excluded.freeze_year_starts, excluded.bases,
					 excluded.climatology_fills)`,
			st.ID, st.Name, st.LatitudeD, st.LongitudeD, st.ElevationM, int32(st.UTCOffset.Seconds()), int32(st.DayStarts.Seconds()),
			string(st.Mean), st.MinHours, st.MaxHole, st.BaseC, st.FillDays, st.ThawYear.String(), st.FreezeYear.String(),
			string(cmp.Or(st.Measures, pipeline.OfTheAir)), basesText(st.Bases), st.ClimateFills)
		if err != nil {
			return fmt.Errorf("state station %s: %w", st.ID, err)
		}
	}
	return nil
}

func stateFeeds(ctx context.Context, tx pgx.Tx, s Stated) error {
	for _, f := range s.Feeds {
		var before *int
		err := tx.QueryRow(ctx, `with o as (select rank from thaw.feeds where feed = $1),
				n as (insert into thaw.feeds (feed, rank) values ($1, $2)
				      on conflict (feed) do update set rank = excluded.rank returning 1)
			select (select rank from o) from n`, f.Name, f.Rank).Scan(&before)
		if err != nil {
			return fmt.Errorf("state feed %s: %w", f.Name, err)
		}
		if before != nil && *before != f.Rank {
			_, err := tx.Exec(ctx, `update thaw.stations set recompute = true where station in
				(select station from thaw.series join thaw.feeds using (feed_id) where feed = $1)`, f.Name)
			if err != nil {
				return fmt.Errorf("mark stations of feed %s: %w", f.Name, err)
			}
		}
	}
	return nil
}

func stateSites(ctx context.Context, tx pgx.Tx, s Stated) error {
	var touched []string // stations whose surfaces are judged otherwise than before
	var kept []int64     // rows in force
	var keptN []int64
	for _, site := range s.Sites {
		var before *string
		err := tx.QueryRow(ctx, `with o as (select station from thaw.sites where site = $1),
				n as (insert into thaw.sites (site, name, station) values ($1, $2, $3)
				      on conflict (site) do update set name = excluded.name, station = excluded.station returning 1)
			select (select station from o) from n`, site.ID, site.Name, site.Station).Scan(&before)
		if err != nil {
			return fmt.Errorf("state site %s: %w", site.ID, err)
		}
		if before != nil && *before != site.Station {
			touched = append(touched, site.Station)
		}
		for _, surface := range site.Surfaces {
			ids, nIDs, changed, err := stateSurface(ctx, tx, site.ID, surface)
			if err != nil {
				return err
			}
			kept, keptN = append(kept, ids...), append(keptN, nIDs...)
			if changed {
				touched = append(touched, site.Station)
			}
		}
	}
	gone, err := retire(ctx, tx, kept, keptN)
	if err != nil {
		return err
	}
	touched = append(touched, gone...)
	slices.Sort(touched)
	for _, station := range slices.Compact(touched) {
		if err := addChange(ctx, tx, station, beginning); err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, outlookWanted, station); err != nil {
			return fmt.Errorf("ask for outlook of %s: %w", station, err)
		}
	}
	return nil
}

// stateSurface returns the rows that are in force for the surface and whether
// any of them is new.
func stateSurface(ctx context.Context, tx pgx.Tx, site string, s pipeline.Surface) (designs, factors []int64, changed bool, err error) {
	_, err = tx.Exec(ctx, `insert into thaw.surfaces (site, surface, name, measured_by) values ($1, $2, $3, nullif($4, ''))
		on conflict (site, surface) do update set name = excluded.name, measured_by = excluded.measured_by`, site, s.ID, s.Name, s.MeasuredBy)
	if err != nil {
		return nil, nil, false, fmt.Errorf("state surface %s/%s: %w", site, s.ID, err)
	}
	// The row in force is kept if it says the same; otherwise it is retired
	// before the new one takes its place.
	for _, n := range s.Factors {
		id, isNew, err := keepOrReplace(ctx, tx, "n_factor", `site = @site and surface = @surface and kind = @kind and valid_from = @from`,
			`n_factor = @value and source = @source and coalesce(n_low, n_factor) = @low and coalesce(n_high, n_factor) = @high`,
			`(site, surface, kind, valid_from, n_factor, source, n_low, n_high)
			 values (@site, @surface, @kind, @from, @value::float8, @source, nullif(@low::float8, @value), nullif(@high::float8, @value))`,
			pgx.NamedArgs{"site": site, "surface": s.ID, "kind": string(n.Kind), "from": n.From.Time(), "value": n.Value, "source": n.Source,
				"low": cmp.Or(n.Low, n.Value), "high": cmp.Or(n.High, n.Value)})
		if err != nil {
			return nil, nil, false, fmt.Errorf("state n-factor of %s/%s: %w", site, s.ID, err)
		}
		factors, changed = append(factors, id), changed || isNew
	}
	for _, d := range s.Designs {
		cDays, err := d.IndexCDays()
		if err != nil {
			return nil, nil, false, fmt.Errorf("state design value of %s/%s: %w", site, s.ID, err)
		}
		id, isNew, err := keepOrReplace(ctx, tx, "design_value",
			`site = @site and surface = @surface and kind = @kind and definition = @definition and index_of = @of
				and direction = @direction and valid_from = @from`,
			`base_c = @base and design_stated = @stated and unit_stated = @unit and near_share = @near and source = @source`,
			`(site, surface, kind, definition, index_of, direction, base_c, valid_from, design_stated, unit_stated, design_c_days, near_share, source)
			 values (@site, @surface, @kind, @definition, @of, @direction, @base, @from, @stated, @unit, @cdays, @near, @source)`,
			pgx.NamedArgs{"site": site, "surface": s.ID, "kind": string(d.Kind), "definition": string(d.Definition), "of": string(d.Of),
				"direction": string(d.Direction), "base": d.BaseC, "from": d.From.Time(), "stated": d.Index, "unit": string(d.Unit),
				"cdays": cDays, "near": d.NearShare, "source": d.Source})
		if err != nil {
			return nil, nil, false, fmt.Errorf("state design value of %s/%s: %w", site, s.ID, err)
		}
		designs, changed = append(designs, id), changed || isNew
	}
	return designs, factors, changed, nil
}

// keepOrReplace looks for the row in force under key; it stays if it says the
// same, otherwise it is retired and another written.
func keepOrReplace(ctx context.Context, tx pgx.Tx, noun, key, same, insert string, args pgx.NamedArgs) (id int64, isNew bool, err error) {
	err = tx.QueryRow(ctx, `select `+noun+`_id from thaw.`+noun+`s where retired_at is null and `+key+` and `+same, args).Scan(&id)
	if err == nil || err != pgx.ErrNoRows {
		return id, false, err
	}
	if _, err := tx.Exec(ctx, `update thaw.`+noun+`s set retired_at = clock_timestamp() where retired_at is null and `+key, args); err != nil {
		return 0, false, err
	}
	err = tx.QueryRow(ctx, `insert into thaw.`+noun+`s `+insert+` returning `+noun+`_id`, args).Scan(&id)
	return id, true, err
}

// retire ends every design value and n-factor that the settings no longer
// state, and returns the stations whose surfaces that touches.
func retire(ctx context.Context, tx pgx.Tx, designs, factors []int64) ([]string, error) {
	rows, err := tx.Query(ctx, `with d as (update thaw.design_values set retired_at = clock_timestamp()
			where retired_at is null and not design_value_id = any($1) returning site),
		n as (update thaw.n_factors set retired_at = clock_timestamp()
			where retired_at is null and not n_factor_id = any($2) returning site)
		select distinct station from thaw.sites where site in (select site from d union select site from n)`, nonNil(designs), nonNil(factors))
	if err != nil {
		return nil, fmt.Errorf("retire design values: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// nonNil keeps a nil slice from becoming NULL, with which no comparison is true.
func nonNil[T any](s []T) []T {
	if s == nil {
		return []T{}
	}
	return s
}

func addChange(ctx context.Context, tx pgx.Tx, station string, from pipeline.Day) error {
	_, err := tx.Exec(ctx, `insert into thaw.changes (station, from_day) values ($1, $2)`, station, from.Time())
	if err != nil {
		return fmt.Errorf("record change of %s: %w", station, err)
	}
	return nil
}
