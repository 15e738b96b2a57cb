package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline"
)

// DueNotice is a notice that a sender has in hand.
type DueNotice struct {
	ID        int64
	Key       string
	Recipient string
	Channel   string
	Kind      string
	Content   []byte
	WrittenAt time.Time
	DueAt     time.Time
	Attempt   int // from 1
}

// TakeNotice takes the notice that has waited longest and is due, and records
// that an attempt begins. Until the lease is over no other takes it; a sender
// that ends in the midst of it leaves it to be taken again, with the same key.
// Notices to one recipient by one channel are taken in the order in which they
// were written. Recipients in not are left out. It returns nil if nothing is due.
func (db *DB) TakeNotice(ctx context.Context, now time.Time, lease time.Duration, not []string) (n *DueNotice, err error) {
	err = db.within(ctx, func(tx pgx.Tx) error {
		var d DueNotice
		// Of each recipient and channel only the oldest may be taken; they are found
		// one by one in the index, however many wait behind them.
		err := tx.QueryRow(ctx, `update thaw.notices u set attempts = attempts + 1, leased_until = $2 where notice_id = (
				with recursive heads as (
					(select recipient, channel, notice_id from thaw.notices where delivered_at is null and given_up_at is null
						order by recipient, channel, notice_id limit 1)
					union all
					select o.* from heads h cross join lateral (select recipient, channel, notice_id from thaw.notices
						where delivered_at is null and given_up_at is null and (recipient, channel) > (h.recipient, h.channel)
						order by recipient, channel, notice_id limit 1) o)
				select n.notice_id from heads join thaw.notices n using (notice_id)
				where n.delivered_at is null and n.given_up_at is null and n.next_attempt_at <= $1
					and (n.leased_until is null or n.leased_until <= $1) and not n.recipient = any($3)
				order by n.next_attempt_at, n.notice_id limit 1 for update of n skip locked)
			returning notice_id, key, recipient, channel, kind, content, written_at, due_at, attempts`, now, now.Add(lease), nonNil(not)).
			Scan(&d.ID, &d.Key, &d.Recipient, &d.Channel, &d.Kind, &d.Content, &d.WrittenAt, &d.DueAt, &d.Attempt)
		if errors.Is(err, pgx.ErrNoRows) {
			return nil
		}
		if err != nil {
			return err
		}
		_, err = tx.Exec(ctx, `insert into thaw.notice_attempts (notice_id, attempt, began_at) values ($1, $2, $3)`, d.ID, d.Attempt, now)
		n = &d
		return err
	})
	if err != nil {
		return nil, fmt.Errorf("take a notice: %w", err)
	}
	return n, nil
}

// AttemptEnd is what came of an attempt.
type AttemptEnd struct {
	At        time.Time
	Delivered bool
	Again     bool // trying again may help
	Answer    string
	Next      time.Time // when to try again, unless delivered or given up
	GiveUp    string    // why it is given up; "" for not
}

func (e *AttemptEnd) outcome() string {
	switch {
	case e.Delivered:
		return "delivered"
	case e.Again:
		return "not now"
	}
	return "refused"
}

