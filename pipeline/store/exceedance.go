package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// OpenExceedance records that a surface has left within, with the figures that
// this rests on, and returns its number.
func (j *Judging) OpenExceedance(ctx context.Context, s *StandingRow) (int64, error) {
	var id int64
	err := j.tx.QueryRow(ctx, `insert into thaw.exceedances (design_value_id, site, surface, kind, season_start, near_on, exceeded_on,
			confirmed_on, through_day, index_c_days, index_low_c_days, index_high_c_days, design_c_days, n_factor,
			days_interpolated, days_missing, fell_short, expected_on)
		values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14, $15, $16, $17, $18) returning exceedance_id`,
		s.Design.ID, s.Design.Site, s.Design.Surface, string(s.Design.Kind), s.Season.Time(), dateOf(s.NearOn), dateOf(s.ExceededOn),
		dateOf(s.ConfirmedOn), s.Day.Time(), known(s.Low, s.High), s.Low, s.High, s.Design.CDays, s.Factor,
		s.Interpolated, s.Missing, s.State == pipeline.FellShort, dateOf(s.ExpectedOn)).Scan(&id)
	if err != nil {
		return 0, fmt.Errorf("open exceedance of %s/%s: %w", s.Design.Site, s.Design.Surface, err)
	}
	return id, nil
}

// ChangeExceedance brings an exceedance's figures up to date and, once the
// season is over, closes it as such; a season that a correction reopens reopens it.
func (j *Judging) ChangeExceedance(ctx context.Context, id int64, s *StandingRow, seasonEnd pipeline.Day) error {
	var closedOn *time.Time
	var closedAs *string
	if s.Over {
		end, as := seasonEnd.Time(), "season over"
		closedOn, closedAs = &end, &as
	}
	_, err := j.tx.Exec(ctx, `update thaw.exceedances set near_on = $2, exceeded_on = $3, confirmed_on = $4, through_day = $5,
			index_c_days = $6, index_low_c_days = $7, index_high_c_days = $8, n_factor = $9, days_interpolated = $10,
			days_missing = $11, fell_short = $12, expected_on = $15, changed_at = clock_timestamp(), closed_on = $13, closed_as = $14,
			closed_at = case when $14::text is null then null else coalesce(closed_at, clock_timestamp()) end
		where exceedance_id = $1`,
		id, dateOf(s.NearOn), dateOf(s.ExceededOn), dateOf(s.ConfirmedOn), s.Day.Time(), known(s.Low, s.High), s.Low, s.High, s.Factor,
		s.Interpolated, s.Missing, s.State == pipeline.FellShort, closedOn, closedAs, dateOf(s.ExpectedOn))
	if err != nil {
		return fmt.Errorf("change exceedance %d: %w", id, err)
	}
	return nil
}

// WithdrawExceedance takes an exceedance back: a correction has brought the
// surface within again. Its figures stay as they were.
func (j *Judging) WithdrawExceedance(ctx context.Context, id int64, day pipeline.Day) error {
	_, err := j.tx.Exec(ctx, `update thaw.exceedances set closed_on = $2, closed_as = 'withdrawn', closed_at = clock_timestamp()
		where exceedance_id = $1`, id, day.Time())
	if err != nil {
		return fmt.Errorf("withdraw exceedance %d: %w", id, err)
	}
	return nil
}

// Retired is how a surface stood in a season by a design value that another has
// taken the place of.
type Retired struct {
	Site, Surface string
	Kind          pipeline.Kind
	Definition    pipeline.Definition
	Of            pipeline.Of
	Direction     pipeline.Direction
	Season        pipeline.Day
}

