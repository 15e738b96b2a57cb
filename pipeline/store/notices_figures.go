package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Figures is everything that a notice may say of a standing, as it stands now.
// Indices in degC.d, of what the design value limits (air or surface) but for the
// outlook's.
type Figures struct {
	Design                                int64
	Site, SiteName, Surface, SurfaceName  string
	Station                               string
	Kind                                  pipeline.Kind
	Season                                string
	SeasonStart, Day                      pipeline.Day
	Direction                             pipeline.Direction
	State                                 pipeline.State
	Low, High                             float64
	SumBeside                             *float64
	ExpectedOn, NearOn, ExceededOn        *pipeline.Day
	ConfirmedOn                           *pipeline.Day
	DesignC, Stated, NearShare            float64
	Unit                                  pipeline.IndexUnit
	Definition                            pipeline.Definition
	Of                                    pipeline.Of
	Source                                string
	NFactor                               *float64
	DaysFilled, DaysMissing, DaysDoubtful int
	OnsetProvisional                      bool
	NotHomogeneous                        bool
	ApprovedThrough                       *pipeline.Day
	LastVisit                             *pipeline.Day
	Newest                                *time.Time // end of the newest reading's span
	Exceedance                            int64      // 0 if none stands

	// WeekAgo is the lowest possible index seven days before Day; nil if the
	// season had not begun.
	WeekAgo *float64
	// Rank is the place of the season to date among those on record at the same
	// day of the season, of RankOf, this one counted; 1 is the highest.
	Rank, RankOf int

	Outlook *OutlookRow // nil if there is none
}

// compared is the column of air_index_daily that a design value is compared with,
// without its ending.
func (f *Figures) compared() string {
	definition := pipeline.Curve
	if f.Definition == pipeline.Sum {
		definition = pipeline.Sum
	}
	kind := pipeline.Thaw
	if f.Kind == pipeline.Freeze {
		kind = pipeline.Freeze
	}
	return string(kind) + "_" + string(definition)
}

func (f *Figures) factor() float64 {
	if f.NFactor == nil {
		return 1
	}
	return *f.NFactor
}

// Figures returns the figures of a standing; nil if it is judged no more.
func (g *Gathering) Figures(ctx context.Context, design int64, season pipeline.Day) (*Figures, error) {
	rows, err := g.tx.Query(ctx, `select s.design_value_id, s.site, t.name, s.surface, u.name, t.station, s.kind, s.season, s.season_start, s.day, d.direction, s.state,
			s.index_low_c_days, s.index_high_c_days, s.sum_beside_c_days, s.expected_on, s.near_on, s.exceeded_on, s.confirmed_on,
			s.design_c_days, d.design_stated, d.near_share, d.unit_stated, d.definition, d.index_of, d.source, s.n_factor,
			s.days_interpolated + coalesce(i.days_neighbour, 0) + coalesce(i.days_climatology, 0), s.days_missing, coalesce(i.days_doubtful, 0),
			coalesce(i.onset_provisional, false), not coalesce(i.homogeneous, true),
			(select max(a.through_day) from thaw.approvals a where a.station = t.station and a.withdrawn_at is null),
			(select max(h.to_day) from thaw.station_history h where h.station = t.station and h.what = 'visit' and h.retired_at is null),
			(select max(l.start_utc + make_interval(secs => e.span_s)) from thaw.series e cross join lateral
				(select v.start_utc from thaw.reading_values v where v.series_id = e.series_id order by v.start_utc desc limit 1) l
				where e.station = t.station),
			coalesce((select e.exceedance_id from thaw.exceedances e where e.design_value_id = s.design_value_id and e.season_start = s.season_start
				and (e.closed_as is null or e.closed_as = 'season over')), 0)
		from thaw.standings s
		join thaw.design_values d using (design_value_id)
		join thaw.sites t on t.site = s.site
		join thaw.surfaces u on u.site = s.site and u.surface = s.surface
		left join thaw.air_index_season i on i.station = t.station and i.kind = s.kind and i.season_start = s.season_start
			and i.definition = case d.definition when 'sum' then 'sum' else 'curve' end
		where s.design_value_id = $1 and s.season_start = $2`, design, season.Time())
	if err != nil {
		return nil, fmt.Errorf("read figures: %w", err)
	}
	defer rows.Close()
	if !rows.Next() {
		return nil, rows.Err()
	}
	var f Figures
	var start, day time.Time
	var expected, near, exceeded, confirmed, approved, visit *time.Time
	err = rows.Scan(&f.Design, &f.Site, &f.SiteName, &f.Surface, &f.SurfaceName, &f.Station, &f.Kind, &f.Season, &start, &day, &f.Direction, &f.State,
		&f.Low, &f.High, &f.SumBeside, &expected, &near, &exceeded, &confirmed, &f.DesignC, &f.Stated, &f.NearShare, &f.Unit, &f.Definition,
		&f.Of, &f.Source, &f.NFactor, &f.DaysFilled, &f.DaysMissing, &f.DaysDoubtful, &f.OnsetProvisional, &f.NotHomogeneous, &approved, &visit,
		&f.Newest, &f.Exceedance)
	if err != nil {
		return nil, fmt.Errorf("read figures: %w", err)
	}
	rows.Close()
	f.SeasonStart, f.Day = dayOf(start), dayOf(day)
	f.ExpectedOn, f.NearOn, f.ExceededOn, f.ConfirmedOn = dayIf(expected), dayIf(near), dayIf(exceeded), dayIf(confirmed)
	f.ApprovedThrough, f.LastVisit = dayIf(approved), dayIf(visit)
	if err := g.amongSeasons(ctx, &f); err != nil {
		return nil, err
	}
	if f.Outlook, err = (&Judging{tx: g.tx, station: f.Station}).Outlook(ctx, design, season); err != nil {
		return nil, err
	}
	return &f, nil
}

