package main

import (
	"bytes"
	"fmt"
	"net/http"
	"net/http/httptest"
	"strings"
	"testing"
	"time"
)

// A file on a web server is read as it grows, and a server that is away is said
// and waited for.
func TestRemoteFeed(t *testing.T) {
	t.Parallel()
	text, at := hours(0, 1, 2), time.Date(2025, 7, 11, 0, 0, 0, 0, time.UTC)
	s := httptest.NewServer(http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		if r.Header.Get("Authorization") != "Bearer token" {
			w.WriteHeader(http.StatusUnauthorized)
			return
		}
		http.ServeContent(w, r, "log.csv", at, strings.NewReader(text))
	}))
	defer s.Close()
	settings := strings.Replace(fmt.Sprintf(hourlySettings, "Z", ", grows: true"), "folder: feed,", fmt.Sprintf("url: {address: %q, bearer_file: token},", s.URL+"/log.csv"), 1)
	p := newPlace(t, settings, map[string]string{"token": "token\n"})
	p.run(t, "run", "--until-idle")
	text, at = text+"2025-07-10 02:00,3\n", at.Add(time.Hour)
	p.run(t, "run", "--until-idle")
	once := newPlace(t, strings.Replace(settings, ", grows: true", "", 1), map[string]string{"token": "token"})
	once.run(t, "run", "--until-idle")
	if got := once.run(t, "ledger"); !strings.Contains(got, "done      1") {
		t.Errorf("a file that does not grow:\n%s", got)
	}
	if got := p.rows(t, `select count(*), (select count(*) from thaw.batches), (select max(from_byte) from thaw.batches) from thaw.readings`); got[0] != fmt.Sprintf("(3,2,%d)", len(hours(0, 1, 2))) {
		t.Errorf("readings, batches and where the last begins: %v", got)
	}
	s.Close()
	var out, log bytes.Buffer
	if status := (program{out: &out, err: &log}).main(t.Context(), []string{"run", "--until-idle", "--settings", p.settings}); status != 1 || !strings.Contains(log.String(), "feeds cannot be read: fetch feed tarn: ask 127.0.0.1") {
		t.Errorf("with the server away: status %d\n%s", status, log.String())
	}
}
