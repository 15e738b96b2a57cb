package capfeed_test

import (
	"context"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"slices"
	"testing"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/capfeed"
	"thawledger/alerts/delivery/deliverytest"
)

type feed struct {
	XMLName xml.Name
	ID      string `xml:"id"`
	Title   string `xml:"title"`
	Updated string `xml:"updated"`
	Author  string `xml:"author>name"`
	Links   []link `xml:"link"`
	Entries []struct {
		ID        string `xml:"id"`
		Title     string `xml:"title"`
		Updated   string `xml:"updated"`
		Published string `xml:"published"`
		Links     []link `xml:"link"`
		Summary   string `xml:"summary"`
		Content   link   `xml:"content"`
	} `xml:"entry"`
}

type link struct {
	Rel  string `xml:"rel,attr"`
	Type string `xml:"type,attr"`
	Href string `xml:"href,attr"`
	Src  string `xml:"src,attr"`
}

func readFeed(t *testing.T, document []byte) feed {
	t.Helper()
	var f feed
	if err := xml.Unmarshal(document, &f); err != nil {
		t.Fatalf("%v in\n%s", err, document)
	}
	return f
}

// What RFC 4287 wants of a feed and its entries; the sections are its.
func TestFeed(t *testing.T) {
	s := settings()
	messages := slices.Concat(build(t, delivery.Samples()[0], s), build(t, delivery.Samples()[7], s))
	messages[1].Sent = messages[1].Sent.Add(time.Hour)
	messages[2].Kept = messages[1].Sent.Add(time.Hour)
	document, err := capfeed.Feed(messages, &s)
	if err != nil {
		t.Fatal(err)
	}
	f := readFeed(t, document)
	if f.XMLName.Space != "http://www.w3.org/2005/Atom" || f.XMLName.Local != "feed" { // 1.2, 4.1.1
		t.Errorf("root %v", f.XMLName)
	}
	if f.ID != s.FeedID || f.Title != "Thaw of frozen ground (test: disregard)" || f.Author != s.SenderName { // 4.1.1: one id, title; an author
		t.Errorf("%q %q %q", f.ID, f.Title, f.Author)
	}
	if f.Updated != "2031-08-21T16:00:00Z" { // 4.2.15: when it last changed, here by a message put there late
		t.Errorf("updated %s", f.Updated)
	}
	if len(f.Links) != 1 || f.Links[0].Rel != "self" || f.Links[0].Href != "https://fellmoor.example/cap/feed.atom" { // 4.1.1
		t.Errorf("links %+v", f.Links)
	}
	if len(f.Entries) != 4 || f.Entries[0].Updated != "2031-08-21T15:00:00Z" {
		t.Fatalf("%d entries, the newest of %s", len(f.Entries), f.Entries[0].Updated)
	}
	ids := map[string]bool{}
	for i, e := range f.Entries {
		ids[e.ID] = true
		if i > 0 && e.Updated > f.Entries[i-1].Updated {
			t.Errorf("entry %d is newer than the one before it", i)
		}
		// 4.1.2: id, title, updated; 4.1.3.2: content elsewhere has a type and
		// makes a summary necessary.
		if e.ID == "" || e.Title == "" || e.Updated == "" || e.Published == "" || e.Summary == "" {
			t.Errorf("entry %d: %+v", i, e)
		}
		if e.Content.Type != "application/cap+xml" || e.Content.Src != e.Links[0].Href || e.Links[0].Rel != "alternate" || e.Links[0].Type != "application/cap+xml" {
			t.Errorf("entry %d: content %+v, link %+v", i, e.Content, e.Links)
		}
	}
	if len(ids) != 4 {
		t.Errorf("ids are not each once: %v", ids)
	}
	if f.Entries[1].ID != "tag:fellmoor.example,2031:thaw:n-31-0821-1~fellmoor.runway.12.2031" && f.Entries[0].ID != "tag:fellmoor.example,2031:thaw:n-31-0821-1~fellmoor.runway.12.2031" {
		t.Errorf("ids %v", ids)
	}
	again, err := capfeed.Feed([]capfeed.Message{messages[3], messages[1], messages[0], messages[2]}, &s)
	if err != nil || string(again) != string(document) {
		t.Errorf("the feed depends on the order that messages come in: %v", err)
	}
}

