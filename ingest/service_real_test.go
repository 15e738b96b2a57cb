package ingest

import (
	"context"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/goleak"
	"go.uber.org/zap"
	"go.uber.org/zap/zaptest/observer"

	"thawledger/pipeline"
)

const batches = `select name, state, parts, reason is not null from thaw.batches order by batch_id`

// A file is read once, whatever it is called the second time.
func TestFileIsReadOnce(t *testing.T) {
	p := newPlace(t)
	p.put(t, "fell/a.csv", file(300, "2030-05-01"), time.Hour)
	p.look(t)
	if diff := cmp.Diff([]string{"(a.csv,read,2,f)"}, p.Rows(t, batches)); diff != "" {
		t.Fatal(diff)
	}
	tables := p.one(t, `select thaw.fingerprint()`)
	core, seen := observer.New(zap.InfoLevel)
	p.again(func(c *Config) { c.Log = zap.New(core) })
	before := 0
	for _, tc := range []struct {
		name   string
		do     func()
		opened int // how many files are looked into
	}{
		{"nothing new", func() {}, 0},
		{"same bytes written again", func() { p.put(t, "fell/a.csv", file(300, "2030-05-01"), time.Minute) }, 1},
		{"same bytes under another name", func() { p.put(t, "fell/b.csv", file(300, "2030-05-01"), time.Minute) }, 1},
		{"name that does not match", func() { p.put(t, "fell/notes.txt", "no readings", time.Hour) }, 0},
		{"a fresh worker", func() { p.again(nil) }, 0},
	} {
		tc.do()
		p.look(t)
		if got := p.one(t, `select thaw.fingerprint()`); got != tables || p.waiting(t) != 2 {
			t.Errorf("%s: ledger changed (%t), or parts published: %d on the bus, want 2", tc.name, got != tables, p.waiting(t))
		}
		looked := seen.FilterMessageSnippet("known already").Len()
		if n := looked - before; n != tc.opened {
			t.Errorf("%s: %d files looked into, want %d", tc.name, n, tc.opened)
		}
		before = looked
	}
	ids, readings := p.lose(t, 2)
	if diff := cmp.Diff([]string{"1/1/1", "1/2/1"}, ids); diff != "" || readings != 600 {
		t.Errorf("%d readings in %v, want 600", readings, ids)
	}
	if got := p.one(t, `select count(*), count(published_at), sum(readings), max(attempt) from thaw.batch_parts`); got != "2,2,600,1" {
		t.Errorf("parts in the ledger %s", got)
	}
}

// Other bytes under a name are another batch; a return to earlier ones waits.
func TestReturnToEarlierBytes(t *testing.T) {
	p := newPlace(t)
	for i, text := range []string{file(3, "2030-05-01"), file(4, "2030-05-01"), file(3, "2030-05-01")} {
		p.put(t, "fell/a.csv", text, time.Duration(10-i)*time.Minute)
		p.look(t)
	}
	if diff := cmp.Diff([]string{"(a.csv,read,1,f)", "(a.csv,read,1,f)", "(a.csv,waiting,,t)"}, p.Rows(t, batches)); diff != "" {
		t.Error(diff)
	}
	p.finish(t.Context())
	p.reopenHeld(t.Context())
	if ids, _ := p.lose(t, 2); len(ids) != 2 {
		t.Errorf("on the bus %v, want the parts of two batches", ids)
	}
}

// A file that may still be being written is left alone until it has stood still.
func TestUnsettledFile(t *testing.T) {
	p := newPlace(t)
	settled := func(want bool, batches string) {
		t.Helper()
		p.look(t)
		got, err := p.Settled(t.Context())
		if err != nil || got != want {
			t.Errorf("settled %t, %v, want %t", got, err, want)
		}
		if n := p.one(t, `select count(*) from thaw.batches`); n != batches {
			t.Errorf("%s batches, want %s", n, batches)
		}
	}
	if ok, err := p.Settled(t.Context()); ok || err != nil {
		t.Errorf("settled before the first look: %t, %v", ok, err)
	}
	p.put(t, "fell/a.csv", file(3, "2030-05-01"), 4*time.Second)
	settled(false, "0")
	p.at = p.at.Add(5 * time.Second)
	settled(false, "0")
	p.put(t, "fell/a.csv", file(4, "2030-05-01"), 0) // it grows
	p.at = p.at.Add(9 * time.Second)
	settled(false, "0")
	p.at = p.at.Add(time.Second)
	p.look(t)
	settled(true, "1")
	if got := p.one(t, `select rows from thaw.batches`); got != "4" {
		t.Errorf("%s rows, want those of the file as it was left", got)
	}
}

