package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// MeanRow is a day's mean: MeanC if Origin is not Missing, and bounds that are
// equal to it then.
type MeanRow struct {
	Day                pipeline.Day
	Origin             pipeline.Origin
	MeanC, LowC, HighC float64 // degC
}

// DailyMeans returns a station's daily means, every day of its record in order.
func (db *DB) DailyMeans(ctx context.Context, station string) ([]MeanRow, error) {
	rows, err := db.pool.Query(ctx, `select day, origin, coalesce(mean_c, 0), low_c, high_c
		from thaw.daily_values where station = $1 order by day`, station)
	if err != nil {
		return nil, fmt.Errorf("read daily means of %s: %w", station, err)
	}
	var (
		out    []MeanRow
		m      MeanRow
		day    time.Time
		origin int16
	)
	_, err = pgx.ForEachRow(rows, []any{&day, &origin, &m.MeanC, &m.LowC, &m.HighC}, func() error {
		m.Day, m.Origin = dayOf(day), pipeline.Origin(origin)
		out = append(out, m)
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read daily means of %s: %w", station, err)
	}
	return out, nil
}

// AirDesign is a design value as a season's air index is held against it.
type AirDesign struct {
	ID        int64
	Site      string
	Surface   string
	Kind      pipeline.Kind
	Stated    pipeline.Definition // curve, sum or not_stated
	Compared  pipeline.Definition // curve or sum
	Of        pipeline.Of
	Direction pipeline.Direction
	BaseC     float64
	NearShare float64
	CDays     float64  // as stated, of the air or of the surface, degC.d
	NFactor   *float64 // of a surface's; nil for one of the air, and where none is in force

	// AirCDays is the air index that it stands for, degC.d: CDays, or CDays
	// divided by the n-factor. Comparable is false for a surface without one.
	AirCDays   float64
	Comparable bool
}

// AirDesigns returns the design values of surfaces on a station that are in force
// for the seasons of the given starts, in order of site, surface and kind.
func (db *DB) AirDesigns(ctx context.Context, station string, thaw, freeze pipeline.Day) ([]AirDesign, error) {
	rows, err := db.pool.Query(ctx, `select distinct on (d.site, d.surface, d.kind, d.definition, d.index_of, d.direction)
			d.design_value_id, d.site, d.surface, d.kind, d.definition, d.index_of, d.direction, d.base_c, d.near_share, d.design_c_days,
			(select n.n_factor from thaw.n_factors n where n.retired_at is null and d.index_of = 'surface'
				and (n.site, n.surface, n.kind) = (d.site, d.surface, d.kind) and n.valid_from <= w.season_start
				order by n.valid_from desc limit 1)
		from thaw.design_values d join thaw.sites s using (site)
		join (values ('thaw', $2::date), ('freeze', $3::date)) w (kind, season_start) on w.kind = d.kind
		where s.station = $1 and d.retired_at is null and d.valid_from <= w.season_start
		order by d.site, d.surface, d.kind, d.definition, d.index_of, d.direction, d.valid_from desc`, station, thaw.Time(), freeze.Time())
	if err != nil {
		return nil, fmt.Errorf("read design values of %s: %w", station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (AirDesign, error) {
		var d AirDesign
		err := r.Scan(&d.ID, &d.Site, &d.Surface, &d.Kind, &d.Stated, &d.Of, &d.Direction, &d.BaseC, &d.NearShare, &d.CDays, &d.NFactor)
		d.Compared = (&pipeline.DesignValue{Definition: d.Stated}).Compared()
		switch {
		case d.Of == pipeline.OfAir:
			d.AirCDays, d.Comparable = d.CDays, true
		case d.NFactor != nil:
			d.AirCDays, d.Comparable = d.CDays / *d.NFactor, true
		}
		return d, err
	})
	if err != nil {
		return nil, fmt.Errorf("read design values of %s: %w", station, err)
	}
	return out, nil
}

// OutlookRow is a row of outlooks. Indices in degC.d of the air.
type OutlookRow struct {
	Station     string
	Kind        pipeline.Kind
	Definition  pipeline.Definition
	SeasonStart pipeline.Day
	Season      string
	Through     pipeline.Day

	DesignValueID  *int64 // nil for a threshold that is no design value
	ThresholdCDays float64
	NFactor        *float64

	IndexLow, IndexHigh             float64 // to date
	ProbabilityLow, ProbabilityHigh float64 // of coming to the threshold or past it
	Passed                          bool
	PassDay10, PassDay50, PassDay90 *pipeline.Day
	End10                           float64
	End50                           *float64 // nil where missing days leave it open
	End90                           float64

	Members          int
	Which            string // raw or moved
	LeadMonth        int
	ScoredYears      int
	Skill            *OutlookSkill // by CRPS; nil if it is unknown
	BrierSkill       *OutlookSkill
	AnnouncedAllowed bool

	MadeAt time.Time // of a row that was read
}

// OutlookSkill is a skill with its sampling interval, nil where there are too
// few seasons for one.
type OutlookSkill struct {
	Value     float64
	Low, High *float64
}

func (s *OutlookSkill) columns() (value, low, high *float64) {
	if s == nil {
		return nil, nil, nil
	}
	return &s.Value, s.Low, s.High
}

func skillOf(value, low, high *float64) *OutlookSkill {
	if value == nil {
		return nil
	}
	return &OutlookSkill{*value, low, high}
}

// WriteOutlooks puts rows, in one transaction, in the place of those of the same
// station, index, season, day and threshold.
func (db *DB) WriteOutlooks(ctx context.Context, rows []OutlookRow) error {
	return db.within(ctx, func(tx pgx.Tx) error { return writeOutlooks(ctx, tx, rows) })
}

func writeOutlooks(ctx context.Context, tx pgx.Tx, rows []OutlookRow) error {
	batch := &pgx.Batch{}
	for i := range rows {
		r := &rows[i]
		skill, skillLow, skillHigh := r.Skill.columns()
		brier, brierLow, brierHigh := r.BrierSkill.columns()
		// A design value has one row a day, whatever n-factor it was divided by.
		batch.Queue(`delete from thaw.outlooks where station = $1 and kind = $2 and definition = $3 and season_start = $4 and through_day = $5
			and design_value_id is not distinct from $6 and (design_value_id is not null or threshold_c_days = $7)`,
			r.Station, string(r.Kind), string(r.Definition), r.SeasonStart.Time(), r.Through.Time(), r.DesignValueID, r.ThresholdCDays)
		batch.Queue(`insert into thaw.outlooks (station, kind, definition, season_start, season, through_day, design_value_id,
				threshold_c_days, n_factor, index_low_c_days, index_high_c_days, probability, probability_low, probability_high, passed,
				pass_day_10, pass_day_50, pass_day_90, end_10_c_days, end_50_c_days, end_90_c_days, members, which, lead_month,
				scored_years, crps_skill, crps_skill_low, crps_skill_high, brier_skill, brier_skill_low, brier_skill_high, announced_allowed)
			values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14, $15, $16, $17, $18, $19, $20, $21, $22, $23, $24, $25,
				$26, $27, $28, $29, $30, $31, $32)
			on conflict (station, kind, definition, season_start, through_day, design_value_id, threshold_c_days) do update set
				season = excluded.season, n_factor = excluded.n_factor, index_low_c_days = excluded.index_low_c_days,
				index_high_c_days = excluded.index_high_c_days, probability = excluded.probability,
				probability_low = excluded.probability_low, probability_high = excluded.probability_high, passed = excluded.passed,
				pass_day_10 = excluded.pass_day_10, pass_day_50 = excluded.pass_day_50, pass_day_90 = excluded.pass_day_90,
				end_10_c_days = excluded.end_10_c_days, end_50_c_days = excluded.end_50_c_days, end_90_c_days = excluded.end_90_c_days,
				members = excluded.members, which = excluded.which, lead_month = excluded.lead_month, scored_years = excluded.scored_years,
				crps_skill = excluded.crps_skill, crps_skill_low = excluded.crps_skill_low, crps_skill_high = excluded.crps_skill_high,
				brier_skill = excluded.brier_skill, brier_skill_low = excluded.brier_skill_low, brier_skill_high = excluded.brier_skill_high,
				announced_allowed = excluded.announced_allowed, made_at = excluded.made_at`,
			r.Station, string(r.Kind), string(r.Definition), r.SeasonStart.Time(), r.Season, r.Through.Time(), r.DesignValueID,
			r.ThresholdCDays, r.NFactor, r.IndexLow, r.IndexHigh, known(r.ProbabilityLow, r.ProbabilityHigh), r.ProbabilityLow,
			r.ProbabilityHigh, r.Passed, dateOf(r.PassDay10), dateOf(r.PassDay50), dateOf(r.PassDay90), r.End10, r.End50, r.End90,
			r.Members, r.Which, r.LeadMonth, r.ScoredYears, skill, skillLow, skillHigh, brier, brierLow, brierHigh, r.AnnouncedAllowed)
	}
	if err := tx.SendBatch(ctx, batch).Close(); err != nil {
		return fmt.Errorf("write outlooks: %w", err)
	}
	return nil
}

// Outlook returns the latest outlook for a design value in a season, that of the
// last day; nil if there is none.
func (db *DB) Outlook(ctx context.Context, station string, design int64, season pipeline.Day) (*OutlookRow, error) {
	return latestOutlook(ctx, db.pool, station, design, season)
}

// Outlook is DB.Outlook for the station that is judged.
func (j *Judging) Outlook(ctx context.Context, design int64, season pipeline.Day) (*OutlookRow, error) {
	return latestOutlook(ctx, j.tx, j.station, design, season)
}

func latestOutlook(ctx context.Context, q querier, station string, design int64, season pipeline.Day) (*OutlookRow, error) {
	var (
		r                                  OutlookRow
		start, through                     time.Time
		day10, day50, day90                *time.Time
		skill, low, high                   *float64
		brierSkill, brierLow, brierHighest *float64
	)
	err := q.QueryRow(ctx, `select station, kind, definition, season_start, season, through_day, design_value_id, threshold_c_days,
			n_factor, index_low_c_days, index_high_c_days, probability_low, probability_high, passed, pass_day_10, pass_day_50,
			pass_day_90, end_10_c_days, end_50_c_days, end_90_c_days, members, which, lead_month, scored_years, crps_skill,
			crps_skill_low, crps_skill_high, brier_skill, brier_skill_low, brier_skill_high, announced_allowed, made_at
		from thaw.outlooks where station = $1 and design_value_id = $2 and season_start = $3
		order by through_day desc, made_at desc limit 1`, station, design, season.Time()).
		Scan(&r.Station, &r.Kind, &r.Definition, &start, &r.Season, &through, &r.DesignValueID, &r.ThresholdCDays,
			&r.NFactor, &r.IndexLow, &r.IndexHigh, &r.ProbabilityLow, &r.ProbabilityHigh, &r.Passed, &day10, &day50,
			&day90, &r.End10, &r.End50, &r.End90, &r.Members, &r.Which, &r.LeadMonth, &r.ScoredYears, &skill,
			&low, &high, &brierSkill, &brierLow, &brierHighest, &r.AnnouncedAllowed, &r.MadeAt)
	if errors.Is(err, pgx.ErrNoRows) {
		return nil, nil
	}
	if err != nil {
		return nil, fmt.Errorf("read outlook of %s: %w", station, err)
	}
	r.SeasonStart, r.Through = dayOf(start), dayOf(through)
	r.PassDay10, r.PassDay50, r.PassDay90 = dayIf(day10), dayIf(day50), dayIf(day90)
	r.Skill, r.BrierSkill = skillOf(skill, low, high), skillOf(brierSkill, brierLow, brierHighest)
	return &r, nil
}

func dayIf(t *time.Time) *pipeline.Day {
	if t == nil {
		return nil
	}
	d := dayOf(*t)
	return &d
}

// OutlookScoreRow is a row of outlook_scores. Scores in degC.d but for Brier.
type OutlookScoreRow struct {
	YearsFrom string // earlier or others
	Which     string // raw or moved
	LeadMonth int
	Used      bool // outlooks are made this way
	Years, N  int

	CRPS, CRPSFair                                            float64
	CRPSClimatology, CRPSClimatologyRaw, CRPSClimatologyMoved float64
	Skill                                                     *OutlookSkill
	SkillFair                                                 *float64
	Brier, BrierClimatology                                   float64
	BrierSkill                                                *OutlookSkill
	Pinball, PinballClimatology                               [3]float64 // of 10, 50 and 90 %
	ThresholdsCDays                                           []float64
}

// WriteOutlookScores puts rows in the place of all that there are of a station's
// index.
func (db *DB) WriteOutlookScores(ctx context.Context, station string, kind pipeline.Kind, definition pipeline.Definition, rows []OutlookScoreRow) error {
	batch := &pgx.Batch{}
	batch.Queue(`delete from thaw.outlook_scores where station = $1 and kind = $2 and definition = $3`, station, string(kind), string(definition))
	for i := range rows {
		r := &rows[i]
		skill, low, high := r.Skill.columns()
		brierSkill, brierLow, brierHigh := r.BrierSkill.columns()
		batch.Queue(`insert into thaw.outlook_scores (station, kind, definition, years_from, which, lead_month, used, years_used, n, crps,
				crps_fair, crps_climatology, crps_climatology_raw, crps_climatology_moved, skill, skill_low, skill_high, skill_fair, brier,
				brier_climatology, brier_skill, brier_skill_low, brier_skill_high, pinball_10, pinball_50, pinball_90,
				pinball_climatology_10, pinball_climatology_50, pinball_climatology_90, thresholds_c_days)
			values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11, $12, $13, $14, $15, $16, $17, $18, $19, $20, $21, $22, $23, $24, $25,
				$26, $27, $28, $29, $30)`,
			station, string(kind), string(definition), r.YearsFrom, r.Which, r.LeadMonth, r.Used, r.Years, r.N, r.CRPS,
			r.CRPSFair, r.CRPSClimatology, r.CRPSClimatologyRaw, r.CRPSClimatologyMoved, skill, low, high, r.SkillFair, r.Brier,
			r.BrierClimatology, brierSkill, brierLow, brierHigh, r.Pinball[0], r.Pinball[1], r.Pinball[2],
			r.PinballClimatology[0], r.PinballClimatology[1], r.PinballClimatology[2], r.ThresholdsCDays)
	}
	return db.within(ctx, func(tx pgx.Tx) error {
		// Two that score the same index at once must not both insert.
		if err := lock(ctx, tx, lockStation, "outlook "+station); err != nil {
			return err
		}
		if err := tx.SendBatch(ctx, batch).Close(); err != nil {
			return fmt.Errorf("write outlook scores of %s: %w", station, err)
		}
		return nil
	})
}
