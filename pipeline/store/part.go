package store

import (
	"context"
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// PartLine is a part as the ledger keeps it.
type PartLine struct {
	Number   int32
	Station  string
	Readings int
	// FirstS and LastS are the starts of its earliest and latest reading, s since
	// 1970-01-01T00:00:00Z.
	FirstS, LastS int64
}

// ClearBatch forgets what an earlier, broken-off reading of an open batch set
// aside, so that it can be read from the start.
func (db *DB) ClearBatch(ctx context.Context, id int64) error {
	_, err := db.pool.Exec(ctx, `delete from thaw.set_aside where batch_id = $1`, id)
	if err != nil {
		return fmt.Errorf("clear batch %d: %w", id, err)
	}
	return nil
}

// AddSetAside keeps rows of an open batch that could not be read.
func (db *DB) AddSetAside(ctx context.Context, id int64, rows []pipeline.SetAside) error {
	_, err := db.pool.CopyFrom(ctx, pgx.Identifier{"thaw", "set_aside"},
		[]string{"batch_id", "line", "column_no", "row_no", "column_name", "code", "reason", "raw"},
		pgx.CopyFromSlice(len(rows), func(i int) ([]any, error) {
			r := rows[i]
			return []any{int32(id), r.Line, int32(r.Column), r.Row, storable(r.Name), string(r.Code), storable(r.Text), storable(r.Raw)}, nil
		}))
	if err != nil {
		return fmt.Errorf("keep set-aside rows of batch %d: %w", id, err)
	}
	return nil
}

// storable writes bytes that a text column refuses (NUL, broken UTF-8) as \xNN.
func storable(s string) string {
	if strings.ToValidUTF8(s, "") == s && !strings.ContainsRune(s, 0) {
		return s
	}
	var b strings.Builder
	for i, r := range s {
		if r == 0 || r == '\uFFFD' && !strings.HasPrefix(s[i:], "\uFFFD") {
			fmt.Fprintf(&b, `\x%02X`, s[i])
			continue
		}
		b.WriteRune(r)
	}
	return b.String()
}

// ReadBatch records what an open batch counted and the parts it will be sent
// in, in one transaction. Nothing may be published before.
func (db *DB) ReadBatch(ctx context.Context, id int64, c pipeline.Counts, parts []PartLine) error {
	if err := c.Check(); err != nil {
		return fmt.Errorf("batch %d does not add up: %w", id, err)
	}
	return db.within(ctx, func(tx pgx.Tx) error {
		_, err := tx.CopyFrom(ctx, pgx.Identifier{"thaw", "batch_parts"}, []string{"batch_id", "part", "station", "readings", "first_utc", "last_utc"},
			pgx.CopyFromSlice(len(parts), func(i int) ([]any, error) {
				p := &parts[i]
				return []any{int32(id), p.Number, p.Station, int32(p.Readings), time.Unix(p.FirstS, 0), time.Unix(p.LastS, 0)}, nil
			}))
		if err != nil {
			return fmt.Errorf("record parts of batch %d: %w", id, err)
		}
		if err := closeBatch(ctx, tx, id, "read", nil, c, len(parts)); err != nil {
			return err
		}
		return takeOver(ctx, tx, id)
	})
}

// Attempts says which parts of a batch are to be published, and as which
// attempt.
type Attempts map[int32]int32

// MarkPublished records that the bus has confirmed parts.
func (db *DB) MarkPublished(ctx context.Context, id int64, parts []int32) error {
	_, err := db.pool.Exec(ctx, `update thaw.batch_parts set published_at = clock_timestamp(), confirmed = confirmed + 1
		where batch_id = $1 and part = any($2)`, id, parts)
	if err != nil {
		return fmt.Errorf("record published parts of batch %d: %w", id, err)
	}
	return nil
}

// open is what a part has to be for anything still to happen to it.
const open = `p.committed_at is null and p.stuck_at is null`

// UnpublishedBatches returns the host's batches with parts that the bus never
// confirmed, as after a crash.
func (db *DB) UnpublishedBatches(ctx context.Context, host string) ([]Batch, error) {
	return db.batches(ctx, `b.state = 'read' and b.host = $1 and exists (select 1 from thaw.batch_parts p
		where p.batch_id = b.batch_id and p.published_at is null and `+open+`)`, host)
}

// OverdueBatches returns the host's batches with parts that the bus confirmed
// at least age ago, by the database's clock, and that nobody has committed since.
func (db *DB) OverdueBatches(ctx context.Context, host string, age time.Duration) ([]Batch, error) {
	return db.batches(ctx, `b.state = 'read' and b.host = $1 and exists (select 1 from thaw.batch_parts p
		where p.batch_id = b.batch_id and p.published_at <= clock_timestamp() - $2::interval and `+open+`)`, host, age)
}

// Unconfirmed is the age that only parts have which the bus never confirmed.
const Unconfirmed = time.Duration(math.MaxInt64)

// NextAttempt counts one more attempt for the open parts of a batch that the bus
// never confirmed, or confirmed at least age ago, and returns them. A part that
// the bus has confirmed, and lost, as often as is allowed is marked stuck instead.
func (db *DB) NextAttempt(ctx context.Context, id int64, age time.Duration, allowed int) (Attempts, error) {
	out := Attempts{}
	err := db.within(ctx, func(tx pgx.Tx) error {
		_, err := tx.Exec(ctx, `update thaw.batch_parts p set stuck_at = clock_timestamp(),
				reason = format('published %s times and never committed', confirmed)
			where batch_id = $1 and published_at <= clock_timestamp() - $2::interval and confirmed >= $3 and `+open, id, age, allowed)
		if err != nil {
			return err
		}
		rows, err := tx.Query(ctx, `update thaw.batch_parts p set attempt = attempt + 1, published_at = null
			where batch_id = $1 and (published_at is null or published_at <= clock_timestamp() - $2::interval) and `+open+`
			returning part, attempt`, id, age)
		if err != nil {
			return err
		}
		var part int32
		var attempt int16
		_, err = pgx.ForEachRow(rows, []any{&part, &attempt}, func() error {
			out[part] = int32(attempt)
			return nil
		})
		return err
	})
	if err != nil {
		return nil, fmt.Errorf("count attempt of batch %d: %w", id, err)
	}
	return out, nil
}

// FailPart counts a failure of committing a part and marks it stuck when it has
// had as many as are allowed. It says whether the part is stuck.
func (db *DB) FailPart(ctx context.Context, batch int64, part int32, reason string, allowed int) (stuck bool, err error) {
	err = db.pool.QueryRow(ctx, `update thaw.batch_parts p set failures = failures + 1, reason = $3,
			stuck_at = case when failures + 1 >= $4 then clock_timestamp() end
		where batch_id = $1 and part = $2 and `+open+` returning stuck_at is not null`,
		batch, part, storable(reason), allowed).Scan(&stuck)
	if err == pgx.ErrNoRows {
		return true, nil // committed or stuck already, or of no ledger: nothing more is to be done with it
	}
	if err != nil {
		return false, fmt.Errorf("record failure of part %d/%d: %w", batch, part, err)
	}
	return stuck, nil
}

// Pending is what still has to happen before everything has settled.
type Pending struct {
	OpenBatches int // not read to their end
	OpenParts   int // not committed, not stuck
	Recomputes  int // stations to be made anew, or their outlooks
	Withdrawals int // readings to be withdrawn, by batch and station
	Changes     int // stations to be judged
	Unannounced int // changes to be told

	HeldBack   int // batches held back
	StuckParts int // parts given up
}

// Idle says whether nothing is left to do.
func (p Pending) Idle() bool {
	return p.OpenBatches == 0 && p.OpenParts == 0 && p.Recomputes == 0 && p.Withdrawals == 0 && p.Changes == 0 && p.Unannounced == 0
}

// Pending counts what is left to do, in one statement and so at one moment.
func (db *DB) Pending(ctx context.Context) (Pending, error) {
	var p Pending
	err := db.pool.QueryRow(ctx, `select
		(select count(*) from thaw.batches where state = 'opened'),
		(select count(*) from thaw.batch_parts p where `+open+`),
		(select count(*) from thaw.stations where recompute or reindex or refill or outlook_wanted > outlook_made),
		(select count(*) from thaw.withdrawals),
		(select count(*) from thaw.changes),
		(select count(*) from thaw.standing_changes where announce and announced_at is null),
		(select count(*) from thaw.batches where state = 'held_back'),
		(select count(*) from thaw.batch_parts p join thaw.batches b using (batch_id) where p.stuck_at is not null and b.state = 'read')`).
		Scan(&p.OpenBatches, &p.OpenParts, &p.Recomputes, &p.Withdrawals, &p.Changes, &p.Unannounced, &p.HeldBack, &p.StuckParts)
	if err != nil {
		return p, fmt.Errorf("count what is pending: %w", err)
	}
	return p, nil
}