// What cannot be read as a whole is held back with its reason, nothing of it is
// used, and a corrected layout reads it.
func TestHeldBack(t *testing.T) {
	p := newPlace(t)
	for _, tc := range []struct{ name, text, reason string }{
		{"columns.csv", "day,max,min\n2030-05-01,4,2\n", "date"},
		{"rows.csv", "date,max,min\n2030-05-01,4,2\n01.05.2030,4,2\n02.05.2030,4,2\n", "2 of 3 rows"},
	} {
		p.put(t, "fell/"+tc.name, tc.text, time.Hour)
		p.look(t)
		got := p.one(t, `select state, parts from thaw.batches order by batch_id desc limit 1`)
		reason := p.one(t, `select reason from thaw.batches order by batch_id desc limit 1`)
		if got != "held_back,0" || !strings.Contains(reason, tc.reason) {
			t.Errorf("%s: %s, %q, want a reason that names %q", tc.name, got, reason, tc.reason)
		}
	}
	if got := p.one(t, `select count(*) from thaw.set_aside`); got != "2" {
		t.Errorf("%s rows set aside kept for looking at, want 2", got)
	}
	p.again(nil) // the same layout again
	p.reopenHeld(t.Context())
	p.finish(t.Context())
	if n, m := p.one(t, `select count(*) from thaw.batches where state = 'held_back'`), p.one(t, `select count(*) from thaw.batch_parts`); n != "2" || m != "0" || p.waiting(t) != 0 {
		t.Fatalf("%s held back with %s parts, %d on the bus", n, m, p.waiting(t))
	}
	p.again(func(c *Config) {
		l := fellLayout()
		l.Time.Columns, l.Time.Format, l.Values[0].Column, l.Values[1].Column = []string{"1"}, "DD.MM.YYYY", "2", "3"
		l.NamesLine, l.Comment, l.MaxSetAside = 0, "d", 0.5
		c.Feeds = append([]pipeline.Feed(nil), c.Feeds...)
		c.Feeds[0].Layout = l
	})
	p.reopenHeld(t.Context())
	p.finish(t.Context())
	got := p.Rows(t, `select name, state, rows, rows_read, rows_set_aside, parts from thaw.batches order by batch_id`)
	if diff := cmp.Diff([]string{"(columns.csv,held_back,1,0,1,0)", "(rows.csv,read,3,2,1,1)"}, got); diff != "" {
		t.Error(diff)
	}
	if got := p.one(t, `select count(*), min(line) from thaw.set_aside where batch_id = 2`); got != "1,2" {
		t.Errorf("set aside of the batch read anew: number and line %s", got)
	}
	if ids, readings := p.lose(t, 1); len(ids) != 1 || readings != 4 {
		t.Errorf("%v with %d readings", ids, readings)
	}
}

// Run looks at once, so that what came meanwhile is caught up, and then on
// schedule. A panic in a look ends that look and nothing else.
func TestRun(t *testing.T) {
	p := newPlace(t)
	var panics atomic.Bool
	core, seen := observer.New(zap.ErrorLevel)
	p.again(func(c *Config) {
		c.Log = zap.New(core)
		c.Feeds[1].Schedule = "@yearly"
		c.Now = func() time.Time {
			if panics.CompareAndSwap(true, false) {
				panic("clock has stopped")
			}
			return noon
		}
	})
	p.put(t, "fell/a.csv", file(3, "2030-05-01"), time.Hour)
	p.look(t) // the bus has its own goroutines from the first part on
	p.again(nil)
	p.put(t, "fell/b.csv", file(4, "2030-05-01"), time.Hour)
	before := goleak.IgnoreCurrent()
	intake, end := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- p.Run(intake, t.Context()) }()
	count := func(want string) func() bool {
		return func() bool { return p.one(t, `select count(*) from thaw.batches where state = 'read'`) == want }
	}
	eventually(t, "looked at every feed", func() bool {
		ok, err := p.Settled(t.Context())
		return ok && err == nil && count("2")()
	})
	panics.Store(true)
	eventually(t, "panic told", func() bool { return seen.FilterMessageSnippet("panic").Len() > 0 })
	p.put(t, "fell/c.csv", file(5, "2030-05-01"), time.Hour)
	eventually(t, "looked on schedule", count("3"))
	end()
	if err := <-ended; err != nil {
		t.Error(err)
	}
	if err := goleak.Find(before); err != nil {
		t.Error(err)
	}
	if seen.FilterMessageSnippet("panic").Len() != seen.Len() {
		t.Errorf("other faults told: %v", seen.All())
	}
}

func TestScheduleThatIsNone(t *testing.T) {
	p := newPlace(t)
	p.again(func(c *Config) { c.Feeds[1].Schedule = "now and then" })
	if err := p.Run(t.Context(), t.Context()); err == nil || !strings.Contains(err.Error(), "tarn") {
		t.Errorf("error %v, want one that names the feed", err)
	}
}
