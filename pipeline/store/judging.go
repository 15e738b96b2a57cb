package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Judging is one transaction that judges the surfaces on one station.
type Judging struct {
	tx      pgx.Tx
	station string
}

// ChangedStations returns the stations that have lines in changes. One whose
// readings are being withdrawn waits until the end of that, unless it is stuck:
// what is in between is nobody's news.
func (db *DB) ChangedStations(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select station from thaw.changes c
		where not exists (select 1 from thaw.withdrawals w where w.station = c.station
				and not exists (select 1 from thaw.batch_parts p where p.batch_id = w.batch_id and p.station = w.station and p.stuck_at is not null))
			and not exists (select 1 from thaw.batch_parts p where p.station = c.station and p.again and p.committed_at is null and p.stuck_at is null)
		group by station order by min(change_id)`)
	if err != nil {
		return nil, fmt.Errorf("read changes: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// JudgeStation runs f in a transaction that holds the locks of the station's
// sites and has taken its lines out of changes; from is the earliest day that
// they name. It does nothing if there are none, and returns ErrBusy if another
// judges the station.
func (db *DB) JudgeStation(ctx context.Context, station string, f func(j *Judging, from pipeline.Day) error) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		got, err := tryLock(ctx, tx, lockSite, "station "+station)
		if err != nil {
			return err
		}
		if !got {
			return ErrBusy
		}
		var from *time.Time
		err = tx.QueryRow(ctx, `with d as (delete from thaw.changes where station = $1 returning from_day) select min(from_day) from d`, station).Scan(&from)
		if err != nil {
			return fmt.Errorf("take changes of %s: %w", station, err)
		}
		if from == nil {
			return nil
		}
		rows, err := tx.Query(ctx, `select site from thaw.sites where station = $1 order by site`, station)
		if err != nil {
			return fmt.Errorf("read sites of %s: %w", station, err)
		}
		sites, err := pgx.CollectRows(rows, pgx.RowTo[string])
		if err != nil {
			return fmt.Errorf("read sites of %s: %w", station, err)
		}
		for _, site := range sites {
			if err := lock(ctx, tx, lockSite, site); err != nil {
				return err
			}
		}
		return f(&Judging{tx: tx, station: station}, dayOf(*from))
	})
}

// Design is a design value in force, with the n-factors of its kind.
type Design struct {
	ID         int64
	Site       string
	Surface    string
	Kind       pipeline.Kind
	Definition pipeline.Definition
	Of         pipeline.Of
	Direction  pipeline.Direction
	From       pipeline.Day
	CDays      float64
	NearShare  float64
	Factors    []Factor // of the design value's kind, in order of date
}

// Factor is an n-factor in force from a day on.
type Factor struct {
	From  pipeline.Day
	Value float64
}

// Designs returns the design values in force of the surfaces on the station, in
// order of site, surface, kind and date.
func (j *Judging) Designs(ctx context.Context) ([]Design, error) {
	rows, err := j.tx.Query(ctx, `select d.design_value_id, d.site, d.surface, d.kind, d.definition, d.index_of, d.direction,
			d.valid_from, d.design_c_days, d.near_share,
			array(select n.valid_from from thaw.n_factors n where n.retired_at is null
				and (n.site, n.surface, n.kind) = (d.site, d.surface, d.kind) order by n.valid_from),
			array(select n.n_factor from thaw.n_factors n where n.retired_at is null
				and (n.site, n.surface, n.kind) = (d.site, d.surface, d.kind) order by n.valid_from)
		from thaw.design_values d join thaw.sites s using (site)
		where s.station = $1 and d.retired_at is null
		order by d.site, d.surface, d.kind, d.definition, d.index_of, d.direction, d.valid_from`, j.station)
	if err != nil {
		return nil, fmt.Errorf("read design values of %s: %w", j.station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (Design, error) {
		var (
			d      Design
			from   time.Time
			froms  []time.Time
			values []float64
		)
		err := r.Scan(&d.ID, &d.Site, &d.Surface, &d.Kind, &d.Definition, &d.Of, &d.Direction, &from, &d.CDays, &d.NearShare, &froms, &values)
		d.From = dayOf(from)
		for i := range values {
			d.Factors = append(d.Factors, Factor{From: dayOf(froms[i]), Value: values[i]})
		}
		return d, err
	})
	if err != nil {
		return nil, fmt.Errorf("read design values of %s: %w", j.station, err)
	}
	return out, nil
}

// SeasonState is what judging needs to know of a season as a whole.
type SeasonState struct {
	Start                 pipeline.Day
	Label                 string
	Through               pipeline.Day
	Over                  bool
	Interpolated, Missing int
}

// Seasons returns the station's seasons of a kind that are not over by the day
// from, in order.
func (j *Judging) Seasons(ctx context.Context, kind pipeline.Kind, from pipeline.Day) ([]SeasonState, error) {
	rows, err := j.tx.Query(ctx, `select season_start, season, through_day, season_over, days_interpolated, days_missing
		from thaw.air_index_season where station = $1 and kind = $2 and definition = 'curve' and through_day >= $3
		order by season_start`, j.station, string(kind), from.Time())
	if err != nil {
		return nil, fmt.Errorf("read seasons of %s: %w", j.station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (SeasonState, error) {
		var s SeasonState
		var start, through time.Time
		err := r.Scan(&start, &s.Label, &through, &s.Over, &s.Interpolated, &s.Missing)
		s.Start, s.Through = dayOf(start), dayOf(through)
		return s, err
	})
	if err != nil {
		return nil, fmt.Errorf("read seasons of %s: %w", j.station, err)
	}
	return out, nil
}

// StandingRow is a row of standings.
type StandingRow struct {
	Design       *Design
	Season       pipeline.Day
	Label        string
	Day          pipeline.Day
	State        pipeline.State
	Level        pipeline.Level
	Straddles    bool
	Low, High    float64
	SumBeside    *float64
	Factor       *float64
	NearOn       *pipeline.Day
	ExceededOn   *pipeline.Day
	ConfirmedOn  *pipeline.Day
	Interpolated int
	Missing      int
	Over         bool
	ExpectedOn   *pipeline.Day // not nil if the season is expected to end on the wrong side
	Outlook      *OutlookRow   // the latest; nil if there is none
}

// Before is what was stored of a standing.
type Before struct {
	State      pipeline.State
	Day        pipeline.Day
	Over       bool
	Level      pipeline.Level
	Straddles  bool
	Expected   bool
	ExpectedOn *pipeline.Day
	ExceededOn *pipeline.Day
	// Exceedance is the one that stands; 0 if none does.
	Exceedance int64
}

// Standing returns what is stored of a design value and season; nil if nothing is.
func (j *Judging) Standing(ctx context.Context, design int64, season pipeline.Day) (*Before, error) {
	var b Before
	var day time.Time
	var exceeded, expected *time.Time
	err := j.tx.QueryRow(ctx, `select s.state, s.day, s.season_over, s.straddles, s.exceeded_on, s.level, s.expected, s.expected_on, coalesce(e.exceedance_id, 0)
		from thaw.standings s left join thaw.exceedances e on e.design_value_id = s.design_value_id and e.season_start = s.season_start
			and (e.closed_as is null or e.closed_as = 'season over')
		where s.design_value_id = $1 and s.season_start = $2`, design, season.Time()).Scan(&b.State, &day, &b.Over, &b.Straddles, &exceeded,
		&b.Level, &b.Expected, &expected, &b.Exceedance)
	if errors.Is(err, pgx.ErrNoRows) {
		return nil, nil
	}
	if err != nil {
		return nil, fmt.Errorf("read standing: %w", err)
	}
	b.Day, b.ExceededOn, b.ExpectedOn = dayOf(day), dayIf(exceeded), dayIf(expected)
	return &b, nil
}

// WriteStanding puts a row in the place of the one of its design value and season.
func (j *Judging) WriteStanding(ctx context.Context, s *StandingRow) error {
	var low, high *float64
	var passDays [3]*time.Time
	var through *time.Time
	if o := s.Outlook; o != nil {
		l, h := o.Adverse(s.Design.Direction)
		low, high, passDays, through = &l, &h, [3]*time.Time{dateOf(o.PassDay10), dateOf(o.PassDay50), dateOf(o.PassDay90)}, dateOf(&o.Through)
	}
	_, err := j.tx.Exec(ctx, `insert into thaw.standings (design_value_id, season_start, site, surface, kind, season, day, state,
			level, straddles, index_c_days, index_low_c_days, index_high_c_days, sum_beside_c_days, design_c_days, n_factor,
			near_on, exceeded_on, confirmed_on, days_interpolated, days_missing, season_over,
			expected, expected_on, probability_low, probability_high, pass_day_10, pass_day_50, pass_day_90, outlook_through)
		values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14, $15, $16, $17, $18, $19, $20, $21, $22,
			$23, $24, $25, $26, $27, $28, $29, $30)
		on conflict (design_value_id, season_start) do update set
			season = excluded.season, day = excluded.day, state = excluded.state, level = excluded.level,
			straddles = excluded.straddles, index_c_days = excluded.index_c_days, index_low_c_days = excluded.index_low_c_days,
			index_high_c_days = excluded.index_high_c_days, sum_beside_c_days = excluded.sum_beside_c_days,
			n_factor = excluded.n_factor, near_on = excluded.near_on, exceeded_on = excluded.exceeded_on,
			confirmed_on = excluded.confirmed_on, days_interpolated = excluded.days_interpolated,
			days_missing = excluded.days_missing, season_over = excluded.season_over, expected = excluded.expected,
			expected_on = excluded.expected_on, probability_low = excluded.probability_low, probability_high = excluded.probability_high,
			pass_day_10 = excluded.pass_day_10, pass_day_50 = excluded.pass_day_50, pass_day_90 = excluded.pass_day_90,
			outlook_through = excluded.outlook_through, judged_at = clock_timestamp()`,
		s.Design.ID, s.Season.Time(), s.Design.Site, s.Design.Surface, string(s.Design.Kind), s.Label, s.Day.Time(), string(s.State),
		string(s.Level), s.Straddles, known(s.Low, s.High), s.Low, s.High, s.SumBeside, s.Design.CDays, s.Factor,
		dateOf(s.NearOn), dateOf(s.ExceededOn), dateOf(s.ConfirmedOn), s.Interpolated, s.Missing, s.Over,
		s.ExpectedOn != nil, dateOf(s.ExpectedOn), low, high, passDays[0], passDays[1], passDays[2], through)
	if err != nil {
		return fmt.Errorf("write standing of %s/%s: %w", s.Design.Site, s.Design.Surface, err)
	}
	return nil
}
