package fetch

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"net/http"
	"net/url"
	"os"
	"path"
	"path/filepath"
	"strconv"
	"strings"
	"time"
)

// Config says what to fetch.
type Config struct {
	URL          string
	User         string // with PasswordFile: basic authentication
	PasswordFile string
	BearerFile   string
	Folder       string        // where the copy is kept, and nothing else; what is remembered of it lies beside, in Folder.state
	Grows        bool          // lines are only ever added to the file
	Timeout      time.Duration // of one request; 1 minute if zero
	Stall        time.Duration // a body may stop coming for so long; 20 s if zero
	MaxBytes     int64         // of the file; 1 GiB if zero
	Tries        int           // for temporary trouble; 3 if zero
	Hosts        *Hosts
	// Pause waits between tries; nil to wait by the clock.
	Pause func(ctx context.Context, d time.Duration) error
}

// Fetcher keeps one file up to date.
type Fetcher struct {
	Config
	client *http.Client
	host   string
	name   string
}

// New checks the address.
func New(c Config) (*Fetcher, error) {
	u, err := url.Parse(c.URL)
	if err != nil || u.Host == "" || u.Scheme != "http" && u.Scheme != "https" {
		return nil, errors.New("the address is none of http:// or https:// with a host")
	}
	f := &Fetcher{Config: c, host: u.Host, name: localName(u)}
	f.Timeout, f.Stall = cmpOr(f.Timeout, time.Minute), cmpOr(f.Stall, 20*time.Second)
	f.MaxBytes, f.Tries = cmpOr(f.MaxBytes, 1<<30), cmpOr(f.Tries, 3)
	if f.Hosts == nil {
		f.Hosts = &Hosts{}
	}
	if f.Pause == nil {
		f.Pause = pause
	}
	f.client = &http.Client{Transport: transport(), CheckRedirect: redirect}
	return f, nil
}

func cmpOr[T comparable](v, otherwise T) T {
	var zero T
	if v == zero {
		return otherwise
	}
	return v
}

// localName is the last part of the address's path, as a file may be called.
func localName(u *url.URL) string {
	name := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f || strings.ContainsRune(`/\:`, r) {
			return '-'
		}
		return r
	}, path.Base(u.Path))
	name = strings.TrimLeft(name, ".-")
	if len(name) > 200 {
		name = name[:200]
	}
	if name == "" {
		return "fetched.csv"
	}
	return name
}

// Path is where the copy lies.
func (f *Fetcher) Path() string { return filepath.Join(f.Folder, f.name) }

// Close lets connections go.
func (f *Fetcher) Close() { f.client.CloseIdleConnections() }

// Fetch brings the copy up to date and says whether it changed.
func (f *Fetcher) Fetch(ctx context.Context) (changed bool, err error) {
	for _, folder := range []string{f.Folder, f.stateFolder()} {
		if err := os.MkdirAll(folder, 0o750); err != nil {
			return false, fmt.Errorf("make folder of the copy: %w", err)
		}
	}
	release, err := f.Hosts.take(ctx, f.host)
	if err != nil {
		return false, err
	}
	defer release()
	for try := 1; ; try++ {
		changed, err = f.once(ctx)
		var t *temporaryError
		if err == nil || !errors.As(err, &t) || try >= f.Tries || ctx.Err() != nil {
			return changed, err
		}
		if err := f.Pause(ctx, backOff(try, t.after)); err != nil {
			return changed, err
		}
	}
}

// seen is what is remembered of the copy: the answer that it came by.
type seen struct {
	ETag         string `json:"etag,omitempty"`
	LastModified string `json:"last_modified,omitempty"`
	Bytes        int64  `json:"bytes"`
}

func (f *Fetcher) stateFolder() string { return f.Folder + ".state" }
func (f *Fetcher) seenPath() string    { return filepath.Join(f.stateFolder(), f.name+".json") }

// remembered returns what is known of the copy; nothing if it is not what it was.
func (f *Fetcher) remembered() (s seen, size int64) {
	info, err := os.Stat(f.Path())
	if err != nil {
		return seen{}, 0
	}
	text, err := os.ReadFile(f.seenPath())
	if err != nil || json.Unmarshal(text, &s) != nil || s.Bytes > info.Size() {
		return seen{}, 0
	}
	return s, info.Size()
}

