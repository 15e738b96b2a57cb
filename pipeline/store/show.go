package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
)

// StandingNow is a row of the view standing_now.
type StandingNow struct {
	Site             string
	SiteName         string
	Surface          string
	SurfaceName      string
	Station          string
	Kind             string
	Definition       string
	IndexOf          string
	Direction        string
	Season           string
	Day              time.Time
	State            string
	IndexCDays       *float64
	IndexLowCDays    float64
	IndexHighCDays   float64
	DesignCDays      float64
	ShareOfDesign    float64
	NearOn           *time.Time
	ExceededOn       *time.Time
	DaysInterpolated int
	DaysMissing      int
	SeasonOver       bool
	OnsetProvisional *bool

	DaysNeighbour       *int
	DaysClimatology     *int
	StandardErrorCDays  *float64
	DaysDoubtful        *int
	WithoutDoubtfulLow  *float64
	WithoutDoubtfulHigh *float64
	Homogeneous         *bool

	ProbabilityLow, ProbabilityHigh *float64
	PassDay10, PassDay50, PassDay90 *time.Time
	ExpectedOn                      *time.Time
}

// StandingsNow returns the current standing of every surface, by site, surface
// and kind; of one site only if site is not "".
func (db *DB) StandingsNow(ctx context.Context, site string) ([]StandingNow, error) {
	rows, err := db.pool.Query(ctx, `select site, site_name, surface, surface_name, station, kind, definition, index_of, direction,
			season, day, state, index_c_days, index_low_c_days, index_high_c_days, design_c_days, share_of_design, near_on,
			exceeded_on, days_interpolated, days_missing, season_over, onset_provisional,
			days_neighbour, days_climatology, standard_error_c_days, days_doubtful,
			without_doubtful_low_c_days as without_doubtful_low, without_doubtful_high_c_days as without_doubtful_high, homogeneous,
			probability_low, probability_high, pass_day_10 as pass_day10, pass_day_50 as pass_day50, pass_day_90 as pass_day90, expected_on
		from thaw.standing_now where $1 = '' or site = $1 order by site, surface, kind desc, direction`, site)
	if err != nil {
		return nil, fmt.Errorf("read standings: %w", err)
	}
	return collect[StandingNow](rows, "standings")
}

func collect[T any](rows pgx.Rows, what string) ([]T, error) {
	out, err := pgx.CollectRows(rows, pgx.RowToStructByName[T])
	if err != nil {
		return nil, fmt.Errorf("read %s: %w", what, err)
	}
	return out, nil
}

// ExceedanceShown is an exceedance as commands show it.
type ExceedanceShown struct {
	ExceedanceID   int64
	Site           string
	Surface        string
	Kind           string
	SeasonStart    time.Time
	NearOn         *time.Time
	ExceededOn     *time.Time
	FellShort      bool
	IndexLowCDays  float64
	IndexHighCDays float64
	DesignCDays    float64
	ClosedAs       *string
	ClosedOn       *time.Time
}

// ExceedancesSince returns the exceedances of seasons that start on or after a
// day, newest season first.
func (db *DB) ExceedancesSince(ctx context.Context, from time.Time) ([]ExceedanceShown, error) {
	rows, err := db.pool.Query(ctx, `select exceedance_id, site, surface, kind, season_start, near_on, exceeded_on, fell_short,
			index_low_c_days, index_high_c_days, design_c_days, closed_as, closed_on
		from thaw.exceedances where season_start >= $1
		order by season_start desc, coalesce(exceeded_on, near_on), site, surface, exceedance_id`, from)
	if err != nil {
		return nil, fmt.Errorf("read exceedances: %w", err)
	}
	return collect[ExceedanceShown](rows, "exceedances")
}

// LedgerLine is a row of the view ledger, or the sum over a feed's.
type LedgerLine struct {
	Feed             string
	Batches          int64
	State            string
	Reason           *string
	Rows             int64
	RowsRead         int64
	RowsWithoutValue int64
	RowsSetAside     int64
	Cells            int64
	Readings         int64
	CellsMissing     int64
	CellsSetAside    int64
	CellsRepeated    int64
	PartsOpen        int64
	PartsStuck       int64
}

// AddsUp says whether rows and cells add up: rows = read + without value + set
// aside; cells = readings + missing + set aside + repeated.
func (l *LedgerLine) AddsUp() bool {
	return l.Rows == l.RowsRead+l.RowsWithoutValue+l.RowsSetAside &&
		l.Cells == l.Readings+l.CellsMissing+l.CellsSetAside+l.CellsRepeated
}

// LedgerSums returns the ledger summed by feed and state.
func (db *DB) LedgerSums(ctx context.Context) ([]LedgerLine, error) {
	return db.ledgerSums(ctx, `true`)
}

