package indices

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// fell is a station of an invented place.
var fell = pipeline.Station{
	ID: "FELL", Name: "Fell", LatitudeD: 69, UTCOffset: -8 * time.Hour, Mean: pipeline.MeanMaxMin, MinHours: 20, MaxHole: 3, FillDays: 2,
	ThawYear: pipeline.MonthDay{Month: time.January, Day: 15}, FreezeYear: pipeline.MonthDay{Month: time.July, Day: 15},
}

var maxMin = []pipeline.Series{
	{Sensor: "air", Variable: pipeline.AirTempMax, LevelM: 1.5, SpanS: 86400},
	{Sensor: "air", Variable: pipeline.AirTempMin, LevelM: 1.5, SpanS: 86400},
}

var arrival = time.Date(2032, 1, 1, 0, 0, 0, 0, time.UTC)

// delivery is a batch that a test makes up.
type delivery struct {
	name     string
	readings []pipeline.Reading
}

// world is a database with a station, a feed and a service, no bus.
type world struct {
	*pipelinetest.Database
	service *Service
}

func newWorld(t testing.TB, st pipeline.Station) *world {
	t.Helper()
	db := pipelinetest.New(t)
	err := db.State(t.Context(), store.Stated{Hash: "h", Stations: []pipeline.Station{st}, Feeds: []pipeline.Feed{{Name: "fell"}, {Name: "other", Rank: 5}}})
	if err != nil {
		t.Fatal(err)
	}
	return &world{db, &Service{DB: db.DB, Nudge: func() error { return nil }, Log: zap.NewNop(), CommitReadings: 50000, FailuresAllowed: 3}}
}

// open enters a delivery in the ledger and returns its parts. Batches take their
// order from at, in seconds.
func (w *world) open(t testing.TB, feed string, at int64, d delivery, partSize int) []*pipeline.Part {
	t.Helper()
	b, seen, err := w.OpenBatch(t.Context(), store.Arrival{
		Feed: feed, Name: d.name, Hash: "hash of " + d.name, SourceTime: time.Unix(at, 0).UTC(), SeenTime: time.Unix(at, 0).UTC(),
		ArrivedAt: arrival, Host: "test", ArchivePath: d.name, Layout: &pipeline.Layout{Name: "test"},
	})
	if err != nil || seen != store.SeenNew {
		t.Fatal(seen, err)
	}
	var parts []*pipeline.Part
	var lines []store.PartLine
	for len(d.readings) > 0 {
		n := min(partSize, len(d.readings))
		p := &pipeline.Part{Batch: b.ID, Number: int32(len(parts) + 1), Attempt: 1, Feed: feed, Station: "FELL", Series: maxMin, Readings: d.readings[:n]}
		parts, lines = append(parts, p), append(lines, store.PartLine{Number: p.Number, Station: p.Station, Readings: n})
		d.readings = d.readings[n:]
	}
	if err := w.ReadBatch(t.Context(), b.ID, pipeline.Counts{}, lines); err != nil {
		t.Fatal(err)
	}
	return parts
}

func (w *world) take(t testing.TB, parts ...*pipeline.Part) {
	t.Helper()
	if _, err := w.service.take(t.Context(), "FELL", parts); err != nil {
		t.Fatal(err)
	}
}

func (w *world) fingerprint(t testing.TB) string {
	t.Helper()
	rows := w.Rows(t, `select * from thaw.fingerprint_tables()`)
	return strings.Join(rows, "\n")
}

// days makes max and min readings of daily means, starting at first; NaN leaves
// the day out. Rows are numbered from row.
func days(first pipeline.Day, row int32, means ...float64) (out []pipeline.Reading) {
	for i, c := range means {
		if !math.IsNaN(c) {
			start := fell.DayStart(first + pipeline.Day(i)).Unix()
			out = append(out, pipeline.Reading{Series: 0, Row: row + int32(i), StartS: start, ValueC: c + 2},
				pipeline.Reading{Series: 1, Row: row + int32(i), StartS: start, ValueC: c - 2})
		}
	}
	return out
}

// A date typed wrongly is kept and marked, and makes no day of the record.
func TestDatedInTheFuture(t *testing.T) {
	w := newWorld(t, fell)
	first := pipeline.DayOf(2031, time.May, 1)
	rs := append(days(first, 1, -1, 2, 3), days(pipeline.DayOf(9031, time.May, 4), 4, 5)...)
	rs = append(rs, days(pipeline.DayOf(31, time.May, 5), 5, 5)...)
	w.take(t, w.open(t, "fell", 1, delivery{"file", rs}, 500)...)
	if got := w.Rows(t, `select count(*) filter (where quality = 0), count(*) filter (where quality = 3) from thaw.readings`); got[0] != "(6,4)" {
		t.Errorf("good and wrong readings %v", got)
	}
	if got := w.Rows(t, `select min(day), max(day) from thaw.daily_values where origin = 1`); got[0] != "(2031-05-01,2031-05-03)" {
		t.Errorf("record %v", got)
	}
}

// The order of arrival, repeats and how parts are gathered leave no trace.
func TestOrderOfArrival(t *testing.T) {
	for seed := range uint64(4) {
		t.Run(fmt.Sprint("seed ", seed), func(t *testing.T) {
			random := rand.New(rand.NewPCG(seed, 1))
			first := pipeline.DayOf(2029, time.March, 20)
			var deliveries []delivery
			// Three overlapping deliveries with corrections, gaps, half days and a repeated day.
			for n := range 3 {
				from := random.IntN(200) * n
				var rs []pipeline.Reading
				row := int32(1)
				for d := range 420 {
					if random.IntN(12) == 0 {
						d += random.IntN(6)
					}
					c := -8 + 17*math.Sin(2*math.Pi*float64(from+d-30)/365) + math.Round(random.NormFloat64()*40)/10
					pair := days(first+pipeline.Day(from+d), row, c)
					if random.IntN(25) == 0 {
						pair = pair[:1]
					}
					rs = append(rs, pair...)
					row++
				}
				deliveries = append(deliveries, delivery{fmt.Sprint("file ", n), rs})
			}
			plain, mixed := newWorld(t, fell), newWorld(t, fell)
			var all []*pipeline.Part
			for n, d := range deliveries {
				for _, p := range plain.open(t, "fell", int64(1000+n), d, 100) {
					plain.take(t, p)
				}
				all = append(all, mixed.open(t, "fell", int64(1000+n), d, 100)...)
			}
			all = append(all, all[random.IntN(len(all))], all[random.IntN(len(all))])
			random.Shuffle(len(all), func(i, j int) { all[i], all[j] = all[j], all[i] })
			for len(all) > 0 {
				n := 1 + random.IntN(min(5, len(all)))
				mixed.take(t, all[:n]...)
				all = all[n:]
			}
			if a, b := plain.fingerprint(t), mixed.fingerprint(t); a != b {
				t.Errorf("in order:\n%s\nmixed:\n%s", a, b)
			}
			anew := newWorld(t, fell)
			for n, d := range deliveries {
				anew.take(t, anew.open(t, "fell", int64(1000+n), d, 100)...)
			}
			if err := anew.service.Recompute(t.Context(), "FELL"); err != nil {
				t.Fatal(err)
			}
			if a, b := plain.fingerprint(t), anew.fingerprint(t); a != b {
				t.Errorf("step by step:\n%s\nmade anew:\n%s", a, b)
			}
		})
	}
}
