package main

import (
	"bytes"
	"context"
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// feedRead runs `feed read tarn` with files, or - and what is on standard input.
func (p *place) feedRead(t *testing.T, stdin string, files ...string) (status int, said string) {
	t.Helper()
	var out bytes.Buffer
	args := append([]string{"feed", "read", "tarn"}, files...)
	status = program{out: &out, err: &out, stdin: strings.NewReader(stdin)}.main(t.Context(), append(args, "--settings", p.settings))
	return status, out.String()
}

// Files are taken by hand whether a daemon runs or not, and the same bytes once.
func TestFeedRead(t *testing.T) {
	t.Parallel()
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), map[string]string{
		"by-hand/a.csv": hours(0, 1, 2, 3, 4, 5) + "2025-07-10 05:00,x\n", "by-hand/b.csv": hours(6, 6), "feed/found.csv": hours(20, 1),
	})
	a, b := filepath.Join(p.dir, "by-hand", "a.csv"), filepath.Join(p.dir, "by-hand", "b.csv")
	if status, said := p.feedRead(t, "", a, b); status != 0 || !strings.Contains(said, "line 7: bad_number") || strings.Count(said, "tarn   done") != 2 {
		t.Errorf("without a daemon: status %d\n%s", status, said)
	}
	if got := p.rows(t, readingsByHour); len(got) != 6 {
		t.Errorf("readings %v; want those of the files that were handed over", got)
	}
	if status, said := p.feedRead(t, "", a); status != 0 || !strings.Contains(said, "came before") {
		t.Errorf("again: status %d\n%s", status, said)
	}

	d := p.start(t, "run")
	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	for !strings.Contains(d.said(), `"running"`) {
		select {
		case <-ctx.Done():
			t.Fatal(d.said())
		case <-time.After(10 * time.Millisecond):
		}
	}
	if status, said := p.feedRead(t, hours(8, 9), "-"); status != 0 || !strings.Contains(said, "done") {
		t.Errorf("with a daemon: status %d\n%s", status, said)
	}
	if status, said := p.feedRead(t, "when,t\n2025-07-10 10:00,4\n", "-"); status != 1 || !strings.Contains(said, `is held back: line 1: there is no column "time"`) {
		t.Errorf("another layout: status %d\n%s", status, said)
	}
	if status, said := p.feedRead(t, "", filepath.Join(p.dir, "no such file")); status != 1 || !strings.Contains(said, "no such file") {
		t.Errorf("no file: status %d\n%s", status, said)
	}
	if err := d.cmd.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	<-d.ended
	if got := p.rows(t, readingsByHour); len(got) != 8 {
		t.Errorf("readings %v; want six, one found in the folder and one from standard input", got)
	}
}
