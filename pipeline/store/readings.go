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

// seriesKey is a series of this station by its natural key.
type seriesKey struct {
	feedID int16
	pipeline.Series
}

// row is a reading on its way into the table.
type row struct {
	series  int32
	batch   int32
	number  int32
	part    int32 // place in the parts that are being taken; -1 for one that is in the table
	startS  int64
	order   int64
	valueC  float64
	quality pipeline.Quality
}

// before says that a loses against b: within a feed the highest (order, row)
// wins whatever the sequence of arrival.
func (a *row) before(b *row) bool {
	return a.order < b.order || a.order == b.order && a.number < b.number
}

// WriteReadings brings the readings of parts into the table and returns what
// became of each part and the station's days whose readings changed, sorted.
// Of equal keys the highest order, then row, stays; what loses its place, or
// never had it, goes to readings_replaced if its value differs.
func (t *Take) WriteReadings(ctx context.Context, st *pipeline.Station, parts []*pipeline.Part, states []PartState) ([]Fate, []pipeline.Day, error) {
	ids, err := t.seriesIDs(ctx, parts, states)
	if err != nil {
		return nil, nil, err
	}
	rows := gather(parts, states, ids)
	fates := make([]Fate, len(parts))
	if len(rows) == 0 {
		return fates, nil, nil
	}
	spans, err := t.spans(ctx)
	if err != nil {
		return nil, nil, err
	}
	var v verdict
	rows = v.passOver(rows, spans, states, fates)
	if len(rows) == 0 {
		return fates, nil, t.keepReplaced(ctx, v)
	}
	there, err := t.existing(ctx, rows)
	if err != nil {
		return nil, nil, err
	}
	before, err := t.approved(ctx)
	if err != nil {
		return nil, nil, err
	}
	v.decide(rows, there, fates, &guard{before, states})
	t.remember(ids, v, len(there) == 0)
	for _, step := range []func(context.Context, verdict) error{t.copyNew, t.updateChanged, t.keepReplaced, t.keepWaiting} {
		if err := step(ctx, v); err != nil {
			return nil, nil, err
		}
	}
	days := make([]pipeline.Day, 0, len(v.fresh)+len(v.changed))
	touch := func(r *row) {
		day := st.DayAt(time.Unix(r.startS, 0))
		if n := len(days); n == 0 || days[n-1] != day {
			days = append(days, day)
		}
	}
	for i := range v.fresh {
		if v.fresh[i].quality != pipeline.QualityWrong { // nothing follows from what is never used
			touch(&v.fresh[i])
		}
	}
	for i := range v.changed {
		if v.changed[i].quality != pipeline.QualityWrong || there[key{v.changed[i].series, v.changed[i].startS}].quality != pipeline.QualityWrong {
			touch(&v.changed[i])
		}
	}
	return fates, sortedDays(days), nil
}

func sortedDays(days []pipeline.Day) []pipeline.Day {
	slices.Sort(days)
	return slices.Compact(days)
}

// seriesIDs returns the numbers of the series that the parts name, making
// those that are missing.
func (t *Take) seriesIDs(ctx context.Context, parts []*pipeline.Part, states []PartState) (map[seriesKey]int32, error) {
	ids := map[seriesKey]int32{}
	read := func() error {
		rows, err := t.tx.Query(ctx, `select series_id, feed_id, sensor, variable, level_m, span_s from thaw.series where station = $1`, t.station)
		if err != nil {
			return fmt.Errorf("read series of %s: %w", t.station, err)
		}
		var (
			id int32
			v  int16
			k  seriesKey
		)
		_, err = pgx.ForEachRow(rows, []any{&id, &k.feedID, &k.Sensor, &v, &k.LevelM, &k.SpanS}, func() error {
			k.Variable = pipeline.Variable(v)
			ids[k] = id
			return nil
		})
		if err != nil {
			return fmt.Errorf("read series of %s: %w", t.station, err)
		}
		return nil
	}
	if err := read(); err != nil {
		return nil, err
	}
	made := false
	for i, p := range parts {
		for _, s := range p.Series {
			k := seriesKey{states[i].FeedID, s}
			if _, ok := ids[k]; ok {
				continue
			}
			_, err := t.tx.Exec(ctx, `insert into thaw.series (station, feed_id, sensor, variable, level_m, span_s)
				values ($1, $2, $3, $4, $5, $6)`, t.station, k.feedID, k.Sensor, int16(k.Variable), k.LevelM, k.SpanS)
			if err != nil {
				return nil, fmt.Errorf("make series of %s: %w", t.station, err)
			}
			ids[k], made = 0, true
		}
	}
	if !made {
		return ids, nil
	}
	return ids, read()
}

// ahead is how far after its batch's arrival a reading may be dated: clocks and
// zones may be a day or so out, and a year typed wrongly is further.
const ahead = 48 * time.Hour

// earliestS is 1 January 1700: no series of thermometer readings is older by much.
const earliestS = -8520336000

