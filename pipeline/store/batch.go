package store

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Arrival is a file as it lies in the archive, before anything is made of it.
type Arrival struct {
	Feed        string
	Name        string
	Hash        string // SHA-256 of the bytes, hex
	Bytes       int64
	FileBytes   int64     // length of the file, where it is more than Bytes
	SourceTime  time.Time // when the source wrote it; never later than now, since it fixes the order
	SeenTime    time.Time // when the source says it wrote it
	ArrivedAt   time.Time // when it was found
	Host        string
	ArchivePath string
	Layout      *pipeline.Layout
	// ReplacesSpan says that the file replaces all that its feed said of each
	// station between the first and the last reading that it has of it.
	ReplacesSpan bool
	// Growth is nil for a file that is read whole.
	Growth *Growth
}

// SeenBytes is the length of the file as it was seen: what has been read of a
// growing file may be less.
func (a *Arrival) SeenBytes() int64 { return max(a.FileBytes, a.Bytes) }

// Growth says where in a growing file an arrival lies.
type Growth struct {
	FromByte    int64 // where it begins
	LinesBefore int64
	Head        int64 // batch with the file's beginning; 0 if this is it
	Lines       int64 // of the file up to the arrival's end
}

// Batch is a line of the ledger.
type Batch struct {
	ID          int64
	Feed        string
	Name        string
	Hash        string
	ArchivePath string
	Layout      *pipeline.Layout
	HeadPath    string // archive of the file's beginning, where this batch is not that
	LinesBefore int64  // of the file
	TakenByHand bool   // a person has asked for it
}

// Seen says what the ledger made of an arrival.
type Seen int

// What an arrival may be to the ledger.
const (
	SeenNew     Seen = iota // a line was opened; read it
	SeenSame                // these bytes are known and nothing has come since under this name
	SeenWaiting             // a return to earlier bytes: a line was opened that waits to be asked for
)

// OpenBatch opens a line of the ledger for an arrival, unless the feed has
// delivered the same bytes before. The batch's order is fixed here, once, under
// a lock per feed: the source time in microseconds, moved on until no other
// batch of the feed has it; arrivals of one look must come sorted by source
// time and name. It also records what was seen under the file's name.
func (db *DB) OpenBatch(ctx context.Context, a Arrival) (*Batch, Seen, error) {
	text, hash, err := canonical(a.Layout)
	if err != nil {
		return nil, SeenSame, err
	}
	batch := &Batch{Feed: a.Feed, Name: a.Name, Hash: a.Hash, ArchivePath: a.ArchivePath, Layout: a.Layout}
	seen := SeenNew
	err = db.within(ctx, func(tx pgx.Tx) error {
		if err := lock(ctx, tx, lockFeed, a.Feed); err != nil {
			return err
		}
		var feedID int16
		if err := tx.QueryRow(ctx, `select feed_id from thaw.feeds where feed = $1`, a.Feed).Scan(&feedID); err != nil {
			return fmt.Errorf("find feed %s: %w", a.Feed, err)
		}
		var lastHash string
		err := tx.QueryRow(ctx, `select content_hash from thaw.batches where feed_id = $1 and name = $2
			order by batch_order desc limit 1`, feedID, a.Name).Scan(&lastHash)
		if err != nil && !errors.Is(err, pgx.ErrNoRows) {
			return fmt.Errorf("find last batch of %s: %w", a.Name, err)
		}
		var known bool
		if err := tx.QueryRow(ctx, `select exists (select 1 from thaw.batches where feed_id = $1 and content_hash = $2)`, feedID, a.Hash).Scan(&known); err != nil {
			return fmt.Errorf("find batch of %s: %w", a.Name, err)
		}
		state, reason := "opened", (*string)(nil)
		switch {
		case known && (lastHash == "" || lastHash == a.Hash):
			seen = SeenSame
		case known:
			seen, state = SeenWaiting, "waiting"
			why := "these bytes came before, and others since under this name; they are not used again until asked for"
			reason = &why
		}
		growth := Growth{}
		if a.Growth != nil {
			growth = *a.Growth
		}
		if seen != SeenSame {
			if _, err := tx.Exec(ctx, `insert into thaw.layouts (layout_hash, layout) values ($1, $2) on conflict do nothing`, hash, text); err != nil {
				return fmt.Errorf("record layout: %w", err)
			}
			// The smallest free number from the source time on.
			err := tx.QueryRow(ctx, `insert into thaw.batches (feed_id, name, content_hash, bytes, batch_order, layout_hash,
					source_time, host, archive_path, state, reason, arrived_at, replaces_span,
					from_byte, lines_before, head_batch)
				select $1, $2, $3, $4, (select min(n) from (
						select $5::bigint as n union all
						select b.batch_order + 1 from thaw.batches b where b.feed_id = $1 and b.batch_order >= $5) c
					where not exists (select 1 from thaw.batches b where b.feed_id = $1 and b.batch_order = c.n)),
					$6, $7, $8, $9, $10, $11, $12, $13, $14, $15, nullif($16::int, 0) returning batch_id`,
				feedID, a.Name, a.Hash, a.Bytes, a.SourceTime.UnixMicro(), hash, a.SourceTime, a.Host, a.ArchivePath, state, reason, a.ArrivedAt, a.ReplacesSpan,
				growth.FromByte, growth.LinesBefore, int32(growth.Head)).Scan(&batch.ID)
			if err != nil {
				return fmt.Errorf("open batch of %s: %w", a.Name, err)
			}
		}
		if growth.Head != 0 {
			if err := tx.QueryRow(ctx, `select archive_path from thaw.batches where batch_id = $1`, growth.Head).Scan(&batch.HeadPath); err != nil {
				return fmt.Errorf("find beginning of %s: %w", a.Name, err)
			}
		} else if a.Growth != nil {
			growth.Head = batch.ID
		}
		batch.LinesBefore = growth.LinesBefore
		return markSeen(ctx, tx, feedID, a, growth)
	})
	return batch, seen, err
}

