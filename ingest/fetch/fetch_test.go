package fetch

import (
	"bytes"
	"context"
	"fmt"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func fetcher(t *testing.T, c Config) *Fetcher {
	t.Helper()
	if c.Folder == "" {
		c.Folder = filepath.Join(t.TempDir(), "copy")
	}
	c.Pause = func(ctx context.Context, d time.Duration) error { return ctx.Err() }
	f, err := New(c)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(f.Close)
	return f
}

func serve(t *testing.T, h http.HandlerFunc) *httptest.Server {
	t.Helper()
	s := httptest.NewServer(h)
	t.Cleanup(s.Close)
	return s
}

func (f *Fetcher) holds(t *testing.T) string {
	t.Helper()
	text, err := os.ReadFile(f.Path())
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// remote is a file on a server that knows ranges and conditions (net/http's own).
type remote struct {
	text  string
	at    time.Time
	asked []string // Range headers
	sent  int
}

func (r *remote) ServeHTTP(w http.ResponseWriter, q *http.Request) {
	r.asked = append(r.asked, q.Header.Get("Range"))
	count := &counted{ResponseWriter: w}
	http.ServeContent(count, q, "log.csv", r.at, strings.NewReader(r.text))
	r.sent += count.n
}

type counted struct {
	http.ResponseWriter
	n int
}

func (c *counted) Write(p []byte) (int, error) {
	c.n += len(p)
	return c.ResponseWriter.Write(p)
}

// Only what is new is sent; a file that was cut or written anew is fetched whole.
func TestFetch(t *testing.T) {
	for _, grows := range []bool{false, true} {
		r := &remote{text: strings.Repeat("line\n", 1000), at: time.Date(2031, 1, 1, 0, 0, 0, 0, time.UTC)}
		s := serve(t, r.ServeHTTP)
		f := fetcher(t, Config{URL: s.URL + "/data/log.csv?key=secret", Grows: grows})
		for i, step := range []struct {
			change  func()
			changed bool
			most    int // bytes sent, where the file grows
		}{
			{func() {}, true, 5000},
			{func() {}, false, 0},
			{func() { r.text += "more\n" }, true, 1024 + 5},
			{func() { r.text = "another\n" + r.text[8:] }, true, 1024}, // not seen: the last KiB is the same
			{func() { r.text = strings.Repeat("LINE\n", 1001) }, true, 6100},
			{func() { r.text = "short\n" }, true, 6 + 40}, // the server says why it has no such range
			{func() { r.text += "and on\n" }, true, 13},
		} {
			step.change()
			r.at, r.sent = r.at.Add(time.Duration(min(i, 1))*time.Minute), 0
			if i == 1 {
				r.at = r.at.Add(-time.Minute) // unchanged
			}
			changed, err := f.Fetch(t.Context())
			if err != nil {
				t.Fatal(err)
			}
			if grows && i == 3 {
				if changed || r.sent > step.most {
					t.Errorf("rewritten before its end: changed %t, %d bytes", changed, r.sent)
				}
				continue
			}
			if got := f.holds(t); changed != step.changed || got != r.text {
				t.Errorf("grows %t, step %d: changed %t, %d bytes there, %d remote", grows, i, changed, len(got), len(r.text))
			}
			if grows && r.sent > step.most {
				t.Errorf("step %d: %d bytes sent; at most %d are new (%v)", i, r.sent, step.most, r.asked)
			}
		}
		if info, err := os.Stat(f.Path()); err != nil || filepath.Base(f.Path()) != "log.csv" || !info.ModTime().Equal(r.at) {
			t.Errorf("copy %s of %v, %v", f.Path(), info.ModTime(), err)
		}
	}
}

// Servers that misbehave give an error that says how, leave no half copy, and
// trouble that may pass is tried again.
func TestServersThatMisbehave(t *testing.T) {
	hang := make(chan struct{})
	t.Cleanup(func() { close(hang) })
	wait := func(r *http.Request) {
		select {
		case <-hang:
		case <-r.Context().Done():
		}
	}
	for _, c := range []struct {
		name      string
		handler   http.HandlerFunc
		says      string
		temporary bool
		tries     int32
	}{
		{"stalls before the answer", func(w http.ResponseWriter, r *http.Request) { wait(r) }, "no answer within", true, 3},
		{"stalls in the body", func(w http.ResponseWriter, r *http.Request) {
			fmt.Fprint(w, "half\n")
			w.(http.Flusher).Flush()
			wait(r)
		}, "nothing came for", true, 3},
		{"says more than comes", func(w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Content-Length", "100")
			fmt.Fprint(w, "short\n")
		}, "unexpected EOF", true, 3},
		{"too large, and says so", func(w http.ResponseWriter, r *http.Request) {
			w.Header().Set("Content-Length", "2000000")
			_, _ = w.Write(make([]byte, 2000000))
		}, "more than the 100000 bytes", false, 1},
		{"too large, and does not say so", func(w http.ResponseWriter, r *http.Request) {
			for range 300 {
				if _, err := w.Write(make([]byte, 1000)); err != nil {
					return
				}
				w.(http.Flusher).Flush()
			}
		}, "more than the 100000 bytes", false, 1},
		{"redirects for ever", func(w http.ResponseWriter, r *http.Request) { http.Redirect(w, r, "/x", http.StatusFound) }, "more than five", false, 1},
		{"not found", func(w http.ResponseWriter, r *http.Request) { http.NotFound(w, r) }, "check the address", false, 1},
		{"not allowed", func(w http.ResponseWriter, r *http.Request) { w.WriteHeader(401) }, "check user and password_file", false, 1},
		{"broken", func(w http.ResponseWriter, r *http.Request) { w.WriteHeader(503) }, "503", true, 3},
		{"partial, not asked for", func(w http.ResponseWriter, r *http.Request) { w.WriteHeader(206) }, "206", false, 1},
		{"closes at once", func(w http.ResponseWriter, r *http.Request) {
			conn, _, err := w.(http.Hijacker).Hijack()
			if err == nil {
				conn.Close()
			}
		}, "ask 127.0.0.1", true, 3},
	} {
		t.Run(c.name, func(t *testing.T) {
			var asked atomic.Int32
			s := serve(t, func(w http.ResponseWriter, r *http.Request) {
				if r.URL.Path == "/log.csv" {
					asked.Add(1)
				}
				c.handler(w, r)
			})
			f := fetcher(t, Config{URL: s.URL + "/log.csv?key=secret", Timeout: 300 * time.Millisecond, Stall: 100 * time.Millisecond, MaxBytes: 100000})
			changed, err := f.Fetch(t.Context())
			if err == nil || changed || !strings.Contains(err.Error(), c.says) || Temporary(err) != c.temporary || strings.Contains(err.Error(), "secret") {
				t.Errorf("changed %t, %v (temporary %t); want %q (%t)", changed, err, Temporary(err), c.says, c.temporary)
			}
			if n := asked.Load(); n != c.tries {
				t.Errorf("asked %d times; want %d", n, c.tries)
			}
			if left, _ := filepath.Glob(filepath.Join(f.Folder+"*", "*")); len(left) > 0 {
				t.Errorf("left behind: %v", left)
			}
		})
	}
}

// A wrong range for a file that grows is an error and changes nothing.
func TestRangesThatAreWrong(t *testing.T) {
	for _, c := range []struct{ name, contentRange, body string }{
		{"elsewhere", "bytes 0-9/20", "0123456789"}, {"none", "", "x"}, {"no numbers", "bytes x-y/z", "x"}, {"shorter", "bytes 5-9/3", "x"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := serve(t, func(w http.ResponseWriter, r *http.Request) {
				if r.Header.Get("Range") == "" {
					fmt.Fprint(w, strings.Repeat("0123456789", 200))
					return
				}
				w.Header().Set("Content-Range", c.contentRange)
				w.WriteHeader(206)
				fmt.Fprint(w, c.body)
			})
			f := fetcher(t, Config{URL: s.URL + "/log.csv", Grows: true})
			if _, err := f.Fetch(t.Context()); err != nil {
				t.Fatal(err)
			}
			before := f.holds(t)
			if _, err := f.Fetch(t.Context()); err == nil || !strings.Contains(err.Error(), "the range") || f.holds(t) != before {
				t.Errorf("%v, %d bytes", err, len(f.holds(t)))
			}
		})
	}
}

// Credentials are read at each request, go to their host only, and stay out of errors.
func TestCredentials(t *testing.T) {
	var elsewhere string
	other := serve(t, func(w http.ResponseWriter, r *http.Request) {
		elsewhere = r.Header.Get("Authorization")
		fmt.Fprint(w, "x\n")
	})
	var got []string
	s := serve(t, func(w http.ResponseWriter, r *http.Request) {
		got = append(got, r.Header.Get("Authorization"))
		http.Redirect(w, r, strings.Replace(other.URL, "127.0.0.1", "localhost", 1)+"/moved.csv", http.StatusFound)
	})
	file := filepath.Join(t.TempDir(), "token")
	f := fetcher(t, Config{URL: s.URL + "/log.csv", BearerFile: file})
	if _, err := f.Fetch(t.Context()); err == nil || !strings.Contains(err.Error(), "read credentials") {
		t.Errorf("without its file: %v", err)
	}
	for _, token := range []string{"first", "second"} {
		if err := os.WriteFile(file, []byte(token+"\n"), 0o600); err != nil {
			t.Fatal(err)
		}
		if _, err := f.Fetch(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
	if len(got) != 2 || got[0] != "Bearer first" || got[1] != "Bearer second" || elsewhere != "" {
		t.Errorf("sent %v, and %q to another host", got, elsewhere)
	}
	basic := fetcher(t, Config{URL: s.URL + "/log.csv", User: "fell", PasswordFile: file})
	if _, err := basic.Fetch(t.Context()); err != nil || got[2] != "Basic ZmVsbDpzZWNvbmQ=" { // fell:second, RFC 7617
		t.Errorf("%v, %v", got, err)
	}
}

// From https to http is refused.
func TestNoWayDown(t *testing.T) {
	plain := serve(t, func(w http.ResponseWriter, r *http.Request) { fmt.Fprint(w, "x\n") })
	s := httptest.NewTLSServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) { http.Redirect(w, r, plain.URL, http.StatusFound) }))
	t.Cleanup(s.Close)
	f := fetcher(t, Config{URL: s.URL + "/log.csv"})
	f.client.Transport = s.Client().Transport
	if _, err := f.Fetch(t.Context()); err == nil || !strings.Contains(err.Error(), "from https to http") || Temporary(err) {
		t.Errorf("%v", err)
	}
}

