package bus

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"testing"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
	"pgregory.net/rapid"
)

func TestAnnounce(t *testing.T) {
	b := open(t, Config{})
	ctx := within(t, patience)
	for _, id := range []string{"1", "2", "2"} { // the second 2 is dropped
		if err := b.Announce(ctx, "north strip", "apron", id, []byte("near "+id)); err != nil {
			t.Fatal(err)
		}
	}
	s, err := b.js.Stream(ctx, announceName)
	if err != nil {
		t.Fatal(err)
	}
	if n := s.CachedInfo().State.Msgs; n != 2 {
		t.Errorf("%d kept, want 2", n)
	}
	m, err := s.GetMsg(ctx, 2)
	if err != nil {
		t.Fatal(err)
	}
	if m.Subject != "thawledger.standing.north%20strip.apron" || string(m.Data) != "near 2" {
		t.Errorf("%s on %s", m.Data, m.Subject)
	}
}

func TestAnnounceRefuses(t *testing.T) {
	b := open(t, Config{})
	for _, c := range []struct {
		name, site, surface, id string
		payload                 int
	}{
		{"no site", "", "s", "1", 0}, {"no surface", "s", "", "1", 0}, {"no id", "s", "s", "", 0},
		{"long site", strings.Repeat("x", 256), "s", "1", 0}, {"long payload", "s", "s", "1", MaxEncodedBytes + 1},
	} {
		t.Run(c.name, func(t *testing.T) {
			if err := b.Announce(within(t, patience), c.site, c.surface, c.id, make([]byte, c.payload)); err == nil || Temporary(err) {
				t.Errorf("%v", err)
			}
		})
	}
}

func TestAnnounceRestores(t *testing.T) {
	b := open(t, Config{})
	if err := b.js.DeleteStream(within(t, patience), announceName); err != nil {
		t.Fatal(err)
	}
	if err := b.Announce(within(t, patience), "s", "s", "1", nil); err != nil || b.Restored() != 1 {
		t.Errorf("%v, restored %d", err, b.Restored())
	}
}

func TestNudges(t *testing.T) {
	server, _, client := serve(t)
	ctx, cancel := context.WithCancel(t.Context())
	here, err := server.Nudges(ctx)
	if err != nil {
		t.Fatal(err)
	}
	there, err := client.Nudges(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	for range 100 {
		if err := client.Nudge(); err != nil {
			t.Fatal(err)
		}
	}
	for _, nudges := range []<-chan struct{}{here, there} {
		if _, ok := <-nudges; !ok {
			t.Fatal("closed")
		}
		if n := len(nudges); n > 1 {
			t.Errorf("%d nudges held, want 1 at most", n)
		}
	}
	cancel()
	for range here { //nolint:revive // until it is closed
	}
	shut(t, client)
	for range there { //nolint:revive // until it is closed
	}
}

func TestNudgesWhenOver(t *testing.T) {
	b := open(t, Config{})
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := b.Nudges(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("%v", err)
	}
}

func TestTokens(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		name := rapid.StringN(1, 60, MaxTextBytes).Draw(t, "name")
		s, err := token("station", name)
		if err != nil {
			t.Fatal(err)
		}
		if strings.Trim(s, "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789-_%") != "" {
			t.Fatalf("token %q", s)
		}
		if back, err := untoken(s); err != nil || back != name {
			t.Fatalf("%q, then %q (%v)", s, back, err)
		}
	})
	if s, err := token("station", "NO-12.b"); err != nil || s != "NO-12%2Eb" {
		t.Errorf("%q, %v", s, err)
	}
}

func TestTemporary(t *testing.T) {
	for _, c := range []struct {
		name string
		err  error
		want bool
	}{
		{"nil", nil, false},
		{"time is up", context.DeadlineExceeded, true},
		{"gave up", context.Canceled, false},
		{"closed", told(nats.ErrConnectionClosed), false},
		{"full", fmt.Errorf("publish: %w", ErrFull), true},
		{"out of reach", told(nats.ErrDisconnected), true},
		{"no answer", nats.ErrTimeout, true},
		{"deleted", jetstream.ErrConsumerNotFound, true},
		{"wrong request", jetstream.ErrBadRequest, false},
		{"spoiled", ErrChecksum, false},
		{"no rights", nats.ErrAuthorization, false},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := Temporary(c.err); got != c.want {
				t.Errorf("%v", got)
			}
		})
	}
}
