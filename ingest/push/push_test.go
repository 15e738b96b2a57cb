package push

import (
	"context"
	"errors"
	"io"
	"net"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"
	"unicode/utf8"

	"go.uber.org/goleak"
	"go.uber.org/zap"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

var noon = time.Date(2031, 7, 1, 12, 0, 0, 0, time.UTC)

// taker remembers what it was given, and answers as it is told.
type taker struct {
	got  []Delivery
	text string
	out  Outcome
	err  error
	// for many at once: each says that it has come, and waits to go on
	arrived, on chan struct{}
	mu          sync.Mutex
}

func (k *taker) deliver(ctx context.Context, d Delivery) (Outcome, error) {
	text, err := io.ReadAll(d.Body)
	if err != nil {
		return Outcome{}, err
	}
	if k.arrived != nil {
		k.arrived <- struct{}{}
		<-k.on
	}
	k.mu.Lock()
	defer k.mu.Unlock()
	k.got, k.text = append(k.got, d), string(text)
	return k.out, k.err
}

func handler(t *testing.T, k *taker) *Handler {
	t.Helper()
	file := filepath.Join(t.TempDir(), "token")
	if err := os.WriteFile(file, []byte("fell token\n"), 0o600); err != nil {
		t.Fatal(err)
	}
	return NewHandler(Handler{Feeds: map[string]Feed{"fell": {file, 100}, "lost": {file + "x", 100}}, Deliver: k.deliver,
		Now: func() time.Time { return noon }, Log: zap.NewNop()})
}

func TestPush(t *testing.T) {
	for _, c := range []struct {
		name, method, path, token string
		header                    map[string]string
		body                      string
		out                       Outcome
		err                       error
		status                    int
		says                      string
	}{
		{name: "read", out: Outcome{Batch: 7, State: "read", Rows: 3, RowsRead: 2, RowsSetAside: 1}, status: 201, says: `"batch":7,"state":"read","rows":3,"rows_read":2,"rows_without_value":0,"rows_set_aside":1`},
		{name: "known", out: Outcome{State: "known"}, status: 200, says: `"state":"known"`},
		{name: "held back", out: Outcome{Batch: 8, State: "held_back", Reason: "why"}, status: 202, says: `"reason":"why"`},
		{name: "trouble", err: errors.New("secret detail"), status: 503, says: "try again"},
		{name: "too large", body: strings.Repeat("x", 101), status: 413, says: "100 bytes"},
		{name: "no token", token: "-", status: 401, says: "no such feed, or not its token"},
		{name: "wrong token", token: "tarn token", status: 401, says: "no such feed, or not its token"},
		{name: "no such feed", path: "/feeds/tarn", status: 401, says: "no such feed, or not its token"},
		{name: "token file gone", path: "/feeds/lost", status: 401, says: "no such feed"},
		{name: "method", method: "GET", status: 405, says: "use POST"},
		{name: "path", path: "/feeds/fell/x", status: 404, says: "/feeds/NAME"},
		{name: "elsewhere", path: "/", status: 404, says: "/feeds/NAME"},
		{name: "time", header: map[string]string{"X-File-Time": "yesterday"}, status: 400, says: "X-File-Time"},
	} {
		t.Run(c.name, func(t *testing.T) {
			k := &taker{out: c.out, err: c.err}
			s := httptest.NewServer(handler(t, k))
			defer s.Close()
			method, path, token, body := "POST", "/feeds/fell", "fell token", "a,b\n"
			for _, set := range []struct {
				to   *string
				from string
			}{{&method, c.method}, {&path, c.path}, {&token, c.token}, {&body, c.body}} {
				if set.from != "" {
					*set.to = set.from
				}
			}
			req, err := http.NewRequestWithContext(t.Context(), method, s.URL+path, strings.NewReader(body))
			if err != nil {
				t.Fatal(err)
			}
			if token != "-" {
				req.Header.Set("Authorization", "Bearer "+token)
			}
			for name, value := range c.header {
				req.Header.Set(name, value)
			}
			got, err := s.Client().Do(req)
			if err != nil {
				t.Fatal(err)
			}
			defer got.Body.Close()
			text, _ := io.ReadAll(got.Body)
			if got.StatusCode != c.status || !strings.Contains(string(text), c.says) || strings.Contains(string(text), "secret") {
				t.Errorf("%s %s; want %d and %q", got.Status, text, c.status, c.says)
			}
			if taken := len(k.got) > 0; taken != (c.out.State != "" || c.err != nil) {
				t.Errorf("taken: %t", taken)
			}
		})
	}
}

func TestNamesAndTimes(t *testing.T) {
	k := &taker{out: Outcome{State: "read"}}
	h := handler(t, k)
	for given, want := range map[string]string{
		"fell_2031.csv": "fell_2031.csv", "": "pushed-20310701T120000.000000000.csv", "../../etc/passwd": "passwd", `C:\data\a.csv`: "a.csv",
		"..": "pushed-20310701T120000.000000000.csv", ".hidden": "hidden", "a/b/": "b", strings.Repeat("é", 150): strings.Repeat("é", 100),
	} {
		if got := fileName(given, noon); got != want || !utf8.ValidString(got) {
			t.Errorf("%q becomes %q; want %q", given, got, want)
		}
	}
	req := httptest.NewRequest("POST", "/feeds/fell", strings.NewReader("a,b\n"))
	req.Header.Set("Authorization", "Bearer fell token")
	req.Header.Set("X-File-Time", "2031-06-30T10:00:00-08:00")
	req.Header.Set("X-File-Name", "a.csv")
	h.ServeHTTP(httptest.NewRecorder(), req)
	if len(k.got) != 1 || k.got[0].Name != "a.csv" || !k.got[0].SourceTime.Equal(time.Date(2031, 6, 30, 18, 0, 0, 0, time.UTC)) || k.text != "a,b\n" {
		t.Errorf("given %+v, %q", k.got, k.text)
	}
}

// Some at a time are taken, and the next is told to come again.
func TestManyAtOnce(t *testing.T) {
	k := &taker{out: Outcome{State: "read"}, arrived: make(chan struct{}), on: make(chan struct{})}
	h := handler(t, k)
	post := func() int {
		req, w := httptest.NewRequest("POST", "/feeds/fell", strings.NewReader("a\n")), httptest.NewRecorder()
		req.Header.Set("Authorization", "Bearer fell token")
		h.ServeHTTP(w, req)
		return w.Code
	}
	codes := make(chan int)
	for range atATime {
		go func() { codes <- post() }()
		<-k.arrived
	}
	if code := post(); code != 503 {
		t.Errorf("one more: %d", code)
	}
	for range atATime {
		k.on <- struct{}{}
		if code := <-codes; code != 201 {
			t.Errorf("%d", code)
		}
	}
}

// A body that stops coming does not hold its place for ever.
func TestSlowBody(t *testing.T) {
	k := &taker{out: Outcome{State: "read"}}
	h := handler(t, k)
	h.BodyTime = 50 * time.Millisecond
	s := httptest.NewServer(h)
	defer s.Close()
	r, w := io.Pipe()
	defer w.Close()
	req, err := http.NewRequestWithContext(t.Context(), "POST", s.URL+"/feeds/fell", r)
	if err != nil {
		t.Fatal(err)
	}
	req.Header.Set("Authorization", "Bearer fell token")
	got, err := s.Client().Do(req)
	if err != nil {
		t.Fatal(err)
	}
	defer got.Body.Close()
	if got.StatusCode != 408 || len(k.got) != 0 {
		t.Errorf("%s, taken %v", got.Status, k.got)
	}
}

func TestRun(t *testing.T) {
	if err := (Server{Address: "0.0.0.0:0"}).Run(t.Context(), nil); err == nil || !strings.Contains(err.Error(), "unencrypted") {
		t.Errorf("%v", err)
	}
	ctx, stop := context.WithCancel(t.Context())
	at, ended := make(chan net.Addr), make(chan error)
	go func() {
		ended <- Server{Address: "127.0.0.1:0", Handler: handler(t, &taker{})}.Run(ctx, func(a net.Addr) { at <- a })
	}()
	client := &http.Client{Transport: &http.Transport{DisableKeepAlives: true}}
	got, err := client.Get("http://" + (<-at).String() + "/feeds/fell")
	if err != nil {
		t.Fatal(err)
	}
	got.Body.Close()
	if got.StatusCode != 405 {
		t.Errorf("%s", got.Status)
	}
	stop()
	if err := <-ended; err != nil {
		t.Error(err)
	}
}
