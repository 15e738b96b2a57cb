package ingest

import (
	"context"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/zap"
	"go.uber.org/zap/zapcore"
	"go.uber.org/zap/zaptest/observer"

	"thawledger/ingest/archive"
	"thawledger/pipeline"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// stopped returns a ctx that ends when the worker says that it has read a batch:
// after its parts are in the ledger, before the first is published.
func stopped(t *testing.T, p *place) context.Context {
	ctx, cancel := context.WithCancel(t.Context())
	t.Cleanup(cancel)
	core, _ := observer.New(zap.InfoLevel)
	p.again(func(c *Config) {
		c.Log = zap.New(core, zap.Hooks(func(e zapcore.Entry) error {
			if e.Message == "batch read" {
				cancel()
			}
			return nil
		}))
	})
	return ctx
}

const partLines = `select part, attempt, published_at is not null, stuck_at is not null from thaw.batch_parts order by part`

// Whatever a process was killed at, the next one sends every part.
func TestFinishedByTheNext(t *testing.T) {
	for _, tc := range []struct {
		name  string
		leave func(t *testing.T, p *place)
		lines []string
		ids   []string
	}{
		{"before the first part", func(t *testing.T, p *place) {
			ctx := stopped(t, p)
			if err := p.Look(ctx); !errors.Is(err, context.Canceled) {
				t.Errorf("error %v", err)
			}
		}, []string{"(1,2,t,f)", "(2,2,t,f)"}, []string{"1/1/2", "1/2/2"}},
		{"bus gone", func(t *testing.T, p *place) {
			closeBus(t, p.Bus)
			if err := p.Look(t.Context()); !errors.Is(err, bus.ErrClosed) || !strings.Contains(err.Error(), "a.csv") {
				t.Errorf("error %v, want one that names the file and the closed bus", err)
			}
			p.Bus = openBus(t, p.busDir)
		}, []string{"(1,2,t,f)", "(2,2,t,f)"}, []string{"1/1/2", "1/2/2"}},
		{"one part not confirmed", func(t *testing.T, p *place) {
			p.look(t)
			p.lose(t, 2)
			if err := pipelinetest.Exec(t.Context(), p.URL, `update thaw.batch_parts set published_at = null where part = 2`); err != nil {
				t.Fatal(err)
			}
		}, []string{"(1,1,t,f)", "(2,2,t,f)"}, []string{"1/2/2"}},
		{"opened, not read", func(t *testing.T, p *place) {
			kept, err := p.Archive.Keep(archive.Origin{Feed: "fell", Name: "a.csv"}, strings.NewReader(file(300, "2030-05-01")))
			if err != nil {
				t.Fatal(err)
			}
			f := &p.Feeds[0]
			_, _, err = p.DB().OpenBatch(t.Context(), store.Arrival{Feed: "fell", Name: "a.csv", Hash: kept.Hash, Bytes: kept.Bytes, SourceTime: noon,
				SeenTime: noon, ArrivedAt: noon, Host: p.Archive.ID(), ArchivePath: kept.Path, Layout: &f.Layout})
			if err != nil {
				t.Fatal(err)
			}
		}, []string{"(1,1,t,f)", "(2,1,t,f)"}, []string{"1/1/1", "1/2/1"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			p := newPlace(t)
			p.put(t, "fell/a.csv", file(300, "2030-05-01"), time.Hour)
			tc.leave(t, p)
			if n := p.waiting(t); n != 0 {
				t.Fatalf("%d parts on the bus before the next process", n)
			}
			p.again(func(c *Config) { c.Log = zap.NewNop() })
			p.finish(t.Context())
			if diff := cmp.Diff(tc.lines, p.Rows(t, partLines)); diff != "" {
				t.Errorf("ledger: %s", diff)
			}
			p.finish(t.Context()) // nothing is left to be done
			ids, _ := p.lose(t, len(tc.ids))
			if diff := cmp.Diff(tc.ids, ids); diff != "" {
				t.Errorf("on the bus: %s", diff)
			}
			if got := p.one(t, `select state, rows, rows_read from thaw.batches`); got != "read,300,300" {
				t.Errorf("batch %s", got)
			}
		})
	}
}

// What the bus has confirmed and lost is published again, under a new name, once
// its time is over and the bus is empty; after the attempts that are allowed it
// is given up, and left alone from then on.
func TestLostPartsArePublishedAgain(t *testing.T) {
	p := newPlace(t)
	p.put(t, "fell/a.csv", file(300, "2030-05-01"), time.Hour)
	p.look(t)
	first, _ := p.lose(t, 2)
	p.finish(t.Context()) // not overdue yet
	if n := p.waiting(t); n != 0 {
		t.Fatalf("%d parts published again before their time", n)
	}
	if err := pipelinetest.Exec(t.Context(), p.URL, `update thaw.batch_parts set committed_at = now() where part = 1`); err != nil {
		t.Fatal(err)
	}
	p.RepublishAfter = time.Millisecond
	names := first[:1]
	for range 2 {
		eventually(t, "published again", func() bool { p.finish(t.Context()); return p.waiting(t) > 0 })
		p.finish(t.Context()) // it is on its way: not once more
		ids, _ := p.lose(t, 1)
		names = append(names, ids...)
	}
	if diff := cmp.Diff([]string{"1/1/1", "1/2/2", "1/2/3"}, names); diff != "" {
		t.Error(diff)
	}
	stuck := func() bool {
		return p.one(t, `select count(*) from thaw.batch_parts where stuck_at is not null`) == "1"
	}
	eventually(t, "given up", func() bool { p.finish(t.Context()); return stuck() })
	p.finish(t.Context())
	if diff := cmp.Diff([]string{"(1,1,t,f)", "(2,3,t,t)"}, p.Rows(t, partLines)); diff != "" || p.waiting(t) != 0 {
		t.Errorf("%d on the bus; %s", p.waiting(t), diff)
	}
	if got := p.one(t, `select reason from thaw.batch_parts where part = 2`); got != "published 3 times and never committed" {
		t.Errorf("reason %q", got)
	}
}

// Every line, row and cell of a file ends as exactly one thing.
func TestLedgerAddsUp(t *testing.T) {
	p := newPlace(t)
	p.put(t, "fell/a.csv", strings.Join([]string{
		"date,max,min",
		"# typed by hand",
		"2031-05-01,4,-2",
		"",
		"2031-05-0x,1,1",
		"2031-05-02,four,-3",
		"2031-05-03,-99,-99",
		"2031-05-04,5",
		"2031-05-05,-99,x",
		"2031-05-01,4.5,-2", // repeated
		"2031-05-06,450,1",
		`2031-05-07,"3,1`,
		"2031-05-08,,2",
	}, "\n"), time.Hour)
	p.look(t)
	// Counted by hand.
	if got := p.one(t, `select lines, lines_header, lines_blank, lines_comment, rows, rows_read, rows_without_value, rows_set_aside from thaw.batches`); got != "13,1,1,1,10,5,1,4" {
		t.Errorf("lines and rows %s", got)
	}
	if got := p.one(t, `select cells, cells_read, cells_missing, cells_set_aside, parts from thaw.batches`); got != "20,7,4,9,1" {
		t.Errorf("cells %s", got)
	}
	if _, readings := p.lose(t, 1); readings != 7 {
		t.Errorf("%d readings on the bus, want 7", readings)
	}
	got := p.Rows(t, `select line, row_no, column_no, column_name, code, length(reason) > 10, md5(raw) from thaw.set_aside order by line, column_no`)
	row := func(start, raw string) string {
		return "(" + start + ",t," + p.one(t, "select md5('"+raw+"')") + ")"
	}
	want := []string{
		row(`5,2,0,"",bad_time`, "2031-05-0x,1,1"), row("6,3,2,max,bad_number", "2031-05-02,four,-3"), row(`8,5,0,"",wrong_width`, "2031-05-04,5"),
		row("9,6,3,min,bad_number", "2031-05-05,-99,x"), row("11,8,2,max,out_of_bounds", "2031-05-06,450,1"), row(`12,9,0,"",bad_quote`, `2031-05-07,"3,1`),
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
}

// What is wrong with one feed's folder, or its part of the archive, is told by
// name and does not keep the other feeds from being read.
func TestTroubleWithOneFeed(t *testing.T) {
	for _, tc := range []struct {
		name     string
		spoil    func(p *place) error
		mend     func(p *place) error
		mentions []string
	}{
		{"no folder", func(p *place) error { return os.Rename(filepath.Join(p.dir, "fell"), filepath.Join(p.dir, "away")) },
			func(p *place) error { return os.Rename(filepath.Join(p.dir, "away"), filepath.Join(p.dir, "fell")) }, []string{"fell"}},
		{"folder is a file", func(p *place) error {
			return errors.Join(os.Rename(filepath.Join(p.dir, "fell"), filepath.Join(p.dir, "away")), os.WriteFile(filepath.Join(p.dir, "fell"), nil, 0o600))
		}, func(p *place) error {
			return errors.Join(os.Remove(filepath.Join(p.dir, "fell")), os.Rename(filepath.Join(p.dir, "away"), filepath.Join(p.dir, "fell")))
		}, []string{"fell"}},
		{"archive is a file", func(p *place) error { return os.WriteFile(filepath.Join(p.dir, "archive", "fell"), nil, 0o600) },
			func(p *place) error { return os.Remove(filepath.Join(p.dir, "archive", "fell")) }, []string{"fell", "a.csv", "archive"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			p := newPlace(t)
			p.put(t, "fell/a.csv", file(3, "2030-05-01"), time.Hour)
			p.put(t, "tarn/b.csv", file(4, "2030-05-01"), time.Hour)
			if err := tc.spoil(p); err != nil {
				t.Fatal(err)
			}
			err := p.Look(t.Context())
			for _, name := range tc.mentions {
				if err == nil || !strings.Contains(err.Error(), name) {
					t.Errorf("error %v, want one that names %s", err, name)
				}
			}
			if diff := cmp.Diff([]string{"(b.csv,read,1,f)"}, p.Rows(t, batches)); diff != "" {
				t.Errorf("ledger: %s", diff)
			}
			if got := p.one(t, `select count(*) from thaw.feed_files`); got != "1" {
				t.Errorf("%s files marked as seen, want the one that was read", got)
			}
			if ok, err := p.Settled(t.Context()); err == nil {
				t.Errorf("settled %t without a word of the trouble", ok)
			}
			if err := tc.mend(p); err != nil {
				t.Fatal(err)
			}
			p.look(t)
			if diff := cmp.Diff([]string{"(b.csv,read,1,f)", "(a.csv,read,1,f)"}, p.Rows(t, batches)); diff != "" {
				t.Errorf("mended: %s", diff)
			}
		})
	}
}

// A batch that its layout cannot read is held back in the end; one whose bytes
// are out of reach, as on a disk that is not there, waits for them.
func TestBatchThatCannotBeRead(t *testing.T) {
	for _, tc := range []struct {
		name  string
		spoil func(a *store.Arrival, l *pipeline.Layout)
		want  string
	}{
		{"layout", func(_ *store.Arrival, l *pipeline.Layout) { l.Time.Format = "YYYY-MM" }, "held_back"},
		{"bytes", func(a *store.Arrival, _ *pipeline.Layout) { a.ArchivePath = "fell/00/00" }, "opened"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			p := newPlace(t)
			kept, err := p.Archive.Keep(archive.Origin{Feed: "fell", Name: "a.csv"}, strings.NewReader(file(3, "2030-05-01")))
			if err != nil {
				t.Fatal(err)
			}
			l := fellLayout()
			a := store.Arrival{Feed: "fell", Name: "a.csv", Hash: kept.Hash, Bytes: kept.Bytes, SourceTime: noon, SeenTime: noon, ArrivedAt: noon,
				Host: p.Archive.ID(), ArchivePath: kept.Path, Layout: &l}
			tc.spoil(&a, &l)
			if _, _, err := p.DB().OpenBatch(t.Context(), a); err != nil {
				t.Fatal(err)
			}
			for n := range readFailures {
				if got := p.one(t, `select state from thaw.batches`); got != "opened" {
					t.Fatalf("%s after %d failures", got, n)
				}
				p.finish(t.Context())
			}
			if got := p.one(t, `select state, coalesce(reason, '') like 'could not be read: %YYYY-MM%' from thaw.batches`); got != tc.want+map[string]string{"held_back": ",t", "opened": ",f"}[tc.want] {
				t.Errorf("batch %s, want it %s", got, tc.want)
			}
			if tc.want == "held_back" {
				return
			}
			there := filepath.Join(p.dir, "archive", a.ArchivePath)
			if err := errors.Join(os.MkdirAll(filepath.Dir(there), 0o700), os.Link(filepath.Join(p.dir, "archive", kept.Path), there)); err != nil {
				t.Fatal(err)
			}
			p.finish(t.Context())
			if got := p.one(t, `select state, rows from thaw.batches`); got != "read,3" {
				t.Errorf("batch %s once its bytes are there", got)
			}
		})
	}
}
