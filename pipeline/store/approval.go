package store

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Approve records that a person answers for a station's record through a day,
// which is over at the instant given.
func (db *DB) Approve(ctx context.Context, station string, through pipeline.Day, over time.Time, by, note string) error {
	tag, err := db.pool.Exec(ctx, `insert into thaw.approvals (station, through_day, through_utc, approved_by, note)
		select station, $2, $3, $4, $5 from thaw.stations where station = $1`, station, through.Time(), over, by, note)
	if err == nil && tag.RowsAffected() == 0 {
		err = fmt.Errorf("there is no station %q", station)
	}
	if err != nil {
		return fmt.Errorf("record approval: %w", err)
	}
	return nil
}

// WithdrawApprovals takes back a station's approvals past a day, so that its
// later days are provisional again.
func (db *DB) WithdrawApprovals(ctx context.Context, station string, after pipeline.Day, by, reason string) error {
	tag, err := db.pool.Exec(ctx, `update thaw.approvals set withdrawn_at = clock_timestamp(), withdrawn_by = $3, withdraw_reason = $4
		where station = $1 and through_day > $2 and withdrawn_at is null`, station, after.Time(), by, reason)
	if err == nil && tag.RowsAffected() == 0 {
		err = fmt.Errorf("station %s has no approval past %s", station, after)
	}
	if err != nil {
		return fmt.Errorf("withdraw approval: %w", err)
	}
	return nil
}

// approved returns the instant before which the station's record is approved, s
// since 1970-01-01T00:00:00Z.
func (t *Take) approved(ctx context.Context) (beforeS int64, err error) {
	var over *time.Time
	err = t.tx.QueryRow(ctx, `select max(through_utc) from thaw.approvals where station = $1 and withdrawn_at is null`, t.station).Scan(&over)
	if err != nil {
		return 0, fmt.Errorf("read approvals of %s: %w", t.station, err)
	}
	if over == nil {
		return math.MinInt64, nil
	}
	return over.Unix(), nil
}

// guard says which rows may not change the record without a decision: those of
// approved days whose batch was not accepted.
type guard struct {
	beforeS int64
	states  []PartState
}

func (g *guard) keeps(r *row) bool { return r.startS < g.beforeS && !g.states[r.part].Accepted }

func (t *Take) keepWaiting(ctx context.Context, v verdict) error {
	batch := &pgx.Batch{}
	for _, r := range v.waiting {
		batch.Queue(`insert into thaw.corrections (series_id, start_utc, value_c, quality, batch_id, row_no) values ($1, $2, $3, $4, $5, $6)
			on conflict do nothing`, r.series, time.Unix(r.startS, 0), r.valueC, int16(r.quality), r.batch, r.number)
	}
	if err := t.tx.SendBatch(ctx, batch).Close(); err != nil {
		return fmt.Errorf("keep corrections of %s: %w", t.station, err)
	}
	return nil
}

// Decide accepts or rejects a batch's readings that would change approved days.
// Accepted ones are sent once more and count then; rejected ones go to the
// history.
func (db *DB) Decide(ctx context.Context, batch int64, accept bool, by, reason string) (readings int64, err error) {
	decision := "rejected"
	if accept {
		decision = "accepted"
	}
	err = db.within(ctx, func(tx pgx.Tx) error {
		var feed string
		err := tx.QueryRow(ctx, `select f.feed from thaw.batches b join thaw.feeds f using (feed_id) where batch_id = $1`, batch).Scan(&feed)
		if errors.Is(err, pgx.ErrNoRows) {
			return fmt.Errorf("there is no batch %d", batch)
		}
		if err != nil {
			return err
		}
		if err := lock(ctx, tx, lockFeed, feed); err != nil {
			return err
		}
		if err := tx.QueryRow(ctx, `select count(*) from thaw.corrections where batch_id = $1`, batch).Scan(&readings); err != nil {
			return err
		}
		if readings == 0 {
			return fmt.Errorf("batch %d has no readings that wait for a decision", batch)
		}
		_, err = tx.Exec(ctx, `update thaw.batches set decision = $2, decided_by = $3, decision_reason = $4, decided_at = clock_timestamp()
			where batch_id = $1`, batch, decision, by, reason)
		if err != nil {
			return err
		}
		return afterDecision(ctx, tx, batch, accept)
	})
	if err != nil {
		return 0, fmt.Errorf("decide on batch %d: %w", batch, err)
	}
	return readings, nil
}

func afterDecision(ctx context.Context, tx pgx.Tx, batch int64, accept bool) error {
	steps := []string{
		`insert into thaw.reading_values_replaced (start_utc, value_c, series_id, batch_id, row_no, replaced_by_batch, replaced_by_row, quality)
			select c.start_utc, c.value_c, c.series_id, c.batch_id, c.row_no, coalesce(v.batch_id, c.batch_id), coalesce(v.row_no, 0), c.quality
			from thaw.corrections c left join thaw.reading_values v using (series_id, start_utc) where c.batch_id = $1`,
		`delete from thaw.corrections where batch_id = $1`,
	}
	if accept {
		steps = []string{
			`update thaw.batch_parts set committed_at = null, published_at = null, again = true where batch_id = $1 and station in
				(select s.station from thaw.corrections c join thaw.series s using (series_id) where c.batch_id = $1)`,
			`insert into thaw.withdrawals (batch_id, station)
				select distinct b.batch_id, s.station from thaw.corrections c join thaw.series s using (series_id) join thaw.batches b using (batch_id)
				where c.batch_id = $1 and b.replaces_span on conflict do nothing`,
			`delete from thaw.corrections where batch_id = $1`,
		}
	}
	for _, sql := range steps {
		if _, err := tx.Exec(ctx, sql, batch); err != nil {
			return err
		}
	}
	return nil
}

// Approved is how far a station's record is approved, and what waits there.
type Approved struct {
	Station    string
	ThroughDay *time.Time // nil if nothing is approved
	ApprovedBy *string
	Note       *string
	RecordedAt *time.Time
}

// Approvals returns how far each station's record is approved.
func (db *DB) Approvals(ctx context.Context) ([]Approved, error) {
	rows, err := db.pool.Query(ctx, `select distinct on (s.station) s.station, a.through_day, a.approved_by, a.note, a.recorded_at
		from thaw.stations s left join thaw.approvals a on a.station = s.station and a.withdrawn_at is null
		order by s.station, a.through_day desc, a.approval_id desc`)
	if err != nil {
		return nil, fmt.Errorf("read approvals: %w", err)
	}
	return collect[Approved](rows, "approvals")
}

// WaitingSum counts a batch's readings of a station that wait for a decision.
type WaitingSum struct {
	BatchID  int32
	Name     string
	Station  string
	Readings int64
	FirstUTC time.Time
	LastUTC  time.Time
}

// Waiting returns what waits for a decision, oldest first.
func (db *DB) Waiting(ctx context.Context) ([]WaitingSum, error) {
	rows, err := db.pool.Query(ctx, `select c.batch_id, b.name, s.station, count(*) as readings, min(c.start_utc) as first_utc, max(c.start_utc) as last_utc
		from thaw.corrections c join thaw.series s using (series_id) join thaw.batches b on b.batch_id = c.batch_id
		group by c.batch_id, b.name, s.station order by c.batch_id, s.station`)
	if err != nil {
		return nil, fmt.Errorf("read corrections: %w", err)
	}
	return collect[WaitingSum](rows, "corrections")
}
