package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// SeriesInfo is what all readings of a series share, for making daily values.
type SeriesInfo struct {
	Feed     string
	Rank     int
	Sensor   string
	Variable pipeline.Variable
	SpanS    int32
}

// EachReading calls f for the station's readings whose spans start in
// [from, to), in order of time.
func (t *Take) EachReading(ctx context.Context, from, to time.Time, f func(s *SeriesInfo, startS int64, valueC float64, q pipeline.Quality)) error {
	infos, ids, err := t.seriesInfos(ctx)
	if err != nil {
		return err
	}
	fromS, toS := from.Unix(), to.Unix()
	inHandFrom, inHandTo := max(fromS, t.fresh.fromS), min(toS, t.fresh.beforeS)
	if inHandFrom >= inHandTo {
		return t.eachStored(ctx, infos, ids, fromS, toS, f)
	}
	if err := t.eachStored(ctx, infos, ids, fromS, inHandFrom, f); err != nil {
		return err
	}
	for _, r := range t.fresh.between(inHandFrom, inHandTo) {
		f(infos[r.series], r.startS, r.valueC, r.quality)
	}
	return t.eachStored(ctx, infos, ids, inHandTo, toS, f)
}

func (t *Take) eachStored(ctx context.Context, infos map[int32]*SeriesInfo, ids []int32, fromS, toS int64,
	f func(s *SeriesInfo, startS int64, valueC float64, q pipeline.Quality)) error {
	if fromS >= toS {
		return nil
	}
	rows, err := t.tx.Query(ctx, `select series_id, start_utc, value_c, quality from thaw.reading_values
		where series_id = any($1) and start_utc >= $2 and start_utc < $3 order by start_utc, series_id`, ids, time.Unix(fromS, 0), time.Unix(toS, 0))
	if err != nil {
		return fmt.Errorf("read readings of %s: %w", t.station, err)
	}
	var (
		id      int32
		start   time.Time
		value   float64
		quality int16
	)
	_, err = pgx.ForEachRow(rows, []any{&id, &start, &value, &quality}, func() error {
		f(infos[id], start.Unix(), value, pipeline.Quality(quality))
		return nil
	})
	if err != nil {
		return fmt.Errorf("read readings of %s: %w", t.station, err)
	}
	return nil
}

func (t *Take) seriesInfos(ctx context.Context) (map[int32]*SeriesInfo, []int32, error) {
	rows, err := t.tx.Query(ctx, `select series_id, feed, rank, sensor, variable, span_s
		from thaw.series join thaw.feeds using (feed_id) where station = $1 order by series_id`, t.station)
	if err != nil {
		return nil, nil, fmt.Errorf("read series of %s: %w", t.station, err)
	}
	infos := map[int32]*SeriesInfo{}
	var ids []int32
	var (
		id       int32
		s        SeriesInfo
		variable int16
	)
	_, err = pgx.ForEachRow(rows, []any{&id, &s.Feed, &s.Rank, &s.Sensor, &variable, &s.SpanS}, func() error {
		info := s
		info.Variable = pipeline.Variable(variable)
		infos[id], ids = &info, append(ids, id)
		return nil
	})
	if err != nil {
		return nil, nil, fmt.Errorf("read series of %s: %w", t.station, err)
	}
	return infos, nonNil(ids), nil
}

// Span returns the first and last instant at which a usable reading of the station
// starts; ok is false if it has none.
func (t *Take) Span(ctx context.Context) (first, last time.Time, ok bool, err error) {
	var a, b *time.Time
	err = t.tx.QueryRow(ctx, `select min(v.start_utc), max(v.start_utc) from thaw.reading_values v
		where v.series_id in (select series_id from thaw.series where station = $1) and v.quality <> 3`, t.station).Scan(&a, &b)
	if err != nil {
		return first, last, false, fmt.Errorf("read span of %s: %w", t.station, err)
	}
	if a == nil {
		return first, last, false, nil
	}
	return *a, *b, true, nil
}

// dayOf turns a date as the client returns it into a Day.
func dayOf(t time.Time) pipeline.Day { return pipeline.DayOf(t.Year(), t.Month(), t.Day()) }

