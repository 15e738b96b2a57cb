package store

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"slices"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// Rereading is a batch that is to be read again.
type Rereading struct {
	Batch int64  // the new line of the ledger
	Of    int64  // the batch that it reads again
	Name  string // of the file
}

// Reread opens a new line of the ledger for each batch of a feed that the given
// layout may read otherwise than it was read: of those in only, or of all if
// only is empty. The old readings stay in force until the new line is read.
//
// It fails, and opens none, if a batch in only is not of the feed or not read,
// or if one that is to be read again is still on its way.
func (db *DB) Reread(ctx context.Context, feed string, only []int64, layout *pipeline.Layout, replacesSpan bool) ([]Rereading, error) {
	var out []Rereading
	err := db.within(ctx, func(tx pgx.Tx) error {
		if err := lock(ctx, tx, lockFeed, feed); err != nil {
			return err
		}
		candidates, err := rereadable(ctx, tx, feed)
		if err != nil {
			return err
		}
		for _, id := range only {
			if !slices.ContainsFunc(candidates, func(c rereadCandidate) bool { return c.ID == id }) {
				return fmt.Errorf("batch %d is not a batch of feed %s that was read", id, feed)
			}
		}
		text, hash, err := canonical(layout)
		if err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, `insert into thaw.layouts (layout_hash, layout) values ($1, $2) on conflict do nothing`, hash, text); err != nil {
			return fmt.Errorf("record layout: %w", err)
		}
		for _, c := range candidates {
			if len(only) > 0 && !slices.Contains(only, c.ID) {
				continue
			}
			if c.ReplacesSpan == replacesSpan {
				same, err := readsSame(&c, layout)
				if err != nil {
					return err
				}
				if same {
					continue
				}
			}
			if c.OpenParts > 0 {
				return fmt.Errorf("batch %d (%s) is still on its way; ask again once it is done", c.ID, c.Name)
			}
			r := Rereading{Of: c.ID, Name: c.Name}
			err := tx.QueryRow(ctx, `insert into thaw.batches (feed_id, name, content_hash, bytes, batch_order, layout_hash,
					source_time, arrived_at, host, archive_path, state, rereads, replaces_span, from_byte, lines_before, head_batch)
				select feed_id, name, content_hash, bytes, `+lowOrder+`, $2, source_time, arrived_at, host, archive_path, 'opened', batch_id, $3,
					from_byte, lines_before, head_batch
				from thaw.batches b where batch_id = $1 returning batch_id`, c.ID, hash, replacesSpan).Scan(&r.Batch)
			if err != nil {
				return fmt.Errorf("open batch %d again: %w", c.ID, err)
			}
			out = append(out, r)
		}
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("reread feed %s: %w", feed, err)
	}
	return out, nil
}

// lowOrder is an order below all that the feed of batch b has; a batch with it
// loses against every other.
const lowOrder = `(select least(min(o.batch_order), 0) - 1 from thaw.batches o where o.feed_id = b.feed_id)`

type rereadCandidate struct {
	ID           int64
	Name         string
	Stations     []string
	Layout       *pipeline.Layout
	Strangers    bool // rows were set aside as of an unknown station
	OpenParts    int
	ReplacesSpan bool
}