// EndAttempt records what came of an attempt. What is given up is handed to the
// operator, if any, by the operator's channels. A delivery that another sender has
// recorded already stays as it is.
func (db *DB) EndAttempt(ctx context.Context, n *DueNotice, e AttemptEnd, operator string, channels []string) error {
	err := db.within(ctx, func(tx pgx.Tx) error {
		_, err := tx.Exec(ctx, `update thaw.notice_attempts set ended_at = $3, outcome = $4, answer = $5 where notice_id = $1 and attempt = $2 and ended_at is null`,
			n.ID, n.Attempt, e.At, e.outcome(), e.Answer)
		if err != nil {
			return err
		}
		reason := e.Answer
		if e.GiveUp != "" {
			reason = e.GiveUp
		}
		tag, err := tx.Exec(ctx, `update thaw.notices set leased_until = null, reason = $2,
				delivered_at = case when $3 then $4::timestamptz end,
				given_up_at = case when $5 then $4::timestamptz end,
				next_attempt_at = case when $3 or $5 then next_attempt_at else $6 end
			where notice_id = $1 and delivered_at is null and given_up_at is null and ($3 or attempts = $7)`,
			n.ID, reason, e.Delivered, e.At, e.GiveUp != "", e.Next, n.Attempt)
		if err != nil || e.GiveUp == "" || tag.RowsAffected() == 0 || operator == "" || operator == n.Recipient {
			return err
		}
		_, err = tx.Exec(ctx, `insert into thaw.notice_changes (recipient, channel, change_id, handed_from, about, note, noted_at)
			select $1, channel, x.change_id, $2, x.about, $3, $4
			from (select about, max(change_id) as change_id from thaw.notice_changes where recipient = $2 and notice_id is not null
				and about in (select about from thaw.notice_items where notice_id = $5) group by about) x
			cross join unnest($6::text[]) channel on conflict do nothing`,
			operator, n.Recipient, fmt.Sprintf("Notice %s could not be delivered to %s by %s: %s", n.Key, n.Recipient, n.Channel, e.GiveUp), e.At, n.ID, nonNil(channels))
		return err
	})
	if err != nil {
		return fmt.Errorf("record attempt %d of notice %s: %w", n.Attempt, n.Key, err)
	}
	return nil
}

// DropWaiting settles what waits for recipients and channels that the settings no
// longer have, and gives up notices to recipients that they no longer have.
func (db *DB) DropWaiting(ctx context.Context, there []Hearer, at time.Time) error {
	var recipients, channels []string
	for _, h := range there {
		recipients, channels = append(recipients, h.Recipient), append(channels, h.Channel)
	}
	const gone = "the settings no longer have this recipient and channel"
	_, err := db.pool.Exec(ctx, `with there as (select * from unnest($1::text[], $2::text[]) as t (recipient, channel)),
		n as (update thaw.notices set given_up_at = $3, reason = $4, leased_until = null
			where delivered_at is null and given_up_at is null and (leased_until is null or leased_until <= $3)
				and not (recipient, channel) in (select * from there))
		update thaw.notice_changes set set_aside = $4, settled_at = $3 where settled_at is null and not (recipient, channel) in (select * from there)`,
		nonNil(recipients), nonNil(channels), at, gone)
	if err != nil {
		return fmt.Errorf("drop notices to nobody: %w", err)
	}
	return nil
}

// Hold is a hold as it is asked for and as it is stored.
type Hold struct {
	ID                     int64
	Station, Site, Surface string // a station; or a site, with "" for all its surfaces
	By, Why                string
	From, Until            time.Time
	LiftedAt               *time.Time
	LiftedBy               string
}

// AddHold puts notices off and returns the hold's number.
func (db *DB) AddHold(ctx context.Context, h Hold) (id int64, err error) {
	err = db.pool.QueryRow(ctx, `insert into thaw.holds (station, site, surface, by_whom, why, from_at, until_at)
		values (nullif($1, ''), nullif($2, ''), nullif($3, ''), $4, $5, $6, $7) returning hold_id`,
		h.Station, h.Site, h.Surface, h.By, h.Why, h.From, h.Until).Scan(&id)
	if err != nil {
		return 0, fmt.Errorf("put notices off: %w", err)
	}
	return id, nil
}

// ErrNoSuch says that there is nothing by a name or number.
var ErrNoSuch = errors.New("there is none")

// LiftHold ends a hold before its time.
func (db *DB) LiftHold(ctx context.Context, id int64, by string, at time.Time) error {
	tag, err := db.pool.Exec(ctx, `update thaw.holds set lifted_at = $2, lifted_by = $3 where hold_id = $1 and lifted_at is null and until_at > $2`, id, at, by)
	if err != nil {
		return fmt.Errorf("lift hold %d: %w", id, err)
	}
	if tag.RowsAffected() == 0 {
		return fmt.Errorf("hold %d in force: %w", id, ErrNoSuch)
	}
	return nil
}