func markSeen(ctx context.Context, tx pgx.Tx, feedID int16, a Arrival, g Growth) error {
	hash := ""
	if a.Growth != nil {
		hash = a.Hash
	}
	_, err := tx.Exec(ctx, `insert into thaw.feed_files (feed_id, host, name, bytes, source_time, content_hash,
			position, position_hash, position_lines, head_batch)
		values ($1, $2, $3, $4, $5, $6, $7, $8, $9, nullif($10::int, 0)) on conflict (feed_id, host, name) do update
		set bytes = excluded.bytes, source_time = excluded.source_time, content_hash = excluded.content_hash, seen_at = clock_timestamp(),
			position = excluded.position, position_hash = excluded.position_hash, position_lines = excluded.position_lines,
			head_batch = excluded.head_batch`,
		feedID, a.Host, a.Name, a.SeenBytes(), a.SeenTime, a.Hash, g.FromByte+a.Bytes, hash, g.Lines, int32(g.Head))
	if err != nil {
		return fmt.Errorf("record sight of %s: %w", a.Name, err)
	}
	return nil
}

// SawFile records the sight of a growing file of which nothing more can be read
// yet; what is known of it stays.
func (db *DB) SawFile(ctx context.Context, feed, host, name string, bytes int64, seenTime time.Time) error {
	_, err := db.pool.Exec(ctx, `update thaw.feed_files set bytes = $4, source_time = $5, seen_at = clock_timestamp()
		where feed_id = (select feed_id from thaw.feeds where feed = $1) and host = $2 and name = $3`, feed, host, name, bytes, seenTime)
	if err != nil {
		return fmt.Errorf("record sight of %s: %w", name, err)
	}
	return nil
}

// canonical returns the layout's text and hash.
func canonical(l *pipeline.Layout) (text []byte, hash string, err error) {
	text, err = json.Marshal(l) // map keys come sorted
	if err != nil {
		return nil, "", fmt.Errorf("write layout: %w", err)
	}
	sum := sha256.Sum256(text)
	return text, hex.EncodeToString(sum[:]), nil
}

// FileSeen is what was last seen under a name.
type FileSeen struct {
	Bytes      int64
	SourceTime time.Time
	Hash       string

	// Where files grow: how many of its bytes were read, their hash and lines, and
	// the batch that holds its beginning, 0 if none is of use.
	Position     int64
	PositionHash string
	Lines        int64
	Head         int64
}

