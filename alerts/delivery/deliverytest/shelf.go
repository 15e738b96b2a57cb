package deliverytest

import (
	"bytes"
	"cmp"
	"context"
	"errors"
	"fmt"
	"slices"
	"sync"
	"time"

	"thawledger/alerts/delivery/capfeed"
)

// Shelf keeps CAP messages in memory and gives them to a feed.
type Shelf struct {
	Behaviour Behaviour
	Stalled   chan struct{} // gets a value when a delivery has come to a stop
	Now       func() time.Time

	mutex    sync.Mutex
	messages map[string]capfeed.Message
}

// NewShelf returns an empty shelf.
func NewShelf(b Behaviour, now func() time.Time) *Shelf {
	return &Shelf{Behaviour: b, Now: now, Stalled: make(chan struct{}, 100), messages: map[string]capfeed.Message{}}
}

// Keep implements capfeed.Keeper.
func (s *Shelf) Keep(ctx context.Context, messages []capfeed.Message) error {
	switch s.Behaviour {
	case Stalls:
		s.Stalled <- struct{}{}
		<-ctx.Done()
		return ctx.Err()
	case RefusesForNow:
		return errors.New("the shelf is full at the moment, " + Words)
	case ClosesEarly:
		return errors.New("the shelf went away")
	case RefusesForGood:
		return fmt.Errorf("%w, %s", capfeed.ErrOther, Words)
	}
	s.mutex.Lock()
	defer s.mutex.Unlock()
	for _, m := range messages {
		if had, ok := s.messages[m.Identifier]; ok && !bytes.Equal(had.XML, m.XML) {
			return capfeed.ErrOther
		}
	}
	for _, m := range messages {
		if _, ok := s.messages[m.Identifier]; !ok {
			m.Kept = s.Now()
			s.messages[m.Identifier] = m
		}
	}
	return nil
}

// Newest implements capfeed.Reader.
func (s *Shelf) Newest(_ context.Context, most int) ([]capfeed.Message, error) {
	s.mutex.Lock()
	defer s.mutex.Unlock()
	var out []capfeed.Message
	for _, m := range s.messages {
		out = append(out, m)
	}
	slices.SortFunc(out, func(a, b capfeed.Message) int {
		return cmp.Or(b.Sent.Compare(a.Sent), cmp.Compare(a.Identifier, b.Identifier))
	})
	return out[:min(most, len(out))], nil
}

// Message implements capfeed.Reader.
func (s *Shelf) Message(_ context.Context, identifier string) (capfeed.Message, bool, error) {
	s.mutex.Lock()
	defer s.mutex.Unlock()
	m, found := s.messages[identifier]
	return m, found, nil
}