// Holds returns the holds in force at a time, those that end first first.
func (db *DB) Holds(ctx context.Context, at time.Time) ([]Hold, error) {
	rows, err := db.pool.Query(ctx, `select hold_id, coalesce(station, ''), coalesce(site, ''), coalesce(surface, ''), by_whom, why, from_at, until_at,
			lifted_at, coalesce(lifted_by, '')
		from thaw.holds where lifted_at is null and until_at > $1 order by until_at, hold_id`, at)
	if err != nil {
		return nil, fmt.Errorf("read holds: %w", err)
	}
	return pgx.CollectRows(rows, pgx.RowToStructByPos[Hold])
}

// Seen records that somebody has seen a notice; how is command or link.
func (db *DB) Seen(ctx context.Context, key, by, how string, at time.Time) error {
	tag, err := db.pool.Exec(ctx, `insert into thaw.seen (notice_id, by_whom, how, seen_at) select notice_id, $2, $3, $4 from thaw.notices where key = $1`, key, by, how, at)
	if err != nil {
		return fmt.Errorf("mark notice %s as seen: %w", key, err)
	}
	if tag.RowsAffected() == 0 {
		return fmt.Errorf("notice %q: %w", key, ErrNoSuch)
	}
	return nil
}

// NoticeShown is a notice as commands show it.
type NoticeShown struct {
	Key, Recipient, Channel, Kind string
	WrittenAt                     time.Time
	DeliveredAt, GivenUpAt        *time.Time
	NextAttemptAt                 time.Time
	Attempts                      int
	Reason                        string
	SeenBy                        string
	Says                          []string // site/surface and state, one a standing
}

// Notices returns the notices about a site, or all if site is "", that were
// written at a time or later, oldest first.
func (db *DB) Notices(ctx context.Context, site string, since time.Time) ([]NoticeShown, error) {
	rows, err := db.pool.Query(ctx, `select key, recipient, channel, n.kind, written_at, delivered_at, given_up_at, next_attempt_at, attempts, coalesce(reason, ''),
			coalesce((select string_agg(distinct s.by_whom, ', ') from thaw.seen s join thaw.notices o using (notice_id) where o.message_id = n.message_id), ''),
			array(select i.site || '/' || i.surface || ' ' || coalesce(i.from_state || ' -> ', '') || i.to_state from thaw.notice_items i
				where i.notice_id = n.notice_id order by i.place)
		from thaw.notices n where written_at >= $2
			and ($1 = '' or exists (select from thaw.notice_items i where i.notice_id = n.notice_id and i.site = $1))
		order by notice_id`, site, since)
	if err != nil {
		return nil, fmt.Errorf("read notices: %w", err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowToStructByPos[NoticeShown])
	if err != nil {
		return nil, fmt.Errorf("read notices: %w", err)
	}
	return out, nil
}

// WaitingShown is what waits to be told to somebody.
type WaitingShown struct {
	Recipient, Channel, Site, Surface string
	To                                pipeline.State
	NotedAt                           time.Time
	Held                              bool
}

// WaitingNotices returns the changes about a site, or all if site is "", that wait
// to be told.
func (db *DB) WaitingNotices(ctx context.Context, site string, now time.Time) ([]WaitingShown, error) {
	rows, err := db.pool.Query(ctx, `select w.recipient, w.channel, c.site, c.surface, c.to_state, w.noted_at, `+onHold("c.site", "c.surface")+`
		from thaw.notice_changes w join thaw.standing_changes c using (change_id)
		where w.settled_at is null and ($1 = '' or c.site = $1) order by w.recipient, w.channel, w.change_id`, site, now)
	if err != nil {
		return nil, fmt.Errorf("read what waits: %w", err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowToStructByPos[WaitingShown])
	if err != nil {
		return nil, fmt.Errorf("read what waits: %w", err)
	}
	return out, nil
}