func TestEmptyFeed(t *testing.T) {
	s := settings()
	s.Actual = true
	document, err := capfeed.Feed(nil, &s)
	if err != nil {
		t.Fatal(err)
	}
	if f := readFeed(t, document); f.Title != "Thaw of frozen ground" || f.Updated != "1970-01-01T00:00:00Z" || len(f.Entries) != 0 {
		t.Errorf("%+v", f)
	}
}

// site is a feed that is served, with a clock that the test moves.
type site struct {
	t       *testing.T
	server  *httptest.Server
	shelf   *deliverytest.Shelf
	channel *capfeed.Channel
	now     time.Time
	failed  []error
}

func serve(t *testing.T, reader capfeed.Reader) *site {
	t.Helper()
	s := settings()
	out := &site{t: t, now: noon}
	s.Now = func() time.Time { return out.now }
	s.Most = 2
	out.shelf = deliverytest.NewShelf(deliverytest.Takes, s.Now)
	if reader == nil {
		reader = out.shelf
	}
	handler, err := capfeed.Handler(s, reader, func(err error) { out.failed = append(out.failed, err) })
	if err != nil {
		t.Fatal(err)
	}
	out.server = httptest.NewServer(handler)
	t.Cleanup(out.server.Close)
	texts := loaded(t)
	if out.channel, err = capfeed.New(s, texts, out.shelf); err != nil {
		t.Fatal(err)
	}
	return out
}

func (s *site) put(n delivery.Notice) {
	s.t.Helper()
	if out := s.channel.Deliver(s.t.Context(), n); !out.Delivered {
		s.t.Fatalf("%+v", out)
	}
}

func (s *site) get(method, path string, headers ...string) (*http.Response, []byte) {
	s.t.Helper()
	q, err := http.NewRequestWithContext(s.t.Context(), method, s.server.URL+path, nil)
	if err != nil {
		s.t.Fatal(err)
	}
	for i := 0; i < len(headers); i += 2 {
		q.Header.Set(headers[i], headers[i+1])
	}
	r, err := http.DefaultClient.Do(q)
	if err != nil {
		s.t.Fatal(err)
	}
	defer r.Body.Close()
	body, err := io.ReadAll(r.Body)
	if err != nil {
		s.t.Fatal(err)
	}
	return r, body
}

func TestHandler(t *testing.T) {
	s := serve(t, nil)
	s.put(delivery.Samples()[0])
	s.now = noon.Add(time.Minute)
	r, body := s.get("GET", "/feed.atom")
	if r.StatusCode != 200 || r.Header.Get("Content-Type") != "application/atom+xml; charset=utf-8" || r.Header.Get("Etag") == "" ||
		r.Header.Get("Last-Modified") != "Thu, 21 Aug 2031 12:00:00 GMT" || r.Header.Get("Cache-Control") != "private, no-cache" {
		t.Errorf("%s %v", r.Status, r.Header)
	}
	if f := readFeed(t, body); len(f.Entries) != 1 {
		t.Errorf("%d entries", len(f.Entries))
	}
	const message = "/n-31-0821-1~fellmoor.runway.12.2031.xml"
	m, text := s.get("GET", message)
	if m.StatusCode != 200 || m.Header.Get("Content-Type") != "application/cap+xml" || m.Header.Get("Etag") == "" || m.Header.Get("Last-Modified") == "" {
		t.Errorf("%s %v", m.Status, m.Header)
	}
	if want := build(t, delivery.Samples()[0], settings())[0]; string(text) != string(want.XML) {
		t.Errorf("message is not as built:\n%s", text)
	}
	for _, test := range []struct {
		method, path string
		headers      []string
		code         int
	}{
		{"GET", "/feed.atom", []string{"If-None-Match", r.Header.Get("Etag")}, 304},
		{"GET", "/feed.atom", []string{"If-None-Match", `"other"`}, 200},
		{"GET", "/feed.atom", []string{"If-Modified-Since", r.Header.Get("Last-Modified")}, 304},
		{"GET", "/feed.atom", []string{"If-Modified-Since", "Thu, 21 Aug 2031 11:59:59 GMT"}, 200},
		{"GET", message, []string{"If-None-Match", m.Header.Get("Etag")}, 304},
		{"HEAD", "/feed.atom", nil, 200},
		{"HEAD", message, nil, 200},
		{"POST", "/feed.atom", nil, 405},
		{"DELETE", message, nil, 405},
		{"GET", "/n-31-0821-1~fellmoor.runway.12.2031", nil, 404},
		{"GET", "/none.xml", nil, 404},
		{"GET", "/.xml", nil, 404},
		{"GET", "/%2e%2e%2fsettings.xml", nil, 404},
		{"GET", "/", nil, 404},
	} {
		if r, body := s.get(test.method, test.path, test.headers...); r.StatusCode != test.code || test.code == 304 && len(body) > 0 {
			t.Errorf("%s %s %v: %s", test.method, test.path, test.headers, r.Status)
		}
	}
	if len(s.failed) > 0 {
		t.Error(s.failed)
	}
}

