package store

import (
	"context"
	"errors"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
)

// CAPMessage is a message on a channel's feed.
type CAPMessage struct {
	Identifier string
	SentAt     time.Time
	Headline   string
	Document   string // XML
	KeptAt     time.Time
}

// ErrOtherMessage says that there is a message of the same identifier and another
// content.
var ErrOtherMessage = errors.New("another message of this identifier is on the feed")

// KeepCAP puts messages on a channel's feed, all or none. One that is there
// already stays as it is.
func (db *DB) KeepCAP(ctx context.Context, channel string, messages []CAPMessage) error {
	return db.within(ctx, func(tx pgx.Tx) error {
		for _, m := range messages {
			var same bool
			err := tx.QueryRow(ctx, `with n as (insert into thaw.cap_messages (channel, identifier, sent_at, headline, document, kept_at)
					values ($1, $2, $3, $4, $5, $6) on conflict do nothing returning true)
				select coalesce((select true from n), (select document = $5 from thaw.cap_messages where channel = $1 and identifier = $2), true)`,
				channel, m.Identifier, m.SentAt, m.Headline, m.Document, m.KeptAt).Scan(&same)
			if err != nil {
				return fmt.Errorf("keep message %s: %w", m.Identifier, err)
			}
			if !same {
				return fmt.Errorf("keep message %s: %w", m.Identifier, ErrOtherMessage)
			}
		}
		return nil
	})
}

// NewestCAP returns up to most messages of a channel, those sent last.
func (db *DB) NewestCAP(ctx context.Context, channel string, most int) ([]CAPMessage, error) {
	rows, err := db.pool.Query(ctx, `select identifier, sent_at, headline, document, kept_at from thaw.cap_messages
		where channel = $1 order by sent_at desc, identifier limit $2`, channel, most)
	if err != nil {
		return nil, fmt.Errorf("read messages of %s: %w", channel, err)
	}
	return collect[CAPMessage](rows, "messages of "+channel)
}

// CAPMessage returns one message of a channel; nil if there is none.
func (db *DB) CAPMessage(ctx context.Context, channel, identifier string) (*CAPMessage, error) {
	rows, err := db.pool.Query(ctx, `select identifier, sent_at, headline, document, kept_at from thaw.cap_messages
		where channel = $1 and identifier = $2`, channel, identifier)
	if err != nil {
		return nil, fmt.Errorf("read message %s of %s: %w", identifier, channel, err)
	}
	found, err := collect[CAPMessage](rows, "a message of "+channel)
	if err != nil || len(found) == 0 {
		return nil, err
	}
	return &found[0], nil
}
