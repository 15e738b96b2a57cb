package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// lockRecipient keeps two processes from writing to one recipient at once.
const lockRecipient lockFamily = 0x7468_0006

// Hearer is a recipient by one of its channels.
type Hearer struct{ Recipient, Channel string }

// Tell notes who is to be told of the change of a standing that was recorded last;
// about names the standing. It is part of the transaction that changes it.
func (j *Judging) Tell(ctx context.Context, s *StandingRow, about string, to []Hearer, at time.Time) error {
	batch := &pgx.Batch{}
	for _, h := range to {
		batch.Queue(`insert into thaw.notice_changes (recipient, channel, change_id, about, noted_at)
			select $1, $2, max(change_id), $3, $4 from thaw.standing_changes where design_value_id = $5 and season_start = $6
			on conflict do nothing`, h.Recipient, h.Channel, about, at, s.Design.ID, s.Season.Time())
	}
	if err := j.tx.SendBatch(ctx, batch).Close(); err != nil {
		return fmt.Errorf("note who is told of %s: %w", about, err)
	}
	return nil
}

// RecipientsWaiting returns the recipients for whom changes wait.
func (db *DB) RecipientsWaiting(ctx context.Context) ([]string, error) {
	rows, err := db.pool.Query(ctx, `select distinct recipient from thaw.notice_changes where settled_at is null order by 1`)
	if err != nil {
		return nil, fmt.Errorf("read who is to be told: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowTo[string])
}

// Gathering is one transaction that writes to one recipient.
type Gathering struct {
	tx        pgx.Tx
	recipient string
	message   int64 // 0 until something is written
}

// Gather runs f in a transaction that holds the lock of a recipient. It returns
// ErrBusy if another writes to the recipient.
func (db *DB) Gather(ctx context.Context, recipient string, f func(*Gathering) error) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		got, err := tryLock(ctx, tx, lockRecipient, recipient)
		if err != nil {
			return err
		}
		if !got {
			return ErrBusy
		}
		return f(&Gathering{tx: tx, recipient: recipient})
	})
}

// WaitingChange is a change that waits to be told.
type WaitingChange struct {
	ID         int64
	Channel    string
	About      string
	From, To   pipeline.State
	Why        string
	HandedFrom string
	Note       string
	NotedAt    time.Time
	Held       bool
}

// Waiting returns the changes that wait, in the order in which they came.
func (g *Gathering) Waiting(ctx context.Context, now time.Time) ([]WaitingChange, error) {
	rows, err := g.tx.Query(ctx, `select w.change_id, w.channel, w.about, coalesce(c.from_state, ''), c.to_state, c.why, w.handed_from, w.note, w.noted_at,
			`+onHold("c.site", "c.surface")+`
		from thaw.notice_changes w join thaw.standing_changes c using (change_id)
		where w.recipient = $1 and w.settled_at is null order by w.change_id, w.channel, w.handed_from`, g.recipient, now)
	if err != nil {
		return nil, fmt.Errorf("read what %s is to be told: %w", g.recipient, err)
	}
	out, err := pgx.CollectRows(rows, func(r pgx.CollectableRow) (WaitingChange, error) {
		var w WaitingChange
		err := r.Scan(&w.ID, &w.Channel, &w.About, &w.From, &w.To, &w.Why, &w.HandedFrom, &w.Note, &w.NotedAt, &w.Held)
		return w, err
	})
	if err != nil {
		return nil, fmt.Errorf("read what %s is to be told: %w", g.recipient, err)
	}
	return out, nil
}

// onHold is SQL that says whether a hold on a surface is in force at $2.
func onHold(site, surface string) string {
	return `exists (select from thaw.holds h where h.lifted_at is null and $2 >= h.from_at and $2 < h.until_at
		and (h.station = (select t.station from thaw.sites t where t.site = ` + site + `)
			or h.site = ` + site + ` and coalesce(h.surface = ` + surface + `, true)))`
}

// Busy says whether readings that have come are still being taken or judged, so
// that more changes may follow.
func (g *Gathering) Busy(ctx context.Context) (busy bool, err error) {
	err = g.tx.QueryRow(ctx, `select exists (select from thaw.changes) or exists (select from thaw.stations where recompute or reindex or refill)
		or exists (select from thaw.batch_parts p where `+open+`)`).Scan(&busy)
	if err != nil {
		return false, fmt.Errorf("ask whether all is judged: %w", err)
	}
	return busy, nil
}