// FilesSeen returns what this host last saw under each name of a feed.
func (db *DB) FilesSeen(ctx context.Context, feed, host string) (map[string]FileSeen, error) {
	rows, err := db.pool.Query(ctx, `select w.name, w.bytes, w.source_time, w.content_hash, w.position, w.position_hash, w.position_lines,
			case when h.rows_read > 0 then h.batch_id else 0 end::bigint
		from thaw.feed_files w join thaw.feeds f using (feed_id) left join thaw.batches h on h.batch_id = w.head_batch
		where f.feed = $1 and w.host = $2`, feed, host)
	if err != nil {
		return nil, fmt.Errorf("read files seen of %s: %w", feed, err)
	}
	out := map[string]FileSeen{}
	var (
		name string
		f    FileSeen
	)
	_, err = pgx.ForEachRow(rows, []any{&name, &f.Bytes, &f.SourceTime, &f.Hash, &f.Position, &f.PositionHash, &f.Lines, &f.Head}, func() error {
		out[name] = f
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read files seen of %s: %w", feed, err)
	}
	return out, nil
}

// OpenBatches returns the batches of a host that were not read to their end.
func (db *DB) OpenBatches(ctx context.Context, host string) ([]Batch, error) {
	return db.batches(ctx, `b.state = 'opened' and b.host = $1`, host)
}

func (db *DB) batches(ctx context.Context, where string, args ...any) ([]Batch, error) {
	rows, err := db.pool.Query(ctx, `select b.batch_id::bigint, f.feed, b.name, b.content_hash, b.archive_path, l.layout, coalesce(h.archive_path, ''), b.lines_before, b.taken_by_hand
		from thaw.batches b join thaw.feeds f using (feed_id) join thaw.layouts l using (layout_hash)
			left join thaw.batches h on h.batch_id = b.head_batch
		where `+where+` order by b.batch_id`, args...)
	if err != nil {
		return nil, fmt.Errorf("read batches: %w", err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (Batch, error) {
		b := Batch{Layout: &pipeline.Layout{}}
		return b, r.Scan(&b.ID, &b.Feed, &b.Name, &b.Hash, &b.ArchivePath, b.Layout, &b.HeadPath, &b.LinesBefore, &b.TakenByHand)
	})
	if err != nil {
		return nil, fmt.Errorf("read batches: %w", err)
	}
	return out, nil
}

// HoldBatch records that nothing of a batch is used, and why. What was counted
// and set aside before that is kept for looking at.
func (db *DB) HoldBatch(ctx context.Context, id int64, reason string, c pipeline.Counts) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		return closeBatch(ctx, tx, id, "held_back", &reason, c, 0)
	})
}

// ReopenHeld opens the batches of a feed again that were held back under another
// layout than the one given, which they are to be read by now, and returns how
// many. Nothing of a batch that is held back was used, so nothing has to be
// taken back.
func (db *DB) ReopenHeld(ctx context.Context, host, feed string, layout *pipeline.Layout) (int, error) {
	text, hash, err := canonical(layout)
	if err != nil {
		return 0, err
	}
	var n int
	err = db.within(ctx, func(tx pgx.Tx) error {
		if err := lock(ctx, tx, lockFeed, feed); err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, `insert into thaw.layouts (layout_hash, layout) values ($1, $2) on conflict do nothing`, hash, text); err != nil {
			return err
		}
		tag, err := tx.Exec(ctx, `update thaw.batches b set state = 'opened', reason = null, layout_hash = $3
			from thaw.feeds f where f.feed_id = b.feed_id and f.feed = $1 and b.host = $2 and b.state = 'held_back' and b.layout_hash <> $3`,
			feed, host, hash)
		n = int(tag.RowsAffected())
		return err
	})
	if err != nil {
		return 0, fmt.Errorf("open batches of %s again: %w", feed, err)
	}
	return n, nil
}

// closeBatch writes what a batch counted.
func closeBatch(ctx context.Context, tx pgx.Tx, id int64, state string, reason *string, c pipeline.Counts, parts int) error {
	_, err := tx.Exec(ctx, `update thaw.batches set state = $2, reason = $3, read_at = clock_timestamp(),
			lines = $4, lines_header = $5, lines_blank = $6, lines_comment = $7,
			rows = $8, rows_read = $9, rows_without_value = $10, rows_set_aside = $11,
			cells = $12, cells_read = $13, cells_missing = $14, cells_set_aside = $15, parts = $16
		where batch_id = $1 and state = 'opened'`,
		id, state, reason, c.Lines, c.Header, c.Blank, c.Comments, c.Rows, c.RowsRead, c.RowsWithoutValue, c.RowsSetAside,
		c.Cells, c.CellsRead, c.CellsMissing, c.CellsSetAside, parts)
	if err != nil {
		return fmt.Errorf("close batch %d: %w", id, err)
	}
	return nil
}
