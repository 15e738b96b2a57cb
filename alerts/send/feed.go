package send

import (
	"context"
	"errors"
	"fmt"
	"net"
	"net/http"
	"net/url"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery/capfeed"
	"thawledger/pipeline/store"
)

// Shelf keeps a channel's CAP messages in the database.
type Shelf struct {
	DB      *store.DB
	Channel string
	Now     func() time.Time
}

// Keep puts messages on the feed.
func (s Shelf) Keep(ctx context.Context, messages []capfeed.Message) error {
	var out []store.CAPMessage
	for _, m := range messages {
		out = append(out, store.CAPMessage{Identifier: m.Identifier, SentAt: m.Sent, Headline: m.Headline, Document: string(m.XML), KeptAt: s.Now()})
	}
	err := s.DB.KeepCAP(ctx, s.Channel, out)
	if errors.Is(err, store.ErrOtherMessage) {
		return fmt.Errorf("%w: %w", capfeed.ErrOther, err)
	}
	return err
}

// Newest returns up to most messages, those sent last.
func (s Shelf) Newest(ctx context.Context, most int) (out []capfeed.Message, err error) {
	kept, err := s.DB.NewestCAP(ctx, s.Channel, most)
	for i := range kept {
		out = append(out, message(&kept[i]))
	}
	return out, err
}

// Message returns one message, and whether there is one.
func (s Shelf) Message(ctx context.Context, identifier string) (capfeed.Message, bool, error) {
	m, err := s.DB.CAPMessage(ctx, s.Channel, identifier)
	if m == nil || err != nil {
		return capfeed.Message{}, false, err
	}
	return message(m), true, nil
}

func message(m *store.CAPMessage) capfeed.Message {
	return capfeed.Message{Identifier: m.Identifier, Sent: m.SentAt, Headline: m.Headline, XML: []byte(m.Document), Kept: m.KeptAt}
}

// ServeFeed serves a channel's feed at an address, below the path of its base
// address, until ctx ends. ready, if not nil, is told where it listens.
func ServeFeed(ctx context.Context, address string, settings capfeed.Settings, shelf Shelf, log *zap.Logger, ready func(net.Addr)) error {
	handler, err := capfeed.Handler(settings, shelf, func(err error) { log.Error("the feed could not be read", zap.Error(err)) })
	if err != nil {
		return err
	}
	base, err := url.Parse(settings.BaseURL)
	if err != nil {
		return fmt.Errorf("base address of the feed: %w", err)
	}
	mux := http.NewServeMux()
	mux.Handle(base.Path, http.StripPrefix(base.Path[:len(base.Path)-1], handler)) // the path ends in /
	listener, err := new(net.ListenConfig).Listen(ctx, "tcp", address)
	if err != nil {
		return fmt.Errorf("serve the feed of channel %s: %w", shelf.Channel, err)
	}
	server := &http.Server{Handler: mux, ReadHeaderTimeout: 10 * time.Second, ReadTimeout: 30 * time.Second, WriteTimeout: 2 * time.Minute,
		IdleTimeout: time.Minute, MaxHeaderBytes: 64 << 10}
	if ready != nil {
		ready(listener.Addr())
	}
	ended := make(chan error, 1)
	go func() { ended <- server.Serve(listener) }()
	select {
	case err := <-ended:
		return fmt.Errorf("serve the feed of channel %s: %w", shelf.Channel, err)
	case <-ctx.Done():
	}
	last, cancel := context.WithTimeout(context.WithoutCancel(ctx), 5*time.Second)
	defer cancel()
	if err = server.Shutdown(last); errors.Is(err, context.DeadlineExceeded) {
		err = server.Close()
	}
	<-ended
	return err
}