// gather lays the readings of all parts out as rows, sorted by key and then by
// rank, the winner of a key last. A reading that is dated in the future, or
// before there were thermometers, is marked wrong: it is kept, and never used.
func gather(parts []*pipeline.Part, states []PartState, ids map[seriesKey]int32) []row {
	n := 0
	for _, p := range parts {
		n += len(p.Readings)
	}
	rows := make([]row, 0, n)
	for i, p := range parts {
		series := make([]int32, len(p.Series))
		for j, s := range p.Series {
			series[j] = ids[seriesKey{states[i].FeedID, s}]
		}
		latest := states[i].ArrivedAt.Add(ahead).Unix()
		for _, r := range p.Readings {
			if r.StartS > latest || r.StartS < earliestS {
				r.Quality = pipeline.QualityWrong
			}
			rows = append(rows, row{series: series[r.Series], batch: int32(p.Batch), number: r.Row, part: int32(i),
				startS: r.StartS, order: states[i].Order, valueC: r.ValueC, quality: r.Quality})
		}
	}
	slices.SortFunc(rows, func(a, b row) int {
		return cmp.Or(cmp.Compare(a.series, b.series), cmp.Compare(a.startS, b.startS),
			cmp.Compare(a.order, b.order), cmp.Compare(a.number, b.number))
	})
	return rows
}

type key struct {
	series int32
	startS int64
}

// existing returns what the table holds of the series and span of time of rows.
func (t *Take) existing(ctx context.Context, rows []row) (map[key]row, error) {
	from, to := rows[0].startS, rows[0].startS
	var series []int32
	for i := range rows {
		from, to = min(from, rows[i].startS), max(to, rows[i].startS)
		if n := len(series); n == 0 || series[n-1] != rows[i].series {
			series = append(series, rows[i].series)
		}
	}
	found, err := t.tx.Query(ctx, `select v.series_id, v.start_utc, v.value_c, v.quality, v.batch_id, v.row_no, b.batch_order
		from thaw.reading_values v join thaw.batches b using (batch_id)
		where v.series_id = any($1) and v.start_utc between $2 and $3`, series, time.Unix(from, 0), time.Unix(to, 0))
	if err != nil {
		return nil, fmt.Errorf("read readings of %s: %w", t.station, err)
	}
	there := map[key]row{}
	var start time.Time
	var quality int16
	r := row{part: -1}
	_, err = pgx.ForEachRow(found, []any{&r.series, &start, &r.valueC, &quality, &r.batch, &r.number, &r.order}, func() error {
		r.startS, r.quality = start.Unix(), pipeline.Quality(quality)
		there[key{r.series, r.startS}] = r
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read readings of %s: %w", t.station, err)
	}
	return there, nil
}

func (t *Take) copyNew(ctx context.Context, v verdict) error {
	if len(v.fresh) == 0 {
		return nil
	}
	_, err := t.tx.CopyFrom(ctx, pgx.Identifier{"thaw", "reading_values"},
		[]string{"start_utc", "value_c", "series_id", "batch_id", "row_no", "quality"},
		pgx.CopyFromSlice(len(v.fresh), func(i int) ([]any, error) {
			r := &v.fresh[i]
			return []any{time.Unix(r.startS, 0), r.valueC, r.series, r.batch, r.number, int16(r.quality)}, nil
		}))
	if err != nil {
		return fmt.Errorf("write readings of %s: %w", t.station, err)
	}
	return nil
}

func (t *Take) updateChanged(ctx context.Context, v verdict) error {
	all := slices.Concat(v.changed, v.moved)
	if len(all) == 0 {
		return nil
	}
	var (
		n       = len(all)
		series  = make([]int32, n)
		starts  = make([]time.Time, n)
		values  = make([]float64, n)
		marks   = make([]int16, n)
		batches = make([]int32, n)
		numbers = make([]int32, n)
	)
	from, to := all[0].startS, all[0].startS
	for i, r := range all {
		series[i], starts[i], values[i], marks[i], batches[i], numbers[i] = r.series, time.Unix(r.startS, 0), r.valueC, int16(r.quality), r.batch, r.number
		from, to = min(from, r.startS), max(to, r.startS)
	}
	// The span of time is said again so that parts of the table outside it are
	// not looked at.
	_, err := t.tx.Exec(ctx, `update thaw.reading_values v set value_c = u.value_c, quality = u.quality, batch_id = u.batch_id, row_no = u.row_no
		from unnest($1::int[], $2::timestamptz[], $3::float8[], $4::int2[], $5::int[], $6::int[])
			u (series_id, start_utc, value_c, quality, batch_id, row_no)
		where v.series_id = u.series_id and v.start_utc = u.start_utc and v.start_utc between $7 and $8`,
		series, starts, values, marks, batches, numbers, time.Unix(from, 0), time.Unix(to, 0))
	if err != nil {
		return fmt.Errorf("replace readings of %s: %w", t.station, err)
	}
	return nil
}

func (t *Take) keepReplaced(ctx context.Context, v verdict) error {
	if len(v.replaced) == 0 {
		return nil
	}
	_, err := t.tx.CopyFrom(ctx, pgx.Identifier{"thaw", "reading_values_replaced"},
		[]string{"start_utc", "value_c", "series_id", "batch_id", "row_no", "replaced_by_batch", "replaced_by_row", "quality"},
		pgx.CopyFromSlice(len(v.replaced), func(i int) ([]any, error) {
			l, w := &v.replaced[i].lost, &v.replaced[i].winner
			return []any{time.Unix(l.startS, 0), l.valueC, l.series, l.batch, l.number, w.batch, w.number, int16(l.quality)}, nil
		}))
	if err != nil {
		return fmt.Errorf("keep replaced readings of %s: %w", t.station, err)
	}
	return nil
}
