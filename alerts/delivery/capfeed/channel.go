package capfeed

import (
	"context"
	"errors"
	"fmt"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
)

// Keeper keeps messages for the feed. Keep stores all of them or none, sets
// when, and does nothing for one that it has already. It has to give up when ctx
// is done.
type Keeper interface {
	Keep(ctx context.Context, messages []Message) error
}

// ErrOther is Keep's error if it has a message of the same identifier and other
// content: trying again cannot help.
var ErrOther = errors.New("another message of this identifier is on the feed")

// Channel publishes notices.
type Channel struct {
	settings Settings
	texts    *text.Texts
	keeper   Keeper
}

// New returns a channel, or everything that is wrong with its settings.
func New(s Settings, texts *text.Texts, keeper Keeper) (*Channel, error) {
	if err := s.Check(); err != nil {
		return nil, fmt.Errorf("CAP feed settings: %w", err)
	}
	return &Channel{settings: s, texts: texts, keeper: keeper}, nil
}

// Deliver puts the notice's messages on the feed. Who reads it, and when, is not
// known: delivered means published.
func (c *Channel) Deliver(ctx context.Context, n delivery.Notice) delivery.Outcome {
	messages, err := Build(n, &c.settings, c.texts)
	if err != nil {
		return delivery.Failed(false, err.Error())
	}
	ctx, cancel := context.WithTimeout(ctx, c.settings.timeout())
	defer cancel()
	if err := ctx.Err(); err != nil {
		return delivery.Failed(true, err.Error())
	}
	if err := c.keeper.Keep(ctx, messages); err != nil {
		return delivery.Failed(!errors.Is(err, ErrOther), err.Error())
	}
	return delivery.Taken(fmt.Sprintf("on the feed: %s", messages[0].Identifier))
}
