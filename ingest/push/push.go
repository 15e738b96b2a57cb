// Package push takes files that are sent to us over HTTP:
//
//	POST /feeds/NAME, token of the feed, the file -> Deliver -> what became of it, as JSON
//
// A push is answered once the file is archived, entered in the ledger and its
// readings are on their way: what was answered with 2xx is not lost. The same
// bytes again are the same batch, and change nothing. A feed that is not there
// and a token that is wrong get the same answer.
//
// It refuses: files over the feed's limit, names that are paths, and more than
// four files at a time. Bodies may be compressed (gzip, zstd) as files may.
package push

import (
	"context"
	"crypto/sha256"
	"crypto/subtle"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"os"
	"path"
	"strings"
	"time"

	"go.uber.org/zap"
)

// Delivery is a pushed file.
type Delivery struct {
	Feed       string
	Name       string
	SourceTime time.Time
	Body       io.Reader
}

// Outcome is what became of a file; it is the answer.
type Outcome struct {
	Batch            int64  `json:"batch,omitempty"` // 0 if the bytes came before
	State            string `json:"state"`           // read, held_back, waiting, or known: these bytes came before
	Reason           string `json:"reason,omitempty"`
	Rows             int64  `json:"rows"`
	RowsRead         int64  `json:"rows_read"`
	RowsWithoutValue int64  `json:"rows_without_value"`
	RowsSetAside     int64  `json:"rows_set_aside"`
}

// Feed is what pushes to a feed need.
type Feed struct {
	TokenFile string
	MaxBytes  int64
}

// Handler takes pushed files.
type Handler struct {
	Feeds   map[string]Feed
	Deliver func(context.Context, Delivery) (Outcome, error)
	Now     func() time.Time
	Log     *zap.Logger
	// BodyTime is how long a body may take to come; 2 minutes if zero.
	BodyTime time.Duration

	busy chan struct{}
}

// atATime is how many files are taken at a time.
const atATime = 4

// NewHandler makes a handler ready.
func NewHandler(h Handler) *Handler {
	h.busy = make(chan struct{}, atATime)
	if h.BodyTime == 0 {
		h.BodyTime = 2 * time.Minute
	}
	return &h
}

// ServeHTTP takes one file.
func (h *Handler) ServeHTTP(w http.ResponseWriter, r *http.Request) {
	name, found := strings.CutPrefix(r.URL.Path, "/feeds/")
	if !found || strings.Contains(name, "/") {
		answer(w, http.StatusNotFound, Outcome{State: "refused", Reason: "files are pushed to /feeds/NAME"})
		return
	}
	if r.Method != http.MethodPost {
		w.Header().Set("Allow", http.MethodPost)
		answer(w, http.StatusMethodNotAllowed, Outcome{State: "refused", Reason: "use POST"})
		return
	}
	feed, known := h.Feeds[name]
	if !h.allowed(feed, known, r) {
		w.Header().Set("WWW-Authenticate", "Bearer")
		answer(w, http.StatusUnauthorized, Outcome{State: "refused", Reason: "no such feed, or not its token"})
		return
	}
	select {
	case h.busy <- struct{}{}:
		defer func() { <-h.busy }()
	default:
		w.Header().Set("Retry-After", "5")
		answer(w, http.StatusServiceUnavailable, Outcome{State: "refused", Reason: "other files are being taken; try again"})
		return
	}
	_ = http.NewResponseController(w).SetReadDeadline(time.Now().Add(h.BodyTime)) // not every writer can
	h.take(w, r, name, feed)
}

// allowed compares tokens in a time that says nothing about them.
func (h *Handler) allowed(feed Feed, known bool, r *http.Request) bool {
	given, _ := strings.CutPrefix(r.Header.Get("Authorization"), "Bearer ")
	want := ""
	if known {
		text, err := os.ReadFile(feed.TokenFile)
		if err != nil {
			h.Log.Error("token cannot be read; nothing can be pushed", zap.Error(err))
			return false
		}
		want = strings.TrimSpace(string(text))
	}
	a, b := sha256.Sum256([]byte(given)), sha256.Sum256([]byte(want))
	return subtle.ConstantTimeCompare(a[:], b[:]) == 1 && want != ""
}

func (h *Handler) take(w http.ResponseWriter, r *http.Request, feed string, f Feed) {
	d := Delivery{Feed: feed, Name: fileName(r.Header.Get("X-File-Name"), h.Now()), SourceTime: h.Now(), Body: http.MaxBytesReader(w, r.Body, f.MaxBytes)}
	if text := r.Header.Get("X-File-Time"); text != "" {
		at, err := time.Parse(time.RFC3339, text)
		if err != nil {
			answer(w, http.StatusBadRequest, Outcome{State: "refused", Reason: fmt.Sprintf("X-File-Time %q is no time such as 2031-07-20T13:00:00Z", text)})
			return
		}
		d.SourceTime = at
	}
	out, err := h.Deliver(r.Context(), d)
	var tooLarge *http.MaxBytesError
	var slow net.Error
	switch {
	case errors.As(err, &tooLarge):
		answer(w, http.StatusRequestEntityTooLarge, Outcome{State: "refused", Reason: fmt.Sprintf("the file has more than the %d bytes that the feed allows", f.MaxBytes)})
	case errors.As(err, &slow) && slow.Timeout(), errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, os.ErrDeadlineExceeded):
		answer(w, http.StatusRequestTimeout, Outcome{State: "refused", Reason: "the body did not come to its end"})
	case err != nil:
		h.Log.Error("pushed file not taken", zap.String("feed", feed), zap.String("file", d.Name), zap.Error(err))
		w.Header().Set("Retry-After", "30")
		answer(w, http.StatusServiceUnavailable, Outcome{State: "refused", Reason: "it could not be taken; try again"})
	case out.State == "known":
		answer(w, http.StatusOK, out)
	case out.State == "held_back" || out.State == "waiting":
		answer(w, http.StatusAccepted, out)
	default:
		answer(w, http.StatusCreated, out)
	}
}

// fileName is a name that a sender gives, as a file may be called.
func fileName(given string, now time.Time) string {
	name := strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return -1
		}
		return r
	}, strings.ToValidUTF8(given, ""))
	name = strings.TrimLeft(path.Base("/"+strings.ReplaceAll(name, `\`, "/")), "./")
	if len(name) > 200 {
		name = strings.ToValidUTF8(name[:200], "")
	}
	if name == "" {
		return "pushed-" + now.UTC().Format("20060102T150405.000000000") + ".csv"
	}
	return name
}

func answer(w http.ResponseWriter, status int, out Outcome) {
	w.Header().Set("Content-Type", "application/json")
	w.WriteHeader(status)
	_ = json.NewEncoder(w).Encode(out) // whoever has gone does not want it
}