// DropRecord removes all indices of the station.
func (t *Take) DropRecord(ctx context.Context) error {
	for _, table := range []string{"index_blocks", "air_index_season"} {
		if _, err := t.tx.Exec(ctx, `delete from thaw.`+table+` where station = $1`, t.station); err != nil {
			return fmt.Errorf("clear indices of %s: %w", t.station, err)
		}
	}
	return nil
}

// SeasonRow is a row of air_index_season.
type SeasonRow struct {
	Kind                     pipeline.Kind
	Definition               pipeline.Definition
	Start                    pipeline.Day
	Label                    string
	Low, High                float64
	FirstDay, LastDay        *pipeline.Day
	Through                  pipeline.Day
	Over, Complete, NoSeason bool
	EdgeProvisional          bool
	OnsetProvisional         bool
	Observed, Interpolated   int
	Missing, LongestGap      int
	Neighbour, Climate       int
	ErrorC                   *float64 // standard error of the index, degC.d; nil where no day is filled
	Doubtful                 int
	Without                  *[2]float64 // lowest and highest index without doubtful days; nil without any
	Homogeneous              bool
	Rule                     pipeline.MeanRule
	BaseC                    float64
}

var seasonColumns = []string{"station", "kind", "definition", "season_start", "season", "index_c_days", "index_low_c_days", "index_high_c_days",
	"start_day", "end_day", "through_day", "season_over", "complete", "no_season", "edge_provisional", "onset_provisional",
	"days_observed", "days_interpolated", "days_missing", "longest_gap_days", "mean_rule", "base_c",
	"days_neighbour", "days_climatology", "standard_error_c_days", "days_doubtful", "without_doubtful_low_c_days", "without_doubtful_high_c_days", "homogeneous"}

// WriteSeasons puts rows in the place of those with the same kind and start.
func (t *Take) WriteSeasons(ctx context.Context, rows []SeasonRow) error {
	kinds, starts := make([]string, len(rows)), make([]time.Time, len(rows))
	for i := range rows {
		kinds[i], starts[i] = string(rows[i].Kind), rows[i].Start.Time()
	}
	_, err := t.tx.Exec(ctx, `delete from thaw.air_index_season where station = $1
		and (kind, season_start) in (select * from unnest($2::text[], $3::date[]))`, t.station, kinds, starts)
	if err != nil {
		return fmt.Errorf("clear seasons of %s: %w", t.station, err)
	}
	_, err = t.tx.CopyFrom(ctx, pgx.Identifier{"thaw", "air_index_season"}, seasonColumns, pgx.CopyFromSlice(len(rows), func(i int) ([]any, error) {
		r := &rows[i]
		var without [2]*float64
		if r.Without != nil {
			without = [2]*float64{&r.Without[0], &r.Without[1]}
		}
		return []any{t.station, string(r.Kind), string(r.Definition), r.Start.Time(), r.Label, known(r.Low, r.High), r.Low, r.High,
			dateOf(r.FirstDay), dateOf(r.LastDay), r.Through.Time(), r.Over, r.Complete, r.NoSeason, r.EdgeProvisional, r.OnsetProvisional,
			r.Observed, r.Interpolated, r.Missing, r.LongestGap, string(r.Rule), r.BaseC,
			r.Neighbour, r.Climate, r.ErrorC, r.Doubtful, without[0], without[1], r.Homogeneous}, nil
	}))
	if err != nil {
		return fmt.Errorf("write seasons of %s: %w", t.station, err)
	}
	return nil
}

// DropSeasons removes the station's seasons that the record no longer reaches,
// or that a changed start of the year has moved: those not in starts.
func (t *Take) DropSeasons(ctx context.Context, kind pipeline.Kind, starts []pipeline.Day) error {
	dates := make([]time.Time, len(starts))
	for i, d := range starts {
		dates[i] = d.Time()
	}
	_, err := t.tx.Exec(ctx, `delete from thaw.air_index_season where station = $1 and kind = $2 and not season_start = any($3)`,
		t.station, string(kind), dates)
	if err != nil {
		return fmt.Errorf("clear seasons of %s: %w", t.station, err)
	}
	return nil
}

func dateOf(d *pipeline.Day) *time.Time {
	if d == nil {
		return nil
	}
	t := d.Time()
	return &t
}