func (f *Fetcher) once(ctx context.Context) (changed bool, err error) {
	ctx, cancel := context.WithTimeout(ctx, f.Timeout)
	defer cancel()
	last, size := f.remembered()
	changed, err = f.ask(ctx, cancel, last, size)
	if errors.Is(err, errAskWhole) {
		changed, err = f.ask(ctx, cancel, seen{}, 0)
	}
	return changed, err
}

// errAskWhole says that the part that was asked for is not to be had.
var errAskWhole = errors.New("the file has to be asked for whole")

func (f *Fetcher) ask(ctx context.Context, cancel context.CancelFunc, last seen, size int64) (bool, error) {
	req, err := http.NewRequestWithContext(ctx, http.MethodGet, f.URL, nil)
	if err != nil {
		return false, errors.New("the address will not do")
	}
	if err := f.authorize(req); err != nil {
		return false, err
	}
	req.Header.Set("Accept-Encoding", "identity")
	req.Header.Set("User-Agent", "thawledger")
	from := max(size-overlap, 0)
	ranged := f.Grows && size > 0
	if size == last.Bytes { // whole: what came is what the answer was about
		setIf(req, "If-None-Match", last.ETag)
		setIf(req, "If-Modified-Since", last.LastModified)
	}
	if ranged {
		req.Header.Set("Range", fmt.Sprintf("bytes=%d-", from))
	}
	answer, err := f.client.Do(req)
	if err != nil {
		return false, f.trouble(ctx, err)
	}
	defer answer.Body.Close()
	now := seen{ETag: answer.Header.Get("ETag"), LastModified: answer.Header.Get("Last-Modified")}
	switch {
	case answer.StatusCode == http.StatusNotModified && size > 0:
		return false, nil
	case answer.StatusCode == http.StatusRequestedRangeNotSatisfiable && ranged:
		return false, errAskWhole // it is shorter than it was
	case answer.StatusCode == http.StatusPartialContent && ranged:
		return f.append(ctx, cancel, answer, from, size, now)
	case answer.StatusCode == http.StatusOK:
		return f.replace(ctx, cancel, answer, now)
	}
	return false, refused(answer)
}

func setIf(req *http.Request, name, value string) {
	if value != "" {
		req.Header.Set(name, value)
	}
}

func (f *Fetcher) authorize(req *http.Request) error {
	secret := func(name string) (string, error) {
		text, err := os.ReadFile(name)
		if err != nil {
			return "", fmt.Errorf("read credentials: %w", err)
		}
		return strings.TrimRight(string(text), "\r\n"), nil
	}
	switch {
	case f.BearerFile != "":
		token, err := secret(f.BearerFile)
		if err != nil {
			return err
		}
		req.Header.Set("Authorization", "Bearer "+token)
	case f.User != "":
		password, err := secret(f.PasswordFile)
		if err != nil {
			return err
		}
		req.SetBasicAuth(f.User, password)
	}
	return nil
}

// replace puts a whole answer in the place of the copy, if it differs.
func (f *Fetcher) replace(ctx context.Context, cancel context.CancelFunc, answer *http.Response, now seen) (bool, error) {
	tmp, err := os.CreateTemp(f.stateFolder(), "fetching-*")
	if err != nil {
		return false, fmt.Errorf("open copy: %w", err)
	}
	defer func() {
		tmp.Close()
		os.Remove(tmp.Name()) // gone already if all went well
	}()
	if now.Bytes, err = f.copy(ctx, cancel, tmp, answer, f.MaxBytes); err != nil {
		return false, err
	}
	if err := tmp.Sync(); err != nil {
		return false, fmt.Errorf("sync copy: %w", err)
	}
	date(tmp.Name(), answer)
	if err := os.Rename(tmp.Name(), f.Path()); err != nil {
		return false, fmt.Errorf("name copy: %w", err)
	}
	return true, f.remember(now)
}

// overlap is how many of the bytes that are there are asked for once more: if they
// are what they were, the file has only grown. An ETag cannot tell: it changes
// with every line.
const overlap = 1024