// LedgerOf returns the line of one batch.
func (db *DB) LedgerOf(ctx context.Context, batch int64) (LedgerLine, error) {
	lines, err := db.ledgerSums(ctx, `batch_id = $1`, batch)
	if err == nil && len(lines) == 0 {
		err = fmt.Errorf("there is no batch %d", batch)
	}
	if err != nil {
		return LedgerLine{}, err
	}
	return lines[0], nil
}

func (db *DB) ledgerSums(ctx context.Context, where string, args ...any) ([]LedgerLine, error) {
	rows, err := db.pool.Query(ctx, `select feed, count(*) as batches, state, min(reason) as reason,
			coalesce(sum(rows), 0)::bigint as rows, coalesce(sum(rows_read), 0)::bigint as rows_read,
			coalesce(sum(rows_without_value), 0)::bigint as rows_without_value,
			coalesce(sum(rows_set_aside), 0)::bigint as rows_set_aside,
			coalesce(sum(cells), 0)::bigint as cells, coalesce(sum(readings), 0)::bigint as readings,
			coalesce(sum(cells_missing), 0)::bigint as cells_missing, coalesce(sum(cells_set_aside), 0)::bigint as cells_set_aside,
			coalesce(sum(cells_repeated), 0)::bigint as cells_repeated,
			coalesce(sum(parts - parts_committed), 0)::bigint as parts_open, coalesce(sum(parts_stuck), 0)::bigint as parts_stuck
		from thaw.ledger where `+where+` group by feed, state order by feed, state`, args...)
	if err != nil {
		return nil, fmt.Errorf("read ledger: %w", err)
	}
	return collect[LedgerLine](rows, "ledger")
}

// LedgerFault is a batch that is not done and not on its way, or a part of one
// that is stuck.
type LedgerFault struct {
	Feed   string
	Name   string
	State  string
	Reason *string
}

// LedgerFaults returns the batches that somebody has to look at.
func (db *DB) LedgerFaults(ctx context.Context) ([]LedgerFault, error) {
	rows, err := db.pool.Query(ctx, `select feed, name, state, reason from thaw.ledger
		where state in ('held_back', 'waiting', 'stuck') order by feed, name`)
	if err != nil {
		return nil, fmt.Errorf("read ledger: %w", err)
	}
	return collect[LedgerFault](rows, "ledger")
}

// AsideSum counts set-aside rows and cells of a feed by reason, with the first
// of them as an example.
type AsideSum struct {
	Feed   string
	Code   string
	Count  int64
	Name   string
	Line   int64
	Reason string
}

// AsideSums returns what was set aside, by feed and reason.
func (db *DB) AsideSums(ctx context.Context) ([]AsideSum, error) {
	rows, err := db.pool.Query(ctx, `select distinct on (feed, code) feed, code, count(*) over (partition by feed, code) as count,
			name, line, a.reason
		from thaw.set_aside a join thaw.batches b using (batch_id) join thaw.feeds using (feed_id)
		order by feed, code, batch_order, line, column_no`)
	if err != nil {
		return nil, fmt.Errorf("read set-aside rows: %w", err)
	}
	return collect[AsideSum](rows, "set-aside rows")
}

// Aside is a row or cell that was set aside.
type Aside struct {
	Line       int64
	ColumnNo   int
	ColumnName string
	Code       string
	Reason     string
}

// AsideOf returns the first rows and cells of a batch that were set aside.
func (db *DB) AsideOf(ctx context.Context, batch int64, limit int) ([]Aside, error) {
	rows, err := db.pool.Query(ctx, `select line, column_no, column_name, code, reason from thaw.set_aside
		where batch_id = $1 order by line, column_no limit $2`, batch, limit)
	if err != nil {
		return nil, fmt.Errorf("read set-aside rows: %w", err)
	}
	return collect[Aside](rows, "set-aside rows")
}

// DateSum sums a station's observed daily means of one date of the year.
type DateSum struct {
	YearDay int
	N       int
	Sum     float64 // degC
	Squares float64
}

// Climate returns the sums of a station's observed daily means by date.
func (db *DB) Climate(ctx context.Context, station string) ([]DateSum, error) {
	rows, err := db.pool.Query(ctx, `select extract(doy from day)::int as year_day, count(*)::int as n, sum(mean_c) as sum, sum(mean_c * mean_c) as squares
		from thaw.daily_values where station = $1 and origin = 1 group by 1`, station)
	if err != nil {
		return nil, fmt.Errorf("read climate of %s: %w", station, err)
	}
	return collect[DateSum](rows, "climate")
}

// Fingerprint returns one hash over all that the program holds; equal for equal
// contents.
func (db *DB) Fingerprint(ctx context.Context) (string, error) {
	var text string
	if err := db.pool.QueryRow(ctx, `select thaw.fingerprint()`).Scan(&text); err != nil {
		return "", fmt.Errorf("make fingerprint: %w", err)
	}
	return text, nil
}
