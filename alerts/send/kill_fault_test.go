package send

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"math/rand/v2"
	"net/http"
	"net/http/httptest"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"strconv"
	"sync"
	"syscall"
	"testing"
	"time"

	"github.com/jackc/pgx/v5"
	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
	"thawledger/alerts/delivery/webhook"
	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// What the process that is killed is told by its environment.
const (
	childDatabase = "THAWLEDGER_TEST_SENDER_DATABASE"
	childReceiver = "THAWLEDGER_TEST_SENDER_RECEIVER"
	childSecret   = "THAWLEDGER_TEST_SENDER_SECRET"
)

const people = 20

// child is a process that sends until it is killed or told to stop.
func child() {
	ctx, stop := signal.NotifyContext(context.Background(), syscall.SIGTERM)
	defer stop()
	texts, err := text.Load("")
	must(err)
	hook, err := webhook.New(webhook.Settings{Address: os.Getenv(childReceiver), WhyNone: "a test", SecretFile: os.Getenv(childSecret), Now: time.Now}, texts)
	must(err)
	db, err := store.Open(ctx, os.Getenv(childDatabase), zap.NewNop())
	must(err)
	defer db.Close()
	s := New(Config{DB: db, Channels: map[string]delivery.Channel{"hook": hook}, Recipients: everyone(), Log: zap.NewNop(), Now: time.Now,
		Poll: 20 * time.Millisecond, Timeout: 5 * time.Second, Lease: time.Second, Base: 2 * time.Millisecond, Most: 50 * time.Millisecond,
		Every: time.Microsecond, Burst: 1000})
	must(s.Run(ctx, context.Background()))
}

func must(err error) {
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(3)
	}
}

func everyone() (out []pipeline.Recipient) {
	for i := range people {
		out = append(out, pipeline.Recipient{ID: fmt.Sprint("r", i), Zone: time.UTC, Hears: []pipeline.Hearing{{Channels: []string{"hook"}}}})
	}
	return out
}

// writeNotices writes notices, in turn to everyone.
func writeNotices(t *testing.T, url string, n int) {
	t.Helper()
	sample := delivery.Samples()[0]
	for i := range sample.Items {
		sample.Items[i].Chart = nil
	}
	body, err := json.Marshal(content{Version: contentVersion, Recipient: recipient{Name: "Duty", Unit: pipeline.DegCDays, Zone: "UTC"}, Items: sample.Items})
	if err != nil {
		t.Fatal(err)
	}
	conn, err := pgx.Connect(t.Context(), url)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close(context.WithoutCancel(t.Context()))
	now := time.Now()
	_, err = conn.Exec(t.Context(), `insert into thaw.notices (key, message_id, recipient, channel, kind, content, written_at, due_at, next_attempt_at)
		select 'k-' || i, i, 'r' || i % $2, 'hook', 'news', $3, $4, $4, $4 from generate_series(1, $1::int) i`, n, people, body, now)
	if err != nil {
		t.Fatal(err)
	}
}

// receiver fails half the time, and kills the sender at times: before it has
// taken a notice, or after that and before it says so.
type receiver struct {
	mu     sync.Mutex
	random *rand.Rand
	taken  map[string]int    // by key: how often
	bodies map[string]string // by key
	order  map[string][]int  // by recipient: numbers of notices as first taken
	faults []error
	kill   func() // set while a child is to be killed
	after  int    // requests until then
}

func (r *receiver) ServeHTTP(w http.ResponseWriter, q *http.Request) {
	body, err := io.ReadAll(q.Body)
	if err != nil {
		return // killed while it was sending
	}
	r.mu.Lock()
	defer r.mu.Unlock()
	key := q.Header.Get(webhook.KeyHeader)
	if r.kill != nil {
		r.after--
	}
	kill := r.kill != nil && r.after <= 0
	fate := r.random.IntN(8)
	if kill && fate < 4 {
		r.kill()
		return
	}
	switch {
	case fate == 0:
		w.WriteHeader(http.StatusServiceUnavailable)
		return
	case fate == 1:
		w.WriteHeader(http.StatusTooManyRequests)
		return
	case fate == 2:
		panic(http.ErrAbortHandler) // closes the connection without an answer
	}
	if r.taken[key]++; r.taken[key] == 1 {
		n, err := strconv.Atoi(key[2:])
		if err != nil {
			r.faults = append(r.faults, err)
		}
		to := fmt.Sprint("r", n%people)
		r.order[to] = append(r.order[to], n)
		r.bodies[key] = string(body)
	} else if r.bodies[key] != string(body) {
		r.faults = append(r.faults, fmt.Errorf("%s came with another body", key))
	}
	if kill {
		r.kill()
		return
	}
	if fate == 3 {
		panic(http.ErrAbortHandler) // taken, and nobody knows
	}
}