// append adds a partial answer, which begins at a byte before the copy's end, to
// the copy.
func (f *Fetcher) append(ctx context.Context, cancel context.CancelFunc, answer *http.Response, from, size int64, now seen) (bool, error) {
	begins, total, ok := contentRange(answer.Header.Get("Content-Range"))
	if !ok || begins != from || total >= 0 && total < from {
		return false, fmt.Errorf("the server answers with the range %q where bytes from %d on were asked for", answer.Header.Get("Content-Range"), from)
	}
	copyOf, err := os.OpenFile(f.Path(), os.O_RDWR|os.O_APPEND, 0)
	if errors.Is(err, fs.ErrNotExist) {
		return false, errAskWhole
	}
	if err != nil {
		return false, fmt.Errorf("open copy: %w", err)
	}
	defer copyOf.Close()
	there := make([]byte, size-from)
	if _, err := copyOf.ReadAt(there, from); err != nil {
		return false, fmt.Errorf("read copy: %w", err)
	}
	n, err := f.copy(ctx, cancel, &grown{there: there, to: copyOf}, answer, f.MaxBytes-from)
	n -= size - from
	if errors.Is(err, errAskWhole) {
		return false, err
	}
	if err != nil {
		return n > 0, err
	}
	if n < 0 {
		return false, errAskWhole // it ends before the copy does
	}
	if err := copyOf.Sync(); err != nil {
		return n > 0, fmt.Errorf("sync copy: %w", err)
	}
	date(f.Path(), answer)
	now.Bytes = size + n
	return n > 0, f.remember(now)
}

// grown compares the first bytes with those that are there and passes on the rest.
type grown struct {
	there []byte
	to    io.Writer
}

func (g *grown) Write(p []byte) (int, error) {
	n := min(len(p), len(g.there))
	if !bytes.Equal(p[:n], g.there[:n]) {
		return 0, errAskWhole
	}
	g.there = g.there[n:]
	if n == len(p) {
		return n, nil
	}
	m, err := g.to.Write(p[n:])
	return n + m, err
}

// date gives the copy the time that the server says it was written.
func date(name string, answer *http.Response) {
	if at, err := http.ParseTime(answer.Header.Get("Last-Modified")); err == nil {
		_ = os.Chtimes(name, at, at) // else it is dated now
	}
}

func (f *Fetcher) remember(s seen) error {
	text, err := json.Marshal(s)
	if err == nil {
		err = os.WriteFile(f.seenPath(), text, 0o600)
	}
	if err != nil {
		return fmt.Errorf("remember the answer: %w", err)
	}
	return nil
}

// copy takes the body, at most so many bytes of it, and watches that it keeps coming.
func (f *Fetcher) copy(ctx context.Context, cancel context.CancelFunc, to io.Writer, answer *http.Response, most int64) (int64, error) {
	if answer.ContentLength > most {
		return 0, fmt.Errorf("the file has more than the %d bytes that are allowed", f.MaxBytes)
	}
	watch := time.AfterFunc(f.Stall, cancel)
	defer watch.Stop()
	n, err := io.Copy(to, io.LimitReader(&watched{answer.Body, watch, f.Stall}, most+1))
	switch {
	case errors.Is(err, errAskWhole):
		return n, err
	case err != nil:
		return n, f.trouble(ctx, err)
	case n > most:
		return n, fmt.Errorf("the file has more than the %d bytes that are allowed", f.MaxBytes)
	case answer.ContentLength >= 0 && n != answer.ContentLength:
		return n, temporary(fmt.Errorf("%d bytes came where %d were announced", n, answer.ContentLength), 0)
	}
	return n, nil
}

// watched puts off the end whenever bytes come.
type watched struct {
	r     io.Reader
	watch *time.Timer
	stall time.Duration
}

func (w *watched) Read(p []byte) (int, error) {
	n, err := w.r.Read(p)
	if n > 0 {
		w.watch.Reset(w.stall)
	}
	return n, err
}

// contentRange reads "bytes 5-9/10"; total is -1 for "*".
func contentRange(text string) (from, total int64, ok bool) {
	span, of, found := strings.Cut(strings.TrimPrefix(text, "bytes "), "/")
	first, _, found2 := strings.Cut(span, "-")
	from, err := strconv.ParseInt(first, 10, 64)
	if !found || !found2 || err != nil {
		return 0, 0, false
	}
	if of == "*" {
		return from, -1, true
	}
	total, err = strconv.ParseInt(of, 10, 64)
	return from, total, err == nil
}