// One request goes to a host at a time.
func TestOneAtATime(t *testing.T) {
	var now, most atomic.Int32
	s := serve(t, func(w http.ResponseWriter, r *http.Request) {
		if n := now.Add(1); n > most.Load() {
			most.Store(n)
		}
		fmt.Fprint(w, "x\n")
		now.Add(-1)
	})
	hosts := &Hosts{}
	done := make(chan error)
	for i := range 8 {
		f := fetcher(t, Config{URL: fmt.Sprintf("%s/%d.csv", s.URL, i), Hosts: hosts})
		go func() { _, err := f.Fetch(t.Context()); done <- err }()
	}
	for range 8 {
		if err := <-done; err != nil {
			t.Error(err)
		}
	}
	if most.Load() != 1 {
		t.Errorf("%d at a time", most.Load())
	}
}

func TestAddresses(t *testing.T) {
	for _, address := range []string{"", "log.csv", "ftp://host/x", "http://", "http://%zz"} {
		if _, err := New(Config{URL: address}); err == nil {
			t.Errorf("%q is taken", address)
		}
	}
	for address, want := range map[string]string{
		"http://h/a/log.csv?x=1": "log.csv", "http://h/": "fetched.csv", "http://h": "fetched.csv", "http://h/a%2F..%2F..%2Fetc": "etc",
		"http://h/..": "fetched.csv", "http://h/.hidden": "hidden", "http://h/a%00b": "a-b",
	} {
		f := fetcher(t, Config{URL: address})
		if got := filepath.Base(f.Path()); got != want {
			t.Errorf("%s is kept as %s; want %s", address, got, want)
		}
	}
	if bytes.ContainsRune([]byte(fetcher(t, Config{URL: "http://h/" + strings.Repeat("x", 500)}).name), '/') {
		t.Error("a path leaves the folder")
	}
}
