package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"net/http"
	"net/http/httptest"
	"regexp"
	"strings"
	"testing"
	"time"

	"thawledger/alerts/delivery/webhook"
)

const noticed = `data: data
stations: [{id: TARN, latitude: 69, longitude: -121, utc_offset: "+00:00", daily_mean: as_reported, thaw_year: "%s"}]
layouts:
  daily: {delimiter: ",", names_line: 1, time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}, station: {constant: TARN}, values: [{column: t, variable: air_temp_mean, unit: degC}]}
feeds: [{name: tarn, folder: arrivals, every: "@every 1s", settle: 0s, layout: daily}]
sites:
  - id: strip
    station: TARN
    instructions: {exceeded: Walk the edges.}
    surfaces:
      - {id: apron, design_values: [{kind: thaw, definition: curve, of: air, index: 50, unit: degC.d, direction: not_above, source: drawing}]}
      - {id: deep, design_values: [{kind: thaw, definition: curve, of: air, index: 150, unit: degC.d, direction: not_above, source: drawing}]}
channels: [{name: hook, webhook: {url: "%s", why_none: a test, key_file: secret}}]
recipients: [{id: duty, name: Duty, hears: [{channels: [hook]}], gather_for: 0s}]
`

// From a file in a feed's folder to a notice at a receiver, and what the commands
// say of it; a hold keeps a second one back until it is lifted.
func TestNoticesFromFileToReceiver(t *testing.T) {
	got := make(chan webhook.Document, 10)
	web := httptest.NewServer(http.HandlerFunc(func(_ http.ResponseWriter, q *http.Request) {
		var d webhook.Document
		body, err := io.ReadAll(q.Body)
		if err == nil {
			err = json.Unmarshal(body, &d)
		}
		if err != nil {
			t.Error(err)
		}
		got <- d
	}))
	defer web.Close()
	start := time.Now().UTC().AddDate(0, 0, -100)
	if start.Month() == time.February && start.Day() == 29 {
		start = start.AddDate(0, 0, 1) // a year may not begin on it
	}
	csv := "date,t\n"
	day := 0
	more := func(days int) string {
		for range days {
			csv += fmt.Sprintf("%s,10\n", start.AddDate(0, 0, day).Format(time.DateOnly))
			day++
		}
		return csv
	}
	p := newPlace(t, fmt.Sprintf(noticed, start.Format("01-02"), web.URL), map[string]string{
		"secret": "0123456789abcdef0123456789abcdef", "arrivals/1.csv": more(6)})
	daemon := func() (stop func()) {
		ctx, cancel := context.WithCancel(t.Context())
		var log bytes.Buffer
		done := make(chan int, 1)
		go func() { done <- (program{out: &log, err: &log}).main(ctx, []string{"run", "--settings", p.settings}) }()
		return func() {
			cancel()
			if status := <-done; status != 0 {
				t.Errorf("status %d\n%s", status, log.String())
			}
		}
	}
	next := func() (d webhook.Document) {
		select {
		case d = <-got:
		case <-time.After(time.Minute):
			t.Fatal("no notice came")
		}
		return d
	}
	stop := daemon()
	first := next()
	if i := first.Items[0]; len(first.Items) != 1 || i.Surface != "apron" || i.To != "exceeded" || i.IndexLow != 60 || i.Instruction != "Walk the edges." ||
		i.NewestReadingAt == nil || !i.Provisional || first.Kind != "news" {
		t.Errorf("%+v", first)
	}
	if out := p.run(t, "seen", first.Key, "--by", "Ada"); !strings.Contains(out, first.Key+" is marked as seen by Ada") {
		t.Error(out)
	}
	p.run(t, "hold", "strip/deep", "--until", "48h", "--by", "Ada", "--why", "survey")
	p.write(t, "arrivals/2.csv", more(9))
	for !strings.Contains(p.run(t, "notices"), "on hold") {
		select {
		case <-t.Context().Done():
			t.Fatal("it is not held")
		case d := <-got:
			t.Fatalf("told in spite of the hold: %+v", d)
		case <-time.After(100 * time.Millisecond):
		}
	}
	holds := p.run(t, "hold", "list")
	if !regexp.MustCompile(`(?m)^1 +strip/deep +20.* Ada +survey$`).MatchString(holds) {
		t.Error(holds)
	}
	p.run(t, "hold", "lift", "1", "--by", "Ada")
	second := next()
	if i := second.Items[0]; i.Surface != "deep" || i.To != "exceeded" && i.To != "near" {
		t.Errorf("%+v", second)
	}
	stop()
	out := p.run(t, "notices", "--site", "strip")
	for _, want := range []string{
		first.Key + ` +duty +hook +news +strip/apron exceeded +1 +delivered .* Ada`, second.Key + ` +duty +hook +news +strip/deep .* +1 +delivered `,
		`Screening figures`,
	} {
		if !regexp.MustCompile(want).MatchString(out) {
			t.Errorf("no %q in\n%s", want, out)
		}
	}
	if len(got) > 0 {
		t.Errorf("a notice too many: %+v", <-got)
	}
	for _, args := range [][]string{{"seen", "n-none", "--by", "Ada"}, {"hold", "strip/none", "--until", "1h", "--by", "A", "--why", "b"}, {"hold", "strip", "--until", "2001-01-01", "--by", "A", "--why", "b"},
		{"hold", "strip", "--until", "1h", "--by", "A"}, {"hold", "lift", "7", "--by", "A"}} {
		var log bytes.Buffer
		if status := (program{out: &log, err: &log}).main(t.Context(), append(args, "--settings", p.settings)); status != 1 {
			t.Errorf("%v: status %d\n%s", args, status, log.String())
		}
	}
}