// amongSeasons adds the index of a week ago and the rank. The n-factor is the
// same for all seasons: it is the weather that is ranked.
func (g *Gathering) amongSeasons(ctx context.Context, f *Figures) error {
	low := f.compared() + "_low_c_days"
	err := g.tx.QueryRow(ctx, `select $4::float8 * max(`+low+`) from thaw.air_index_daily where station = $1 and day = $2::date - 7 and `+season(f)+` = $3`,
		f.Station, f.Day.Time(), f.SeasonStart.Time(), f.factor()).Scan(&f.WeekAgo)
	if err != nil {
		return fmt.Errorf("read the index of a week ago: %w", err)
	}
	err = g.tx.QueryRow(ctx, `select 1 + count(*) filter (where d.`+low+` * $5::float8 > $4::float8), 1 + count(*)
		from thaw.air_index_season a join thaw.air_index_daily d
			on d.station = a.station and d.day = a.season_start + ($2::date - $3::date) and d.`+season(f)+` = a.season_start
		where a.station = $1 and a.kind = $6 and a.definition = $7 and a.season_start < $3 and a.season_over and a.days_missing = 0`,
		f.Station, f.Day.Time(), f.SeasonStart.Time(), f.Low, f.factor(), string(f.Kind), string((&pipeline.DesignValue{Definition: f.Definition}).Compared())).Scan(&f.Rank, &f.RankOf)
	if err != nil {
		return fmt.Errorf("rank the season: %w", err)
	}
	return nil
}

// season is the column of air_index_daily that names a day's season.
func season(f *Figures) string {
	if f.Kind == pipeline.Freeze {
		return "freeze_season"
	}
	return "thaw_season"
}

// CurveDay is the index to date at the end of a day of the season.
type CurveDay struct {
	Day       pipeline.Day
	Low, High float64
}

// PastDay is what past seasons' index to date was on a day, moved to this season.
type PastDay struct {
	Day           pipeline.Day
	P10, P50, P90 float64
}

// Curve returns the season's index by day to the standing date, and quantiles of
// up to 30 complete past seasons, of which there are seasons, for days on which
// there are at least 10.
func (g *Gathering) Curve(ctx context.Context, f *Figures) (days []CurveDay, past []PastDay, seasons int, err error) {
	c := f.compared()
	rows, err := g.tx.Query(ctx, `select day, $4::float8 * `+c+`_low_c_days, $4::float8 * `+c+`_high_c_days from thaw.air_index_daily
		where station = $1 and `+season(f)+` = $2 and day between $2 and $3 order by day`, f.Station, f.SeasonStart.Time(), f.Day.Time(), f.factor())
	if err != nil {
		return nil, nil, 0, fmt.Errorf("read the season's curve: %w", err)
	}
	var day time.Time
	var d CurveDay
	_, err = pgx.ForEachRow(rows, []any{&day, &d.Low, &d.High}, func() error {
		d.Day = dayOf(day)
		days = append(days, d)
		return nil
	})
	if err != nil {
		return nil, nil, 0, fmt.Errorf("read the season's curve: %w", err)
	}
	rows, err = g.tx.Query(ctx, `with a as (select season_start from thaw.air_index_season where station = $1 and kind = $4 and definition = $5
			and season_start < $2 and season_over and days_missing = 0 order by season_start desc limit 30)
		select (select count(*) from a)::int, d.day - d.`+season(f)+` as n, percentile_cont(0.1) within group (order by v), percentile_cont(0.5) within group (order by v),
			percentile_cont(0.9) within group (order by v)
		from thaw.air_index_daily d cross join lateral (select $3::float8 * d.`+c+`_low_c_days) as x (v)
		where d.station = $1 and d.day >= $2::date - 11323 and d.day < $2 and d.`+season(f)+` in (select season_start from a)
		group by 2 having count(*) >= 10 order by 2`,
		f.Station, f.SeasonStart.Time(), f.factor(), string(f.Kind), string((&pipeline.DesignValue{Definition: f.Definition}).Compared()))
	if err != nil {
		return nil, nil, 0, fmt.Errorf("read past seasons: %w", err)
	}
	var p PastDay
	var after int
	_, err = pgx.ForEachRow(rows, []any{&seasons, &after, &p.P10, &p.P50, &p.P90}, func() error {
		p.Day = f.SeasonStart + pipeline.Day(after) //nolint:gosec // at most 366
		past = append(past, p)
		return nil
	})
	if err != nil {
		return nil, nil, 0, fmt.Errorf("read past seasons: %w", err)
	}
	return days, past, seasons, nil
}
