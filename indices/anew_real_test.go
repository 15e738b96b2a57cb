package indices

import (
	"fmt"
	"math"
	"math/rand/v2"
	"sync"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// Whatever comes in whatever order, the tables hold what a recompute of
// everything makes of them. Each case here once did not.

type several struct {
	*pipelinetest.Database
	svc   *Service
	count int64
}

func named(id string, neighbours ...string) pipeline.Station {
	s := fell
	s.ID, s.Name, s.Neighbours, s.Measures = id, id, neighbours, pipeline.OfTheAir
	return s
}

func newSeveral(t *testing.T, stations ...pipeline.Station) *several {
	t.Helper()
	db := pipelinetest.New(t)
	w := &several{Database: db, svc: &Service{DB: db.DB, Nudge: func() error { return nil }, Log: zap.NewNop(), CommitReadings: 50000, FailuresAllowed: 3, Workers: 2}}
	w.state(t, stations...)
	return w
}

func (w *several) state(t *testing.T, stations ...pipeline.Station) {
	t.Helper()
	w.count++
	err := w.State(t.Context(), store.Stated{Hash: fmt.Sprint("h", w.count), Stations: stations, Feeds: []pipeline.Feed{{Name: "fell"}, {Name: "other", Rank: 5}}})
	if err != nil {
		t.Fatal(err)
	}
}

// part enters readings of a station in the ledger, as the newest batch.
func (w *several) part(t *testing.T, station string, readings []pipeline.Reading) *pipeline.Part {
	t.Helper()
	w.count++
	name, at := fmt.Sprint("f", w.count), time.Unix(w.count, 0).UTC()
	b, _, err := w.OpenBatch(t.Context(), store.Arrival{Feed: "fell", Name: name, Hash: "hash of " + name, SourceTime: at, SeenTime: at,
		ArrivedAt: arrival, Host: "test", ArchivePath: name, Layout: &pipeline.Layout{Name: "test"}})
	if err != nil {
		t.Fatal(err)
	}
	p := &pipeline.Part{Batch: b.ID, Number: 1, Attempt: 1, Feed: "fell", Station: station, Series: maxMin, Readings: readings}
	if err := w.ReadBatch(t.Context(), b.ID, pipeline.Counts{}, []store.PartLine{{Number: 1, Station: station, Readings: len(readings)}}); err != nil {
		t.Fatal(err)
	}
	return p
}

func (w *several) in(t *testing.T, station string, readings []pipeline.Reading) {
	t.Helper()
	if _, err := w.svc.take(t.Context(), station, []*pipeline.Part{w.part(t, station, readings)}); err != nil {
		t.Fatal(err)
	}
}

// settle works off the marks, and those that this sets.
func (w *several) settle(t *testing.T) {
	t.Helper()
	for range 4 {
		if err := w.svc.MakeMarked(t.Context()); err != nil {
			t.Fatal(err)
		}
	}
}

// isAsAnew compares what stands with what a recompute of everything makes of it.
func (w *several) isAsAnew(t *testing.T, stations ...string) {
	t.Helper()
	tables := func() [][]string {
		return [][]string{
			w.Rows(t, `select * from thaw.daily_values order by station, day`),
			w.Rows(t, `select * from thaw.air_index_daily order by station, day`),
			w.Rows(t, `select * from thaw.air_index_season order by station, kind, definition, season_start`),
		}
	}
	stood := tables()
	for range 2 {
		for _, s := range stations {
			if err := w.svc.Recompute(t.Context(), s); err != nil {
				t.Fatal(err)
			}
		}
	}
	w.settle(t)
	if diff := cmp.Diff(stood, tables()); diff != "" {
		t.Errorf("as it stood (-) and made anew (+):\n%.3000s", diff)
	}
}

// sharedWeather is the weather of two stations near each other.
func sharedWeather(seed uint64, n int) (a, b []float64) {
	random := rand.New(rand.NewPCG(seed, 7))
	shared := 0.0
	for i := range n {
		shared = 0.7*shared + 3*random.NormFloat64()
		c := -5 + 17*math.Cos(2*math.Pi*(float64(i%365)-200)/365) + shared
		a = append(a, math.Round(10*(c+0.5*random.NormFloat64()))/10)
		b = append(b, math.Round(10*(0.9*c+1+0.5*random.NormFloat64()))/10)
	}
	return a, b
}

// withoutMin leaves out the minima of some days, so that they have no mean but
// something of their own.
func withoutMin(readings []pipeline.Reading, from, to pipeline.Day) (out []pipeline.Reading) {
	for _, r := range readings {
		if d := fell.DayAt(time.Unix(r.StartS, 0)); r.Series != 1 || d < from || d > to {
			out = append(out, r)
		}
	}
	return out
}

func wrong(readings []pipeline.Reading) []pipeline.Reading {
	out := append([]pipeline.Reading(nil), readings...)
	for i := range out {
		out[i].Quality = pipeline.QualityWrong
	}
	return out
}

var in2020 = pipeline.DayOf(2020, time.January, 15)

// Half-days filled from a neighbour, and joined; then it is a neighbour no more.
func TestNoErrorOutlivesAFilling(t *testing.T) {
	road := named("ROAD")
	road.Joined = []pipeline.Member{{Station: "FELL"}}
	w := newSeveral(t, named("FELL", "TARN"), named("TARN"), road)
	a, b := sharedWeather(1, 365*9)
	gap := pipeline.DayOf(2026, time.June, 1)
	w.in(t, "TARN", days(in2020, 1, b...))
	w.in(t, "FELL", withoutMin(days(in2020, 1, a...), gap, gap+9))
	w.settle(t)
	const of = `select station, origin, count(*), count(error_c), count(filled_from) from thaw.daily_values
		where day between '2026-06-01' and '2026-06-10' and station <> 'TARN' group by 1, 2 order by 1`
	if got := fmt.Sprint(w.Rows(t, of)); got != "[(FELL,3,10,10,10) (ROAD,0,10,0,0)]" {
		t.Errorf("filled, and joined: %s", got)
	}
	w.isAsAnew(t, "FELL", "TARN", "ROAD")
	w.state(t, named("FELL"), named("TARN"), road)
	w.settle(t)
	if got := fmt.Sprint(w.Rows(t, of)); got != "[(FELL,0,10,0,0) (ROAD,0,10,0,0)]" {
		t.Errorf("filled no more: %s", got)
	}
	w.isAsAnew(t, "FELL", "TARN", "ROAD")
}

// A record loses its first days, within a season.
func TestRecordBeginsLater(t *testing.T) {
	w := newSeveral(t, named("FELL"))
	a, _ := sharedWeather(2, 300)
	readings := days(pipeline.DayOf(2030, time.February, 10), 1, a...)
	w.in(t, "FELL", readings)
	w.in(t, "FELL", wrong(readings[:120]))
	w.isAsAnew(t, "FELL")
}

// Ten years come after the last two: their relapses say whether its onset holds.
func TestHistoryAfterTheSeason(t *testing.T) {
	for _, end := range []pipeline.Day{pipeline.DayOf(2030, time.May, 15), pipeline.DayOf(2030, time.May, 22), pipeline.DayOf(2030, time.May, 27)} {
		w := newSeveral(t, named("FELL"))
		start := pipeline.DayOf(2018, time.January, 15)
		a, _ := sharedWeather(5, int(end-start))
		cut := int(pipeline.DayOf(2028, time.January, 15) - start)
		w.in(t, "FELL", days(start+pipeline.Day(cut), 1, a[cut:]...))
		w.in(t, "FELL", days(start, 1, a[:cut]...))
		w.isAsAnew(t, "FELL")
	}
}

// Other years bound what the index may be without a doubtful day.
func TestHistoryAfterADoubtfulDay(t *testing.T) {
	w := newSeveral(t, named("FELL"))
	a, _ := sharedWeather(7, 365*7)
	readings := days(in2020+365*3, 1, a[365*3:]...)
	readings[2*(365*2+170)].Quality = pipeline.QualityDoubtful
	w.in(t, "FELL", readings)
	w.in(t, "FELL", days(in2020, 1, a[:365*3]...))
	w.isAsAnew(t, "FELL")
}

// A new sensor is stated after the fact.
func TestBreakStatedLater(t *testing.T) {
	w := newSeveral(t, named("FELL"))
	a, _ := sharedWeather(4, 800)
	w.in(t, "FELL", days(in2020, 1, a...))
	st := named("FELL")
	day := pipeline.DayOf(2020, time.July, 1)
	st.Facts = []pipeline.Fact{{What: pipeline.NewSensor, From: day, To: day}}
	w.state(t, st)
	w.settle(t)
	if got := w.Rows(t, `select season from thaw.air_index_season where not homogeneous and kind = 'thaw' and definition = 'sum'`); fmt.Sprint(got) != "[(2020)]" {
		t.Errorf("not homogeneous: %v", got)
	}
	w.isAsAnew(t, "FELL")
	w.state(t, named("FELL"))
	w.settle(t)
	w.isAsAnew(t, "FELL")
}

// A member's maximum and minimum change, and its mean does not.
func TestMemberWithTheSameMean(t *testing.T) {
	road := named("ROAD")
	road.Joined = []pipeline.Member{{Station: "FELL"}}
	w := newSeveral(t, named("FELL"), road)
	a, _ := sharedWeather(5, 400)
	readings := days(in2020, 1, a...)
	w.in(t, "FELL", readings)
	w.settle(t)
	changed := append([]pipeline.Reading(nil), readings[200:202]...)
	changed[0].ValueC++
	changed[1].ValueC--
	w.in(t, "FELL", changed)
	w.settle(t)
	w.isAsAnew(t, "FELL", "ROAD")
}

// A station closed long ago is not carried on by the climate, nor by a neighbour
// for more than a year.
func TestClosedStationStaysClosed(t *testing.T) {
	st := named("FELL", "TARN")
	st.ClimateFills = true
	w := newSeveral(t, st, named("TARN"))
	a, b := sharedWeather(6, 365*9)
	w.in(t, "FELL", days(in2020-365*12, 1, a[:365*5]...))
	w.in(t, "TARN", days(in2020, 1, b...)) // no common day
	w.settle(t)
	last := `select max(day) - $1::date from thaw.daily_values where station = 'FELL'`
	if got := w.Rows(t, last, (in2020 - 365*12 + 365*5 - 1).Time()); got[0] != "(0)" {
		t.Errorf("carried on by %s days", got[0])
	}
	w = newSeveral(t, named("FELL", "TARN"), named("TARN"))
	w.in(t, "TARN", days(in2020, 1, b...))
	w.in(t, "FELL", days(in2020, 1, a[:365*6]...))
	w.settle(t)
	if got := w.Rows(t, last, (in2020 + 365*6 - 1).Time()); got[0] != "(366)" {
		t.Errorf("carried on by %s days; want 366", got[0])
	}
	w.isAsAnew(t, "FELL", "TARN")
}

// Stations that are each other's neighbours, at the same moment.
func TestNeighboursDoNotWaitInACircle(t *testing.T) {
	w := newSeveral(t, named("FELL", "TARN"), named("TARN", "FELL"))
	a, b := sharedWeather(8, 400)
	w.in(t, "TARN", days(in2020, 1, b...))
	w.in(t, "FELL", days(in2020, 1, a...))
	w.settle(t)
	for i := range 15 {
		var both sync.WaitGroup
		for _, station := range []string{"FELL", "TARN"} {
			p := w.part(t, station, days(in2020+pipeline.Day(400+i), 1, 1+float64(i)))
			both.Go(func() {
				if _, err := w.svc.take(t.Context(), station, []*pipeline.Part{p}); err != nil {
					t.Error(err)
				}
			})
		}
		both.Wait()
	}
	w.settle(t)
	w.isAsAnew(t, "FELL", "TARN")
}