// Whatever is killed, and however often: no notice is lost, a repeat has the same
// key and the same words, and everybody gets theirs in order. The count of
// notices and kills can be raised by the environment.
func TestKilledSenderLosesNothing(t *testing.T) {
	number := func(name string, otherwise int) int {
		if n, err := strconv.Atoi(os.Getenv(name)); err == nil {
			return n
		}
		return otherwise
	}
	notices, kills := number("THAWLEDGER_TEST_NOTICES", 300), number("THAWLEDGER_TEST_KILLS", 6)
	db := pipelinetest.New(t)
	writeNotices(t, db.URL, notices)
	secret := filepath.Join(t.TempDir(), "secret")
	if err := os.WriteFile(secret, []byte("0123456789abcdef0123456789abcdef"), 0o600); err != nil {
		t.Fatal(err)
	}
	r := &receiver{random: rand.New(rand.NewPCG(1, 2)), taken: map[string]int{}, bodies: map[string]string{}, order: map[string][]int{}}
	web := httptest.NewServer(r)
	defer web.Close()
	start := func() *exec.Cmd {
		c := exec.CommandContext(t.Context(), os.Args[0])
		c.Env = append(os.Environ(), childDatabase+"="+db.URL, childReceiver+"="+web.URL, childSecret+"="+secret)
		c.Stderr = os.Stderr
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		return c
	}
	for range kills {
		c := start()
		r.mu.Lock()
		r.after = notices / kills / 2
		r.kill = func() {
			r.kill = nil
			_ = c.Process.Kill()
		}
		r.mu.Unlock()
		err := c.Wait()
		if exit := new(exec.ExitError); !errors.As(err, &exit) || exit.Sys().(syscall.WaitStatus).Signal() != syscall.SIGKILL {
			t.Fatalf("the sender ended by itself: %v", err)
		}
	}
	last := start()
	limit := time.NewTimer(5 * time.Minute)
	defer limit.Stop()
	for fmt.Sprint(db.Rows(t, `select count(*) from thaw.notices where delivered_at is null`)) != "[(0)]" {
		select {
		case <-limit.C:
			t.Fatal("not all is delivered")
		case <-time.After(50 * time.Millisecond):
		}
	}
	if err := last.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	if err := last.Wait(); err != nil {
		t.Errorf("the last sender did not stop softly: %v", err)
	}
	r.mu.Lock()
	defer r.mu.Unlock()
	repeated := 0
	for i := range notices {
		n := r.taken[fmt.Sprint("k-", i+1)]
		if n == 0 {
			t.Errorf("notice %d is marked as delivered and never came", i+1)
		}
		repeated += n - 1
	}
	if len(r.taken) != notices || len(r.faults) > 0 {
		t.Errorf("%d keys for %d notices; %v", len(r.taken), notices, r.faults)
	}
	for to, list := range r.order {
		for i := 1; i < len(list); i++ {
			if list[i] < list[i-1] {
				t.Errorf("%s got %d after %d", to, list[i], list[i-1])
			}
		}
	}
	// Each kill leaves attempts of which nobody knows what came.
	open := db.Rows(t, `select count(*) >= $1 from thaw.notice_attempts where ended_at is null`, kills)
	if fmt.Sprint(open) != "[(t)]" {
		t.Error("attempts broken off by kills are not on record")
	}
	same := db.Rows(t, `select n.notice_id from thaw.notices n where attempts <> (select count(*) from thaw.notice_attempts a where a.notice_id = n.notice_id)
		or 1 <> (select count(*) from thaw.notice_attempts a where a.notice_id = n.notice_id and outcome = 'delivered')`)
	if len(same) > 0 {
		t.Errorf("history does not add up: %v", same)
	}
	t.Logf("%d notices, %d kills, %d repeats", notices, kills, repeated)
}