// ToldLine is what a notice said of a standing.
type ToldLine struct {
	Channel string
	About   string
	Key     string
	At      time.Time
	Kind    string
	State   pipeline.State
	Seen    bool // it, or one with the same message, or one that was handed on for want of an answer to it, was marked as seen
}

// Told returns what the recipient was told since a time, oldest first, of the
// standings that something waits about and of those once told to be exceeded or
// to have fallen short.
func (g *Gathering) Told(ctx context.Context, since time.Time) ([]ToldLine, error) {
	rows, err := g.tx.Query(ctx, `with mine as (select n.*, i.about, i.kind as item_kind, i.to_state
			from thaw.notices n join thaw.notice_items i using (notice_id) where n.recipient = $1 and n.written_at > $2 and n.kind <> 'drill')
		select m.channel, m.about, m.key, m.written_at, m.item_kind, m.to_state,
			exists (select from thaw.seen s join thaw.notices o using (notice_id) where o.message_id = m.message_id)
			or exists (select from thaw.notice_changes h join thaw.notices o using (notice_id) join thaw.notices p on p.message_id = o.message_id
				join thaw.seen s on s.notice_id = p.notice_id where h.handed_from = m.recipient and h.about = m.about and s.seen_at >= m.written_at)
		from mine m
		where m.about in (select about from mine where to_state in ('exceeded', 'fell_short'))
			or m.about in (select about from thaw.notice_changes where recipient = $1 and settled_at is null)
		order by m.written_at, m.notice_id`, g.recipient, since)
	if err != nil {
		return nil, fmt.Errorf("read what %s was told: %w", g.recipient, err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowToStructByPos[ToldLine])
	if err != nil {
		return nil, fmt.Errorf("read what %s was told: %w", g.recipient, err)
	}
	return out, nil
}

// StandsAs is how a standing stands now.
type StandsAs struct {
	Design int64 // the design value in force
	Season pipeline.Day
	State  pipeline.State
	Over   bool
	Held   bool

	Site, Surface string
}

// Now returns how standings that the recipient was or is to be told of stand; one
// that is judged no more is left out.
func (g *Gathering) Now(ctx context.Context, abouts []string, now time.Time) (map[string]StandsAs, error) {
	rows, err := g.tx.Query(ctx, `select distinct on (c.about) c.about, s.design_value_id, s.season_start, s.state, s.season_over, `+onHold("s.site", "s.surface")+`, s.site, s.surface
		from (select about, max(change_id) as change_id from thaw.notice_changes where recipient = $1 and about = any($3) group by about) c
		join thaw.standing_changes x using (change_id)
		join thaw.design_values o on o.design_value_id = x.design_value_id
		join thaw.design_values d on (d.site, d.surface, d.kind, d.definition, d.index_of, d.direction)
			= (o.site, o.surface, o.kind, o.definition, o.index_of, o.direction)
		join thaw.standings s on s.design_value_id = d.design_value_id and s.season_start = x.season_start
		-- A design value that another has taken the place of counts until that one is judged.
		order by c.about, d.retired_at is null desc, s.judged_at desc`, g.recipient, now, nonNil(abouts))
	if err != nil {
		return nil, fmt.Errorf("read how surfaces stand: %w", err)
	}
	out := map[string]StandsAs{}
	var about string
	var season time.Time
	var s StandsAs
	_, err = pgx.ForEachRow(rows, []any{&about, &s.Design, &season, &s.State, &s.Over, &s.Held, &s.Site, &s.Surface}, func() error {
		s.Season = dayOf(season)
		out[about] = s
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read how surfaces stand: %w", err)
	}
	return out, nil
}

// NewNotice is a notice to be written.
type NewNotice struct {
	Channel string
	Kind    string
	Content []byte // JSON
	First   string // key of the first notice about the same; "" if this is the first
	At      time.Time
	Items   []NewItem
}

// NewItem is what a notice says of a standing, and the changes that it tells.
type NewItem struct {
	About   string
	Kind    string
	From    pipeline.State // "" for a first judgement
	Figures *Figures
	First   string
	Changes []int64
}

// Write writes a notice, to be sent at once, and settles the changes that it
// tells. Notices written in one transaction are one message.
func (g *Gathering) Write(ctx context.Context, n *NewNotice) (key string, err error) {
	if g.message == 0 {
		if err := g.tx.QueryRow(ctx, `select nextval('thaw.messages')`).Scan(&g.message); err != nil {
			return "", fmt.Errorf("number a message: %w", err)
		}
	}
	var id int64
	// The end of the key keeps a database that was lost and made anew from
	// using a key a second time.
	err = g.tx.QueryRow(ctx, `with k as (select nextval(pg_get_serial_sequence('thaw.notices', 'notice_id')) as id)
		insert into thaw.notices (notice_id, key, message_id, recipient, channel, kind, content, first_notice, written_at, due_at, next_attempt_at)
		overriding system value
		select id, 'n-' || to_char($1::timestamptz at time zone 'UTC', 'YYMMDD') || '-' || id || '-' || left(md5(gen_random_uuid()::text), 4),
			$2, $3, $4, $5, $6, nullif($7, ''), $1, $1, $1 from k returning notice_id, key`,
		n.At, g.message, g.recipient, n.Channel, n.Kind, n.Content, n.First).Scan(&id, &key)
	if err != nil {
		return "", fmt.Errorf("write notice to %s: %w", g.recipient, err)
	}
	batch := &pgx.Batch{}
	for i, item := range n.Items {
		f := item.Figures
		batch.Queue(`insert into thaw.notice_items (notice_id, about, place, kind, site, surface, design_value_id, season_start, exceedance_id,
				from_state, to_state, day, index_low_c_days, index_high_c_days, design_c_days, first_notice)
			values ($1, $2, $3, $4, $5, $6, $7, $8, nullif($9::bigint, 0), nullif($10, ''), $11, $12, $13, $14, $15, nullif($16, ''))`,
			id, item.About, i+1, item.Kind, f.Site, f.Surface, f.Design, f.SeasonStart.Time(), f.Exceedance, string(item.From), string(f.State),
			f.Day.Time(), f.Low, f.High, f.DesignC, item.First)
		batch.Queue(`update thaw.notice_changes set notice_id = $1, settled_at = $2
			where recipient = $3 and channel = $4 and change_id = any($5) and settled_at is null`, id, n.At, g.recipient, n.Channel, nonNil(item.Changes))
	}
	if err := g.tx.SendBatch(ctx, batch).Close(); err != nil {
		return "", fmt.Errorf("write items of notice %s: %w", key, err)
	}
	return key, nil
}

// SetAside settles a change without a notice.
func (g *Gathering) SetAside(ctx context.Context, channel string, change int64, why string, at time.Time) error {
	_, err := g.tx.Exec(ctx, `update thaw.notice_changes set set_aside = $1, settled_at = $2
		where recipient = $3 and channel = $4 and change_id = $5 and settled_at is null`, why, at, g.recipient, channel, change)
	if err != nil {
		return fmt.Errorf("set change %d aside: %w", change, err)
	}
	return nil
}

// HandOn notes that another recipient is to be told of standings, once each
// change that the first was told of. One who has heard of it anyway is not told
// again.
func (g *Gathering) HandOn(ctx context.Context, to string, channels, abouts []string, at time.Time) error {
	_, err := g.tx.Exec(ctx, `insert into thaw.notice_changes (recipient, channel, change_id, handed_from, about, noted_at)
		select $2, channel, x.change_id, $1, x.about, $5
		from (select about, max(change_id) as change_id from thaw.notice_changes
			where recipient = $1 and about = any($4) and notice_id is not null group by about) x
		cross join unnest($3::text[]) channel
		where not exists (select from thaw.notice_changes y where y.recipient = $2 and y.change_id = x.change_id)
		on conflict do nothing`, g.recipient, to, nonNil(channels), nonNil(abouts), at)
	if err != nil {
		return fmt.Errorf("hand on from %s to %s: %w", g.recipient, to, err)
	}
	return nil
}