// ClearRetired drops the standings of retired design values of the station's
// sites and closes their exceedances: they are judged no more. It returns the
// states that they had.
func (j *Judging) ClearRetired(ctx context.Context) (map[Retired]pipeline.State, error) {
	rows, err := j.tx.Query(ctx, `with gone as (
			select design_value_id from thaw.design_values join thaw.sites using (site)
			where station = $1 and retired_at is not null),
		s as (delete from thaw.standings where design_value_id in (select * from gone) returning design_value_id, season_start, state),
		e as (update thaw.exceedances set closed_on = through_day, closed_as = 'design value replaced', closed_at = clock_timestamp()
			where design_value_id in (select * from gone) and (closed_as is null or closed_as = 'season over'))
		select d.site, d.surface, d.kind, d.definition, d.index_of, d.direction, s.season_start, s.state
		from s join thaw.design_values d using (design_value_id) order by d.design_value_id`, j.station)
	if err != nil {
		return nil, fmt.Errorf("clear retired design values of %s: %w", j.station, err)
	}
	out := map[Retired]pipeline.State{}
	var r Retired
	var season time.Time
	var state pipeline.State
	_, err = pgx.ForEachRow(rows, []any{&r.Site, &r.Surface, &r.Kind, &r.Definition, &r.Of, &r.Direction, &season, &state}, func() error {
		r.Season = dayOf(season)
		out[r] = state
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("clear retired design values of %s: %w", j.station, err)
	}
	return out, nil
}

// DropStandings removes the standings of a design value for seasons that it is
// no longer judged in, those before the first and not in seasons.
func (j *Judging) DropStandings(ctx context.Context, design int64, from pipeline.Day, seasons []pipeline.Day) error {
	dates := make([]time.Time, len(seasons))
	for i, d := range seasons {
		dates[i] = d.Time()
	}
	_, err := j.tx.Exec(ctx, `with s as (delete from thaw.standings where design_value_id = $1 and season_start >= $2 and not season_start = any($3)
			returning season_start)
		update thaw.exceedances set closed_on = through_day, closed_as = 'withdrawn', closed_at = clock_timestamp()
		where design_value_id = $1 and season_start in (select season_start from s) and (closed_as is null or closed_as = 'season over')`,
		design, from.Time(), dates)
	if err != nil {
		return fmt.Errorf("clear standings of design value %d: %w", design, err)
	}
	return nil
}

// StandingChange is a row of standing_changes.
type StandingChange struct {
	ID         int64
	Exceedance int64 // 0 for none
	From       pipeline.State
	Why        string
	Announce   bool
	RecordedAt time.Time

	Site, Surface string
	Kind          pipeline.Kind
	Season        pipeline.Day
	Day           pipeline.Day
	To            pipeline.State
	Low, High     float64
	DesignC       float64
	ExceededOn    *pipeline.Day
}

// AddStandingChange records a change of state with its figures.
func (j *Judging) AddStandingChange(ctx context.Context, s *StandingRow, c StandingChange) error {
	_, err := j.tx.Exec(ctx, `insert into thaw.standing_changes (design_value_id, exceedance_id, site, surface, kind, season_start, day,
			from_state, to_state, why, index_c_days, index_low_c_days, index_high_c_days, design_c_days, exceeded_on, announce)
		values ($1, nullif($2::bigint, 0), $3, $4, $5, $6, $7, nullif($8, ''), $9, $10, $11, $12, $13, $14, $15, $16)`,
		s.Design.ID, c.Exceedance, s.Design.Site, s.Design.Surface, string(s.Design.Kind), s.Season.Time(), s.Day.Time(),
		string(c.From), string(s.State), c.Why, known(s.Low, s.High), s.Low, s.High, s.Design.CDays, dateOf(s.ExceededOn), c.Announce)
	if err != nil {
		return fmt.Errorf("record change of %s/%s: %w", s.Design.Site, s.Design.Surface, err)
	}
	return nil
}

// Unannounced returns changes that are to be told and have not been, oldest first.
func (db *DB) Unannounced(ctx context.Context, limit int) ([]StandingChange, error) {
	return db.standingChanges(ctx, `announced_at is null`, limit)
}

// Told returns the changes that have been told after a given one, oldest first.
func (db *DB) Told(ctx context.Context, after int64) ([]StandingChange, error) {
	return db.standingChanges(ctx, `announced_at is not null and change_id > $2`, 1000, after)
}

func (db *DB) standingChanges(ctx context.Context, where string, args ...any) ([]StandingChange, error) {
	rows, err := db.pool.Query(ctx, `select change_id, coalesce(exceedance_id, 0), site, surface, kind, season_start, day,
			coalesce(from_state, ''), to_state, why, index_low_c_days, index_high_c_days, design_c_days, exceeded_on, recorded_at
		from thaw.standing_changes where announce and `+where+` order by change_id limit $1`, args...)
	if err != nil {
		return nil, fmt.Errorf("read standing changes: %w", err)
	}
	return pgx.CollectRows(rows, func(r pgx.CollectableRow) (StandingChange, error) {
		var c StandingChange
		var season, day time.Time
		var exceeded *time.Time
		err := r.Scan(&c.ID, &c.Exceedance, &c.Site, &c.Surface, &c.Kind, &season, &day, &c.From, &c.To, &c.Why,
			&c.Low, &c.High, &c.DesignC, &exceeded, &c.RecordedAt)
		c.Season, c.Day, c.Announce = dayOf(season), dayOf(day), true
		if exceeded != nil {
			d := dayOf(*exceeded)
			c.ExceededOn = &d
		}
		return c, err
	})
}

// Announced records that a change has been told.
func (db *DB) Announced(ctx context.Context, id int64) error {
	_, err := db.pool.Exec(ctx, `update thaw.standing_changes set announced_at = clock_timestamp() where change_id = $1`, id)
	if err != nil {
		return fmt.Errorf("record announcement %d: %w", id, err)
	}
	return nil
}