// A notice that was put off for hours goes on the feed below newer ones: those
// who ask whether anything has changed have to hear of it.
func TestLateMessageChangesTheFeed(t *testing.T) {
	s := serve(t, nil)
	newer, older := delivery.Samples()[6], delivery.Samples()[0]
	older.Written = older.Written.Add(-5 * time.Hour)
	s.put(newer)
	s.now = noon.Add(time.Hour)
	r, _ := s.get("GET", "/feed.atom")
	s.put(older)
	s.now = noon.Add(2 * time.Hour)
	for _, header := range [][]string{{"If-Modified-Since", r.Header.Get("Last-Modified")}, {"If-None-Match", r.Header.Get("Etag")}} {
		again, body := s.get("GET", "/feed.atom", header...)
		if again.StatusCode != 200 {
			t.Fatalf("%v: %s", header, again.Status)
		}
		if f := readFeed(t, body); len(f.Entries) != 2 || f.Updated != "2031-08-21T14:00:00Z" {
			t.Errorf("%d entries, updated %s", len(f.Entries), f.Updated)
		}
	}
}

// Within a second a feed can change again, which Last-Modified could not say.
func TestFreshFeedHasNoLastModified(t *testing.T) {
	s := serve(t, nil)
	s.put(delivery.Samples()[0])
	s.now = noon.Add(500 * time.Millisecond)
	if r, _ := s.get("GET", "/feed.atom"); r.Header.Get("Last-Modified") != "" || r.Header.Get("Etag") == "" {
		t.Errorf("%v", r.Header)
	}
}

func TestFeedHasTheNewest(t *testing.T) {
	s := serve(t, nil) // at most two
	for i, n := range delivery.Samples()[:4] {
		n.Written = n.Written.Add(time.Duration(i) * time.Minute)
		s.put(n)
	}
	_, body := s.get("GET", "/feed.atom")
	f := readFeed(t, body)
	if len(f.Entries) != 2 || f.Entries[0].Published != "2031-08-21T14:03:00Z" || f.Entries[1].Published != "2031-08-21T14:02:00Z" {
		t.Errorf("%+v", f.Entries)
	}
}

type broken struct{}

func (broken) Newest(context.Context, int) ([]capfeed.Message, error) {
	return nil, errors.New("password of the database")
}

func (broken) Message(context.Context, string) (capfeed.Message, bool, error) {
	return capfeed.Message{}, false, errors.New("password of the database")
}

func TestReaderFails(t *testing.T) {
	s := serve(t, broken{})
	for i, path := range []string{"/feed.atom", "/a.xml"} {
		r, body := s.get("GET", path)
		if r.StatusCode != 503 || string(body) != "The messages cannot be read at the moment.\n" || len(s.failed) != i+1 {
			t.Errorf("%s %s %v", r.Status, body, s.failed)
		}
	}
}

// A notice of several items is on the feed whole or not at all.
func TestConflictIsForGood(t *testing.T) {
	s := serve(t, nil)
	n := delivery.Samples()[7]
	s.put(n)
	s.put(n)
	n.Items[2].Instruction = "something else"
	if out := s.channel.Deliver(t.Context(), n); out.Delivered || out.Again {
		t.Errorf("%+v", out)
	}
	if got := fmt.Sprint(s.failed); got != "[]" {
		t.Error(got)
	}
}
