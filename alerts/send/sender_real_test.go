package send

import (
	"context"
	"fmt"
	"io"
	"net"
	"net/http"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/capfeed"
	"thawledger/alerts/delivery/text"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// Takers never have a notice in hand together, and get each recipient's in order.
func TestTakenByOneAtATime(t *testing.T) {
	db := pipelinetest.New(t)
	writeNotices(t, db.URL, 200)
	now := time.Now()
	var mu sync.Mutex
	order := map[string][]int64{}
	var all sync.WaitGroup
	for range 8 {
		all.Go(func() {
			for {
				n, err := db.TakeNotice(t.Context(), now, time.Hour, []string{"r3"})
				if err != nil || n == nil {
					if err != nil {
						t.Error(err)
					}
					return
				}
				mu.Lock()
				order[n.Recipient] = append(order[n.Recipient], n.ID)
				mu.Unlock()
				if err := db.EndAttempt(t.Context(), n, store.AttemptEnd{At: now, Delivered: true}, "", nil); err != nil {
					t.Error(err)
				}
			}
		})
	}
	all.Wait()
	taken := 0
	for to, list := range order {
		taken += len(list)
		if !slices.IsSorted(list) {
			t.Errorf("%s: %v", to, list)
		}
	}
	// While one of a recipient's is in hand its next is not taken, so that the
	// takers may stop before all is done; what is left is there to be taken.
	for {
		n, err := db.TakeNotice(t.Context(), now, time.Hour, []string{"r3"})
		if err != nil {
			t.Fatal(err)
		}
		if n == nil {
			break
		}
		taken++
		if err := db.EndAttempt(t.Context(), n, store.AttemptEnd{At: now, Delivered: true}, "", nil); err != nil {
			t.Fatal(err)
		}
	}
	if taken != 190 || order["r3"] != nil {
		t.Errorf("%d taken, %v of r3", taken, order["r3"])
	}
}

// A lease that is over lets another take the notice, with the same key; what the
// first then says counts only if it is that it was delivered.
func TestLease(t *testing.T) {
	db := pipelinetest.New(t)
	writeNotices(t, db.URL, 1)
	now := time.Now()
	take := func(at time.Time) *store.DueNotice {
		n, err := db.TakeNotice(t.Context(), at, time.Minute, nil)
		if err != nil {
			t.Fatal(err)
		}
		return n
	}
	first := take(now)
	if n := take(now.Add(59 * time.Second)); n != nil {
		t.Fatalf("%+v is taken while in hand", n)
	}
	second := take(now.Add(time.Minute))
	if second == nil || second.Key != first.Key || second.Attempt != 2 || string(second.Content) != string(first.Content) {
		t.Fatalf("%+v", second)
	}
	end := func(n *store.DueNotice, e store.AttemptEnd) {
		t.Helper()
		e.At = now.Add(61 * time.Second)
		if err := db.EndAttempt(t.Context(), n, e, "", nil); err != nil {
			t.Fatal(err)
		}
	}
	state := func() string {
		return fmt.Sprint(db.Rows(t, `select attempts, leased_until is not null, delivered_at is not null, given_up_at is not null from thaw.notices`))
	}
	end(first, store.AttemptEnd{GiveUp: "late", Answer: "late"})
	if got := state(); got != "[(2,t,f,f)]" {
		t.Errorf("after the first's late failure: %s", got)
	}
	end(first, store.AttemptEnd{Delivered: true})
	end(second, store.AttemptEnd{GiveUp: "too late"})
	if got := state(); got != "[(2,f,t,f)]" {
		t.Errorf("after the first's late delivery: %s", got)
	}
}

// slow is a channel that takes its time.
type slow struct {
	began  chan string
	finish chan struct{}
}

func (s *slow) Deliver(ctx context.Context, n delivery.Notice) delivery.Outcome {
	s.began <- n.Key
	select {
	case <-s.finish:
		return delivery.Taken("")
	case <-ctx.Done():
		return delivery.Failed(true, "broken off")
	}
}

// A sender that is to stop finishes what it has in hand and begins nothing more;
// broken off, it leaves the notice to be sent again.
func TestSoftStop(t *testing.T) {
	for _, broken := range []bool{false, true} {
		t.Run(fmt.Sprint("broken off: ", broken), func(t *testing.T) {
			db := pipelinetest.New(t)
			writeNotices(t, db.URL, 5)
			ch := &slow{began: make(chan string, 9), finish: make(chan struct{})}
			s := New(Config{DB: db.DB, Channels: map[string]delivery.Channel{"hook": ch}, Recipients: everyone(), Log: zap.NewNop(), Now: time.Now, Workers: 2, Poll: 5 * time.Millisecond})
			intake, stop := context.WithCancel(t.Context())
			work, breakOff := context.WithCancel(t.Context())
			defer breakOff()
			defer stop()
			done := make(chan error, 1)
			go func() { done <- s.Run(intake, work) }()
			<-ch.began
			<-ch.began
			stop()
			want := "[(2,0)]" // attempts that ended as delivered, notices in hand
			if broken {
				breakOff()
				want = "[(0,0)]"
			} else {
				close(ch.finish)
			}
			if err := <-done; err != nil {
				t.Error(err)
			}
			got := fmt.Sprint(db.Rows(t, `select (select count(*) from thaw.notices where delivered_at is not null), (select count(*) from thaw.notices where leased_until is not null)`))
			if got != want || len(ch.began) > 0 {
				t.Errorf("%s, want %s; %d more begun", got, want, len(ch.began))
			}
			attempts := fmt.Sprint(db.Rows(t, `select count(*), count(outcome) from thaw.notice_attempts`))
			if attempts != "[(2,2)]" {
				t.Errorf("attempts %s", attempts)
			}
		})
	}
}

// A recipient gets so many messages at once, and then one at a time.
func TestRate(t *testing.T) {
	db := pipelinetest.New(t)
	writeNotices(t, db.URL, 5*people)
	now := time.Now().Add(time.Second)
	ch := &slow{began: make(chan string, 1000), finish: make(chan struct{})}
	close(ch.finish)
	s := New(Config{DB: db.DB, Channels: map[string]delivery.Channel{"hook": ch}, Recipients: everyone(), Log: zap.NewNop(), Now: func() time.Time { return now }, Burst: 3, Every: time.Minute})
	for i, want := range []int{3 * people, 0, people, people} {
		switch i {
		case 1:
			now = now.Add(59 * time.Second)
		case 2:
			now = now.Add(time.Second)
		case 3:
			now = now.Add(time.Minute)
		}
		if err := s.DeliverDue(t.Context()); err != nil {
			t.Fatal(err)
		}
		if n := len(ch.began); n != want {
			t.Errorf("look %d: %d sent, want %d", i, n, want)
		}
		for len(ch.began) > 0 {
			<-ch.began
		}
	}
}

// What the settings no longer have is told to nobody, on record.
func TestRecipientsGone(t *testing.T) {
	db := pipelinetest.New(t)
	writeNotices(t, db.URL, 2*people)
	left := []store.Hearer{{Recipient: "r1", Channel: "hook"}, {Recipient: "r2", Channel: "other"}}
	if err := db.DropWaiting(t.Context(), left, time.Now()); err != nil {
		t.Fatal(err)
	}
	got := fmt.Sprint(db.Rows(t, `select recipient, count(*) from thaw.notices where given_up_at is null group by 1`))
	if got != "[(r1,2)]" {
		t.Errorf("left: %s", got)
	}
}

// A CAP channel's messages are served from the database, the same after a repeat.
func TestFeedFromTheDatabase(t *testing.T) {
	db := pipelinetest.New(t)
	settings := capfeed.Settings{Sender: "thaw@agency.example", SenderName: "Agency", Restriction: "staff", BaseURL: "https://agency.example/cap/",
		FeedID: "tag:agency.example,2031:thaw", Title: "Thaw", Now: time.Now}
	texts, err := text.Load("")
	if err != nil {
		t.Fatal(err)
	}
	shelf := Shelf{DB: db.DB, Channel: "feed", Now: time.Now}
	ch, err := capfeed.New(settings, texts, shelf)
	if err != nil {
		t.Fatal(err)
	}
	notice := delivery.Samples()[0]
	for range 2 {
		if out := ch.Deliver(t.Context(), notice); !out.Delivered {
			t.Fatalf("%+v", out)
		}
	}
	other := notice
	other.Items = slices.Clone(notice.Items)
	other.Items[0].Instruction = "Something else."
	if out := ch.Deliver(t.Context(), other); out.Delivered || out.Again {
		t.Errorf("another message by the same key: %+v", out)
	}
	ctx, stop := context.WithCancel(t.Context())
	at, done := make(chan net.Addr, 1), make(chan error, 1)
	go func() {
		done <- ServeFeed(ctx, "127.0.0.1:0", settings, shelf, zap.NewNop(), func(a net.Addr) { at <- a })
	}()
	base := "http://" + (<-at).String() + "/cap/"
	get := func(url string) string {
		t.Helper()
		q, err := http.NewRequestWithContext(t.Context(), http.MethodGet, url, nil)
		if err != nil {
			t.Fatal(err)
		}
		client := &http.Client{Transport: &http.Transport{DisableKeepAlives: true}}
		r, err := client.Do(q)
		if err != nil {
			t.Fatal(err)
		}
		defer r.Body.Close()
		body, err := io.ReadAll(r.Body)
		if err != nil || r.StatusCode != http.StatusOK {
			t.Fatalf("%s: %s %v", url, r.Status, err)
		}
		return string(body)
	}
	feed := get(base + "feed.atom")
	id := notice.Key + "~" + notice.Items[0].About
	if strings.Count(feed, "<entry>") != 1 || !strings.Contains(feed, id) {
		t.Error(feed)
	}
	if m := get(base + id + ".xml"); !strings.Contains(m, "<identifier>"+id+"</identifier>") || strings.Contains(m, "Something else") {
		t.Error(m)
	}
	stop()
	if err := <-done; err != nil {
		t.Error(err)
	}
}