// rereadable returns the batches of a feed that were read and are not already
// being read again.
func rereadable(ctx context.Context, tx pgx.Tx, feed string) ([]rereadCandidate, error) {
	rows, err := tx.Query(ctx, `select b.batch_id::bigint, b.name, l.layout, b.replaces_span,
			coalesce((select array_agg(distinct station) from thaw.batch_parts p where p.batch_id = b.batch_id), '{}'),
			exists (select 1 from thaw.set_aside a where a.batch_id = b.batch_id and a.code = $2),
			(select count(*) from thaw.batch_parts p where p.batch_id = b.batch_id and `+open+`)
		from thaw.batches b join thaw.feeds f using (feed_id) join thaw.layouts l using (layout_hash)
		where f.feed = $1 and b.state = 'read'
			and not exists (select 1 from thaw.batches r where r.rereads = b.batch_id and r.state = 'opened')
		order by b.batch_order`, feed, string(pipeline.UnknownStation))
	if err != nil {
		return nil, fmt.Errorf("read batches: %w", err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (rereadCandidate, error) {
		c := rereadCandidate{Layout: &pipeline.Layout{}}
		return c, r.Scan(&c.ID, &c.Name, c.Layout, &c.ReplacesSpan, &c.Stations, &c.Strangers, &c.OpenParts)
	})
	if err != nil {
		return nil, fmt.Errorf("read batches: %w", err)
	}
	return out, nil
}

// readsSame says whether a batch would be read as it was: by the same layout but
// for stations that it has no rows of.
func readsSame(c *rereadCandidate, layout *pipeline.Layout) (bool, error) {
	narrow := func(l *pipeline.Layout) ([]byte, error) {
		n := *l
		n.Name, n.Station.Clocks = "", map[string]pipeline.StationClock{}
		for id, clock := range l.Station.Clocks {
			if c.Strangers || slices.Contains(c.Stations, id) {
				n.Station.Clocks[id] = clock
			}
		}
		return json.Marshal(n)
	}
	was, err := narrow(c.Layout)
	is, err2 := narrow(layout)
	return bytes.Equal(was, is), errors.Join(err, err2)
}

// takeOver gives a batch that was opened by Reread the place of the one that it
// reads again. Batches that make readings void get their withdrawals.
func takeOver(ctx context.Context, tx pgx.Tx, id int64) error {
	var of *int32
	var feed string
	var order int64
	var span bool
	err := tx.QueryRow(ctx, `select b.rereads, f.feed, coalesce(o.batch_order, 0), b.replaces_span
		from thaw.batches b join thaw.feeds f using (feed_id) left join thaw.batches o on o.batch_id = b.rereads
		where b.batch_id = $1`, id).Scan(&of, &feed, &order, &span)
	if err != nil {
		return fmt.Errorf("look up batch %d: %w", id, err)
	}
	if of != nil {
		if err := lock(ctx, tx, lockFeed, feed); err != nil {
			return err
		}
		if _, err := tx.Exec(ctx, `update thaw.batches b set state = 'reread', batch_order = `+lowOrder+` where batch_id = $1`, *of); err != nil {
			return fmt.Errorf("retire batch %d: %w", *of, err)
		}
		if _, err := tx.Exec(ctx, `update thaw.batches set batch_order = $2 where batch_id = $1`, id, order); err != nil {
			return fmt.Errorf("order batch %d: %w", id, err)
		}
	}
	if of == nil && !span {
		return nil
	}
	_, err = tx.Exec(ctx, `insert into thaw.withdrawals (batch_id, station)
		select distinct $1::int, station from thaw.batch_parts where batch_id = $1 or batch_id = $2`, id, of)
	if err != nil {
		return fmt.Errorf("ask for withdrawals of batch %d: %w", id, err)
	}
	return nil
}

// TakeByHand opens a batch that waits because its bytes came before, or that was
// held back. The first gets the highest order of its feed: whoever asks for it
// wants it to count.
func (db *DB) TakeByHand(ctx context.Context, id int64) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		var feed, state string
		err := tx.QueryRow(ctx, `select f.feed, b.state from thaw.batches b join thaw.feeds f using (feed_id) where batch_id = $1`, id).Scan(&feed, &state)
		if errors.Is(err, pgx.ErrNoRows) || err == nil && state != "waiting" && state != "held_back" {
			return fmt.Errorf("there is no batch %d that waits or is held back", id)
		}
		if err != nil {
			return fmt.Errorf("look up batch %d: %w", id, err)
		}
		if err := lock(ctx, tx, lockFeed, feed); err != nil {
			return err
		}
		_, err = tx.Exec(ctx, `update thaw.batches b set state = 'opened', reason = null, taken_by_hand = true,
				batch_order = case state when 'waiting' then (select max(o.batch_order) + 1 from thaw.batches o where o.feed_id = b.feed_id)
					else batch_order end
			where batch_id = $1 and state in ('waiting', 'held_back')`, id)
		if err != nil {
			return fmt.Errorf("open batch %d: %w", id, err)
		}
		return nil
	})
}
