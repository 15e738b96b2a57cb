package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Withdrawal is what a committed batch makes void of a station's readings.
type Withdrawal struct {
	Batch   int64
	Station string
}

// Withdrawals returns those whose batch is committed for the station.
func (db *DB) Withdrawals(ctx context.Context) ([]Withdrawal, error) {
	rows, err := db.pool.Query(ctx, `select w.batch_id::bigint, w.station from thaw.withdrawals w
		where not exists (select 1 from thaw.batch_parts p where p.batch_id = w.batch_id and p.station = w.station and p.committed_at is null)
		order by w.batch_id, w.station`)
	if err != nil {
		return nil, fmt.Errorf("read withdrawals: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowToStructByPos[Withdrawal])
}

// Withdraw takes back the station's readings that a batch makes void: those of
// the batch that it reads again, and, if it replaces its span, all of its feed in
// that span that came before it. They go to readings_replaced. Where they had
// taken the place of others, the parts that hold those are sent again. It
// returns the days touched, sorted.
func (t *Take) Withdraw(ctx context.Context, st *pipeline.Station, batch int64) ([]pipeline.Day, error) {
	tag, err := t.tx.Exec(ctx, `delete from thaw.withdrawals where batch_id = $1 and station = $2`, batch, t.station)
	if err != nil {
		return nil, fmt.Errorf("take withdrawal of batch %d: %w", batch, err)
	}
	if tag.RowsAffected() == 0 {
		return nil, nil // another worker has done it
	}
	days, err := t.withdrawPredecessor(ctx, st, batch)
	if err != nil {
		return nil, fmt.Errorf("withdraw what batch %d reads again: %w", batch, err)
	}
	more, err := t.withdrawSpan(ctx, st, batch)
	if err != nil {
		return nil, fmt.Errorf("withdraw what batch %d replaces: %w", batch, err)
	}
	return sortedDays(append(days, more...)), nil
}

func (t *Take) withdrawPredecessor(ctx context.Context, st *pipeline.Station, batch int64) ([]pipeline.Day, error) {
	var of *int32
	var from, to *time.Time
	var span bool
	err := t.tx.QueryRow(ctx, `select b.rereads, min(p.first_utc), max(p.last_utc), coalesce(o.replaces_span, false)
		from thaw.batches b left join thaw.batches o on o.batch_id = b.rereads
			left join thaw.batch_parts p on p.batch_id = b.rereads and p.station = $2
		where b.batch_id = $1 group by b.rereads, o.replaces_span`, batch, t.station).Scan(&of, &from, &to, &span)
	if err != nil || of == nil || from == nil {
		return nil, err
	}
	days, err := t.withdrawWhere(ctx, st, batch, *from, *to, `v.batch_id = $5`, *of)
	if err != nil || len(days) == 0 && !span {
		return days, err
	}
	// What had lost against it, or was passed over in its span, may count now.
	_, err = t.tx.Exec(ctx, `update thaw.batch_parts p set committed_at = null, published_at = null, again = true
		from thaw.batches b join thaw.batches n on n.feed_id = b.feed_id
		where p.batch_id = b.batch_id and n.batch_id = $1 and b.batch_id <> $1 and b.state = 'read'
			and b.batch_order < n.batch_order and p.station = $2 and p.first_utc <= $4 and p.last_utc >= $3 and p.committed_at is not null`,
		batch, t.station, *from, *to)
	return days, err
}

func (t *Take) withdrawSpan(ctx context.Context, st *pipeline.Station, batch int64) ([]pipeline.Day, error) {
	var feed int16
	var order int64
	var from, to *time.Time
	var accepted bool
	err := t.tx.QueryRow(ctx, `select b.feed_id, b.batch_order, min(p.first_utc), max(p.last_utc), coalesce(b.decision = 'accepted', false)
		from thaw.batches b left join thaw.batch_parts p on p.batch_id = b.batch_id and p.station = $2
		where b.batch_id = $1 and b.replaces_span group by b.batch_id`, batch, t.station).Scan(&feed, &order, &from, &to, &accepted)
	if err == pgx.ErrNoRows || err == nil && from == nil {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	before, err := t.approved(ctx)
	if err != nil {
		return nil, err
	}
	if !accepted && from.Unix() < before {
		from = new(time.Unix(before, 0)) // approved days are left as they are
	}
	return t.withdrawWhere(ctx, st, batch, *from, *to, `s.feed_id = $5 and
		(select b.batch_order from thaw.batches b where b.batch_id = v.batch_id) < $6`, feed, order)
}

// withdrawWhere moves readings of the station in [from, to] that a condition
// holds for to the replaced ones; in it v is the reading, s its series, and
// arguments are numbered from 5.
func (t *Take) withdrawWhere(ctx context.Context, st *pipeline.Station, by int64, from, to time.Time, condition string, args ...any) ([]pipeline.Day, error) {
	rows, err := t.tx.Query(ctx, `with gone as (
			delete from thaw.reading_values v using thaw.series s
			where s.series_id = v.series_id and s.station = $1 and v.start_utc between $3 and $4 and `+condition+`
			returning v.start_utc, v.value_c, v.series_id, v.batch_id, v.row_no, v.quality),
		kept as (
			insert into thaw.reading_values_replaced (start_utc, value_c, series_id, batch_id, row_no, replaced_by_batch, replaced_by_row, quality)
			select start_utc, value_c, series_id, batch_id, row_no, $2, 0, quality from gone)
		select start_utc from gone order by start_utc`, append([]any{t.station, by, from, to}, args...)...)
	if err != nil {
		return nil, err
	}
	var days []pipeline.Day
	var start time.Time
	_, err = pgx.ForEachRow(rows, []any{&start}, func() error {
		if day := st.DayAt(start); len(days) == 0 || days[len(days)-1] != day {
			days = append(days, day)
		}
		return nil
	})
	return days, err
}

// spanInForce says that a batch replaces all that its feed said of the station
// from its first to its last reading.
type spanInForce struct {
	feedID       int16
	batch        int32
	order        int64
	fromS, lastS int64
}

func (t *Take) spans(ctx context.Context) ([]spanInForce, error) {
	rows, err := t.tx.Query(ctx, `select b.feed_id, b.batch_id, b.batch_order, min(p.first_utc), max(p.last_utc)
		from thaw.batches b join thaw.batch_parts p using (batch_id)
		where b.replaces_span and b.state = 'read' and p.station = $1
		group by b.feed_id, b.batch_id, b.batch_order having min(p.first_utc) is not null`, t.station)
	if err != nil {
		return nil, fmt.Errorf("read spans of %s: %w", t.station, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (spanInForce, error) {
		var s spanInForce
		var from, last time.Time
		err := r.Scan(&s.feedID, &s.batch, &s.order, &from, &last)
		s.fromS, s.lastS = from.Unix(), last.Unix()
		return s, err
	})
	if err != nil {
		return nil, fmt.Errorf("read spans of %s: %w", t.station, err)
	}
	return out, nil
}

// void returns the span that keeps a reading from counting; nil if none does.
func void(spans []spanInForce, feedID int16, r *row) *spanInForce {
	for i := range spans {
		s := &spans[i]
		if s.feedID == feedID && s.order > r.order && s.fromS <= r.startS && r.startS <= s.lastS {
			return s
		}
	}
	return nil
}
