package bus

import (
	"context"
	"errors"
	"io"
	"net"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/zap"
	"go.uber.org/zap/zaptest/observer"
)

// serve opens a bus that listens, and a client of it over TCP.
func serve(t *testing.T) (server *Bus, again Config, client *Bus) {
	t.Helper()
	c := Config{Embedded: &Embedded{Dir: t.TempDir(), Listen: "127.0.0.1:0"}}
	server = open(t, c)
	c.Embedded = &Embedded{Dir: c.Embedded.Dir, Listen: strings.TrimPrefix(server.URL(), "nats://")}
	return server, c, open(t, Config{URL: server.URL()})
}

// Processes share the parts: each goes to one taker, whichever connection it has.
func TestTakersShare(t *testing.T) {
	server, _, client := serve(t)
	const parts = 60
	for n := range int32(parts) {
		publish(t, client, part(n+1, 1, 1))
	}
	seen := map[int32]int{}
	takers := []*Taker{taker(t, server), taker(t, client), taker(t, client)}
	for i := 0; len(seen) < parts; i++ {
		ds, err := takers[i%len(takers)].Take(within(t, patience), 7, time.Second)
		if err != nil || len(ds) == 0 {
			t.Fatalf("%d seen, took %d: %v", len(seen), len(ds), err)
		}
		for _, d := range ds {
			if seen[d.ID.Number]++; seen[d.ID.Number] > 1 {
				t.Fatalf("part %v came twice", d.ID)
			}
			if err := d.Done(); err != nil {
				t.Fatal(err)
			}
		}
	}
	emptied(t, client)
}

// While the server is away everything fails at once, as temporary; when it is
// back on the same address and folder, the same values go on working.
func TestServerAwayAndBack(t *testing.T) {
	server, again, client := serve(t)
	pub, k := client.NewPublisher(), taker(t, client)
	publish(t, client, part(1, 1, 1))
	held := take(t, k, 1)[0]

	shut(t, server)
	eventually(t, "loss noticed", func() bool { return !client.Connected() })
	ctx := within(t, patience)
	checks := map[string]error{
		"publish":  pub.Publish(ctx, part(2, 1, 1)),
		"flush":    pub.Flush(ctx),
		"done":     held.Done(),
		"announce": client.Announce(ctx, "site", "surface", "1", nil),
		"nudge":    client.Nudge(),
	}
	_, checks["take"] = k.Take(ctx, 1, time.Millisecond)
	_, checks["waiting"] = client.Waiting(ctx)
	for name, err := range checks {
		if !Temporary(err) {
			t.Errorf("%s: %v is not temporary", name, err)
		}
	}
	if ctx.Err() != nil {
		t.Error("calls waited for the server")
	}
	var failed *PublishError
	if !errors.As(checks["flush"], &failed) || len(failed.Parts) != 1 || failed.Parts[0] != (PartID{7, 2, 1}) {
		t.Errorf("flush: %v", checks["flush"])
	}

	open(t, again)
	eventually(t, "back in reach", client.Connected)
	publish(t, client, part(2, 2, 1))
	if d := take(t, k, 1)[0]; d.ID != (PartID{7, 2, 2}) {
		t.Errorf("took %v", d.ID)
	}
	if err := held.DoneConfirmed(within(t, patience)); err != nil { // across the restart
		t.Error(err)
	}
	if n := waiting(t, client); n != 1 {
		t.Errorf("%d waiting, want the one that was not done", n)
	}
}

// A server that went away while parts were unanswered fails them within ctx.
func TestFlushEndsWithContext(t *testing.T) {
	b := open(t, Config{})
	pub := b.NewPublisher()
	s := &sent{by: pub, id: PartID{7, 1, 1}} // one that nobody ever answers for
	pub.open[s] = struct{}{}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	err := pub.Flush(ctx)
	var failed *PublishError
	if !errors.As(err, &failed) || len(failed.Parts) != 1 || !errors.Is(err, context.Canceled) || Temporary(err) {
		t.Fatalf("flush: %v", err)
	}
	pub.settle(s, errors.New("late answer"))
	if err := pub.Flush(t.Context()); err != nil {
		t.Errorf("a late answer counts for the next flush: %v", err)
	}
}

// A line that goes dead while a taker waits is told as such, not as an empty bus.
func TestLineCutWhileTaking(t *testing.T) {
	server, _, _ := serve(t)
	address, cut := relay(t, strings.TrimPrefix(server.URL(), "nats://"))
	k := taker(t, open(t, Config{URL: "nats://" + address}))
	took := make(chan error, 1)
	go func() {
		_, err := k.Take(t.Context(), 1, 2*time.Second)
		took <- err
	}()
	here := taker(t, server)
	eventually(t, "taker waits", func() bool {
		info, err := here.from.Info(within(t, patience))
		return err == nil && info.NumWaiting == 1
	})
	cut()
	if err := <-took; !Temporary(err) || !errors.Is(err, ErrUnreachable) {
		t.Errorf("took with %v", err)
	}
}

// relay passes bytes on to an address until it is cut, once and for all.
func relay(t *testing.T, to string) (address string, cut func()) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	var wait sync.WaitGroup
	ends := make(chan net.Conn, 2)
	wait.Go(func() {
		defer close(ends)
		near, err := l.Accept()
		if err != nil {
			return
		}
		far, err := net.Dial("tcp", to)
		if err != nil {
			t.Error(err)
			return
		}
		ends <- near
		ends <- far
		wait.Go(func() { _, _ = io.Copy(far, near) })
		wait.Go(func() { _, _ = io.Copy(near, far) })
	})
	cut = sync.OnceFunc(func() {
		_ = l.Close()
		for end := range ends {
			_ = end.Close()
		}
		wait.Wait()
	})
	t.Cleanup(cut)
	return l.Addr().String(), cut
}

func TestLossIsLogged(t *testing.T) {
	server := open(t, Config{Embedded: &Embedded{Dir: t.TempDir(), Listen: "localhost:0"}})
	core, lines := observer.New(zap.InfoLevel)
	client := open(t, Config{URL: server.URL(), Log: zap.New(core)})
	shut(t, server)
	eventually(t, "line in the log", func() bool {
		return lines.FilterMessage("bus out of reach, trying again for ever").Len() == 1
	})
	shut(t, client)
	if n := lines.FilterLevelExact(zap.ErrorLevel).Len(); n != 0 {
		t.Errorf("%d errors logged for an orderly end: %v", n, lines.All())
	}
}
