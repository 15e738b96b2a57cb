package capfeed

import (
	"bytes"
	"cmp"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/xml"
	"fmt"
	"net/http"
	"slices"
	"strings"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// Reader gives the feed the messages that were kept.
type Reader interface {
	// Newest returns up to most messages, those sent last.
	Newest(ctx context.Context, most int) ([]Message, error)
	// Message returns one message, and whether there is one.
	Message(ctx context.Context, identifier string) (Message, bool, error)
}

// Media types: RFC 4287, section 7, and section 3.3.5 of CAP 1.2.
const (
	atomType = "application/atom+xml; charset=utf-8"
	capType  = "application/cap+xml"
)

const (
	feedName      = "feed.atom"
	messageSuffix = ".xml"
)

// Handler serves feed.atom, and each message as its identifier with .xml, below
// the path that it is mounted at (strip that path before). It answers GET and
// HEAD. failed is told what went wrong while reading messages.
func Handler(s Settings, reader Reader, failed func(error)) (http.Handler, error) {
	if err := s.Check(); err != nil {
		return nil, fmt.Errorf("CAP feed settings: %w", err)
	}
	h := &handler{settings: s, reader: reader, failed: failed}
	mux := http.NewServeMux()
	mux.HandleFunc("GET /"+feedName, h.feed)
	mux.HandleFunc("GET /{name}", h.message)
	return mux, nil
}

type handler struct {
	settings Settings
	reader   Reader
	failed   func(error)
}

func (h *handler) feed(w http.ResponseWriter, r *http.Request) {
	messages, err := h.reader.Newest(r.Context(), h.settings.most())
	if err != nil {
		h.sorry(w, fmt.Errorf("read messages for the feed: %w", err))
		return
	}
	document, err := Feed(messages, &h.settings)
	if err != nil {
		h.sorry(w, err)
		return
	}
	// A message may be put on the feed long after it was sent, so that Kept says
	// when the feed last changed, and Sent does not.
	var changed time.Time
	for _, m := range messages {
		if m.Kept.After(changed) {
			changed = m.Kept
		}
	}
	h.serve(w, r, atomType, document, changed)
}

func (h *handler) message(w http.ResponseWriter, r *http.Request) {
	id, named := strings.CutSuffix(r.PathValue("name"), messageSuffix)
	if !named || id == "" {
		http.NotFound(w, r)
		return
	}
	m, found, err := h.reader.Message(r.Context(), id)
	switch {
	case err != nil:
		h.sorry(w, fmt.Errorf("read message %s: %w", delivery.OneLine(id, 200), err))
	case !found:
		http.NotFound(w, r)
	default:
		h.serve(w, r, capType, m.XML, m.Kept)
	}
}

func (h *handler) sorry(w http.ResponseWriter, err error) {
	h.failed(err)
	http.Error(w, "The messages cannot be read at the moment.", http.StatusServiceUnavailable)
}

// serve answers with a document, or with Not Modified to those who have it.
func (h *handler) serve(w http.ResponseWriter, r *http.Request, media string, document []byte, changed time.Time) {
	sum := sha256.Sum256(document)
	w.Header().Set("ETag", `"`+hex.EncodeToString(sum[:16])+`"`)
	w.Header().Set("Content-Type", media)
	w.Header().Set("Cache-Control", "private, no-cache")
	w.Header().Set("X-Content-Type-Options", "nosniff")
	// Last-Modified counts in whole seconds: a document that may still change
	// within the second has none (RFC 9110, section 8.8.2.2).
	if h.settings.Now().Sub(changed) < 2*time.Second {
		changed = time.Time{}
	}
	http.ServeContent(w, r, "", changed, bytes.NewReader(document))
}

type atomFeed struct {
	XMLName xml.Name    `xml:"http://www.w3.org/2005/Atom feed"`
	ID      string      `xml:"id"`
	Title   string      `xml:"title"`
	Updated string      `xml:"updated"`
	Author  atomAuthor  `xml:"author"`
	Links   []atomLink  `xml:"link"`
	Note    string      `xml:"subtitle,omitempty"`
	Entries []atomEntry `xml:"entry"`
}

type atomAuthor struct {
	Name string `xml:"name"`
}

type atomLink struct {
	Rel  string `xml:"rel,attr"`
	Type string `xml:"type,attr"`
	Href string `xml:"href,attr"`
}

type atomEntry struct {
	ID        string      `xml:"id"`
	Title     string      `xml:"title"`
	Updated   string      `xml:"updated"`
	Published string      `xml:"published"`
	Links     []atomLink  `xml:"link"`
	Summary   string      `xml:"summary"`
	Content   atomContent `xml:"content"`
}

type atomContent struct {
	Type   string `xml:"type,attr"`
	Source string `xml:"src,attr"`
}

// Feed writes the Atom document: the newest message first, those of one time in
// order of their identifiers. A message's entry never changes, and its name is
// the feed's with the identifier, so that moving the feed elsewhere brings
// nobody an old message again.
func Feed(messages []Message, s *Settings) ([]byte, error) {
	messages = slices.Clone(messages)
	slices.SortFunc(messages, func(a, b Message) int {
		return cmp.Or(b.Sent.Compare(a.Sent), cmp.Compare(a.Identifier, b.Identifier))
	})
	f := atomFeed{
		ID: s.FeedID, Title: s.Title, Author: atomAuthor{s.SenderName},
		Links: []atomLink{{"self", "application/atom+xml", s.BaseURL + feedName}},
		Note:  pipeline.Caution,
	}
	if !s.Actual {
		f.Title += " (test: disregard)"
	}
	updated := time.Unix(0, 0) // RFC 4287 wants a time even of an empty feed
	for _, m := range messages {
		for _, t := range []time.Time{m.Sent, m.Kept} {
			if t.After(updated) {
				updated = t
			}
		}
		sent, where := m.Sent.UTC().Format(time.RFC3339), s.BaseURL+m.Identifier+messageSuffix
		f.Entries = append(f.Entries, atomEntry{
			ID: s.FeedID + ":" + m.Identifier, Title: m.Headline, Updated: sent, Published: sent,
			Links: []atomLink{{"alternate", capType, where}}, Summary: m.Headline, Content: atomContent{capType, where},
		})
	}
	f.Updated = updated.UTC().Format(time.RFC3339)
	body, err := xml.MarshalIndent(f, "", "  ")
	if err != nil {
		return nil, fmt.Errorf("write feed: %w", err)
	}
	return append([]byte(xml.Header), append(body, '\n')...), nil
}
