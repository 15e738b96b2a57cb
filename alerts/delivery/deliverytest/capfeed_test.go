package deliverytest

import (
	"encoding/xml"
	"io"
	"net/http"
	"net/http/httptest"
	"slices"
	"testing"
	"time"

	"thawledger/alerts/delivery/capfeed"
)

// startCapfeed starts a feed over a shelf. Its receiver is a reader of the feed
// over HTTP, who follows every entry to its message.
func startCapfeed(t *testing.T, b Behaviour, limit time.Duration) rig {
	t.Helper()
	if b == absent {
		b = ClosesEarly // a shelf that is not there
	}
	shelf := NewShelf(b, time.Now)
	s := capfeed.Settings{
		Sender: "thaw@fellmoor.example", SenderName: "Fellmoor ground office", Restriction: "engineers responsible for the sites",
		FeedID: "tag:fellmoor.example,2031:thaw", Title: "Thaw of frozen ground", Timeout: limit, Now: time.Now, BaseURL: "http://unset.example/",
	}
	server := httptest.NewUnstartedServer(nil)
	s.BaseURL = "http://" + server.Listener.Addr().String() + "/"
	handler, err := capfeed.Handler(s, shelf, func(err error) { t.Error(err) })
	if err != nil {
		t.Fatal(err)
	}
	server.Config.Handler = handler
	server.Start()
	t.Cleanup(server.Close)
	channel, err := capfeed.New(s, texts(t), shelf)
	if err != nil {
		t.Fatal(err)
	}
	return rig{channel: channel, stalled: shelf.Stalled, once: true, keys: func() []string { return readFeed(t, s.BaseURL+"feed.atom") }}
}

// readFeed returns the keys of the notices on a feed, in order of their first
// messages' keys as the samples have them.
func readFeed(t *testing.T, address string) []string {
	t.Helper()
	var feed struct {
		Entries []struct {
			Content struct {
				Source string `xml:"src,attr"`
			} `xml:"content"`
		} `xml:"entry"`
	}
	get(t, address, &feed)
	var out []string
	for _, e := range feed.Entries {
		var alert struct {
			Parameters []struct {
				Name  string `xml:"valueName"`
				Value string `xml:"value"`
			} `xml:"info>parameter"`
		}
		get(t, e.Content.Source, &alert)
		for _, p := range alert.Parameters {
			if p.Name == "notice_key" && !slices.Contains(out, p.Value) {
				out = append(out, p.Value)
			}
		}
	}
	// The samples were all written at one time, so the feed has them in order of
	// identifier.
	slices.SortFunc(out, func(a, b string) int { return sampleNumber(a) - sampleNumber(b) })
	return out
}

func get(t *testing.T, address string, into any) {
	t.Helper()
	response, err := http.Get(address)
	if err != nil {
		t.Fatal(err)
	}
	defer response.Body.Close()
	text, err := io.ReadAll(response.Body)
	if err != nil || response.StatusCode != http.StatusOK {
		t.Fatalf("%s: %s %v", address, response.Status, err)
	}
	if err := xml.Unmarshal(text, into); err != nil {
		t.Fatalf("%s: %v", address, err)
	}
}
