package ingest

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"go.uber.org/zap"

	"thawledger/ingest/archive"
	"thawledger/pipeline"
	"thawledger/pipeline/bus"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

func TestMain(m *testing.M) { pipelinetest.Main(m) }

// patience is how long a test waits for something that must come.
const patience = 30 * time.Second

func eventually(t testing.TB, what string, isTrue func() bool) {
	t.Helper()
	tick := time.NewTicker(5 * time.Millisecond)
	defer tick.Stop()
	deadline := time.Now().Add(patience)
	for !isTrue() {
		if <-tick.C; time.Now().After(deadline) {
			t.Fatalf("%s: not within %v", what, patience)
		}
	}
}

// noon is when tests begin.
var noon = time.Date(2031, 7, 1, 12, 0, 0, 0, time.UTC)

// place is a database, a bus, an archive and the folders of two feeds, with an
// ingest worker.
type place struct {
	*pipelinetest.Database
	*Service
	dir    string
	busDir string
	at     time.Time // what the worker's clock shows
}

// fellLayout reads lines such as 2031-05-01,4,-2.
func fellLayout() pipeline.Layout {
	value := func(column, variable string) pipeline.ValueColumn {
		return pipeline.ValueColumn{Column: column, Variable: variable, Unit: pipeline.DegC, Sensor: "air", LevelM: 1.5, Missing: []string{"-99"}}
	}
	return pipeline.Layout{
		Name: "fell", Delimiter: ",", Comment: "#", NamesLine: 1, MaxSetAside: 0.5,
		Time:    pipeline.TimeColumns{Columns: []string{"date"}, Format: "YYYY-MM-DD", Zone: "station", Covers: pipeline.CoversDay, SpanS: 86400},
		Station: pipeline.StationColumn{Constant: "FELL", Clocks: map[string]pipeline.StationClock{"FELL": {UTCOffsetS: -8 * 3600}}},
		Values:  []pipeline.ValueColumn{value("max", "air_temp_max"), value("min", "air_temp_min")},
	}
}

func newPlace(t *testing.T) *place {
	t.Helper()
	p := &place{Database: pipelinetest.New(t), dir: t.TempDir(), busDir: t.TempDir(), at: noon}
	kept, err := archive.Open(filepath.Join(p.dir, "archive"))
	if err != nil {
		t.Fatal(err)
	}
	var feeds []pipeline.Feed
	for _, name := range []string{"fell", "tarn"} {
		f := pipeline.Feed{Name: name, Folder: filepath.Join(p.dir, name), Pattern: "*.csv", Settle: 10 * time.Second, Schedule: "@every 1s", Layout: fellLayout()}
		if err := os.Mkdir(f.Folder, 0o700); err != nil {
			t.Fatal(err)
		}
		feeds = append(feeds, f)
	}
	if err := p.State(t.Context(), store.Stated{Hash: "h", Feeds: feeds}); err != nil {
		t.Fatal(err)
	}
	p.Service = New(Config{
		DB: p.DB(), Archive: kept, Feeds: feeds, Log: zap.NewNop(), Now: func() time.Time { return p.at },
		RepublishAfter: time.Hour, RepublishAllowed: 3, Bus: openBus(t, p.busDir),
	})
	return p
}

// DB returns the database, which both embedded types have.
func (p *place) DB() *store.DB { return p.Database.DB }

func openBus(t *testing.T, dir string) *bus.Bus {
	t.Helper()
	b, err := bus.Open(t.Context(), bus.Config{Embedded: &bus.Embedded{Dir: dir}})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { closeBus(t, b) })
	return b
}

func closeBus(t *testing.T, b *bus.Bus) {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.WithoutCancel(t.Context()), patience)
	defer cancel()
	if err := b.Close(ctx); err != nil {
		t.Error(err)
	}
}

// again replaces the worker by a fresh one, as after a start of the process.
func (p *place) again(change func(*Config)) {
	c := p.Config
	if change != nil {
		change(&c)
	}
	p.Service = New(c)
}

// put writes a file that was last written the given time ago.
func (p *place) put(t *testing.T, name, text string, ago time.Duration) {
	t.Helper()
	path := filepath.Join(p.dir, name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Chtimes(path, p.at.Add(-ago), p.at.Add(-ago)); err != nil {
		t.Fatal(err)
	}
}

func (p *place) look(t *testing.T) {
	t.Helper()
	if err := p.Look(t.Context()); err != nil {
		t.Fatal(err)
	}
}

// one returns the only row of a query.
func (p *place) one(t *testing.T, sql string) string {
	t.Helper()
	rows := p.Rows(t, sql)
	if len(rows) != 1 {
		t.Fatalf("%s: %v", sql, rows)
	}
	return strings.Trim(rows[0], `()"`)
}

func (p *place) waiting(t *testing.T) uint64 {
	t.Helper()
	n, err := p.Bus.Waiting(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	return n
}

// lose takes n parts off the bus without working them off, and returns their
// names and readings.
func (p *place) lose(t *testing.T, n int) (ids []string, readings int) {
	t.Helper()
	taker, err := p.Bus.NewTaker(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	eventually(t, "parts to take", func() bool {
		ds, err := taker.Take(t.Context(), 100, time.Second)
		if err != nil {
			t.Fatal(err)
		}
		for _, d := range ds {
			if d.Err != nil {
				t.Fatal(d.Err)
			}
			ids, readings = append(ids, d.ID.String()), readings+len(d.Part.Readings)
			if err := d.NeverAgain("lost by a test"); err != nil {
				t.Fatal(err)
			}
		}
		return len(ids) >= n
	})
	eventually(t, "bus empty", func() bool { return p.waiting(t) == 0 })
	return ids, readings
}

// file makes a file of days, the maximum of each 4 degC above its minimum.
func file(days int, from string) string {
	first, err := pipeline.ParseDay(from)
	if err != nil {
		panic(err)
	}
	var b strings.Builder
	b.WriteString("date,max,min\n")
	for d := range days {
		b.WriteString((first + pipeline.Day(d)).String() + ",6,2\n")
	}
	return b.String()
}
