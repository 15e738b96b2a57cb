package alerts

import (
	"context"
	"encoding/json"
	"fmt"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/jackc/pgx/v5"
	"go.uber.org/zap"

	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// patience is how long a test waits for something that must come.
const patience = 20 * time.Second

// Stations of invented places.
var stations = []pipeline.Station{station("FELL"), station("TARN")}

func station(id string) pipeline.Station {
	return pipeline.Station{
		ID: id, Name: id, LatitudeD: 69, Mean: pipeline.MeanMaxMin, MinHours: 20, MaxHole: 3, FillDays: 2,
		ThawYear: pipeline.MonthDay{Month: time.January, Day: 15}, FreezeYear: pipeline.MonthDay{Month: time.July, Day: 15},
	}
}

// world is a database with a service that announces to a listener.
type world struct {
	*pipelinetest.Database
	*listener
	service *Service
	today   pipeline.Day // the service's clock
	conn    *pgx.Conn
	held    map[seasonKey][]index // what set has written
}

func newWorld(t *testing.T, today string) *world {
	t.Helper()
	db := pipelinetest.New(t)
	conn, err := pgx.Connect(t.Context(), db.URL)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = conn.Close(context.WithoutCancel(t.Context())) })
	w := &world{Database: db, listener: &listener{nudges: make(chan struct{}, 1)}, today: date(today), conn: conn, held: map[seasonKey][]index{}}
	w.service = &Service{DB: db.DB, Bus: w.listener, Log: zap.NewNop(), Now: func() time.Time { return w.today.Time() }}
	return w
}

// listener keeps what it is told, unless it refuses to.
type listener struct {
	nudges chan struct{}

	mu     sync.Mutex
	refuse func(id string) error // may be nil
	tried  []string              // ids, refused ones too
	told   []told
}

type told struct {
	site, surface, id string
	Announcement
}

func (l *listener) Nudges(context.Context) (<-chan struct{}, error) { return l.nudges, nil }

func (l *listener) Announce(_ context.Context, site, surface, id string, payload []byte) error {
	l.mu.Lock()
	defer l.mu.Unlock()
	l.tried = append(l.tried, id)
	if l.refuse != nil {
		if err := l.refuse(id); err != nil {
			return err
		}
	}
	a := told{site: site, surface: surface, id: id}
	if err := json.Unmarshal(payload, &a.Announcement); err != nil {
		return err
	}
	l.told = append(l.told, a)
	return nil
}

// heard returns what has been told since it was last called, a line each:
// "apron near -> exceeded, progress".
func (l *listener) heard() []string {
	l.mu.Lock()
	defer l.mu.Unlock()
	var out []string
	for _, a := range l.told {
		out = append(out, strings.Join(strings.Fields(fmt.Sprintf("%s %s -> %s, %s", a.Surface, a.From, a.To, a.Why)), " "))
	}
	l.told = nil
	return out
}

func (w *world) pass(t *testing.T) {
	t.Helper()
	if err := w.service.Pass(t.Context()); err != nil {
		t.Fatal(err)
	}
}

func (w *world) exec(t *testing.T, sql string, args ...any) {
	t.Helper()
	if _, err := w.conn.Exec(t.Context(), sql, args...); err != nil {
		t.Fatalf("%s: %v", sql, err)
	}
}

// state puts sites in force, in the place of all others.
func (w *world) state(t *testing.T, sites ...pipeline.Site) {
	t.Helper()
	if err := w.State(t.Context(), store.Stated{Hash: fmt.Sprint(sites), Stations: stations, Sites: sites}); err != nil {
		t.Fatal(err)
	}
}

// strip is a site on FELL.
func strip(surfaces ...pipeline.Surface) pipeline.Site {
	return pipeline.Site{ID: "strip", Name: "Strip", Station: "FELL", Surfaces: surfaces}
}

// surface is one with design values of the air, or with the n-factors given
// beside them.
func surface(id string, designs ...pipeline.DesignValue) pipeline.Surface {
	return pipeline.Surface{ID: id, Name: id, Designs: designs}
}

// thaw is a design value that a thaw season must not pass.
func thaw(cDays float64) pipeline.DesignValue {
	return pipeline.DesignValue{
		Kind: pipeline.Thaw, Definition: pipeline.Curve, Of: pipeline.OfAir, Index: cDays, Unit: pipeline.DegCDays,
		Direction: pipeline.NotAbove, From: pipeline.DayOf(1, time.January, 1), NearShare: 0.9, Source: "design report",
	}
}

// freeze is a design value that a freeze season must reach.
func freeze(cDays float64) pipeline.DesignValue {
	d := thaw(cDays)
	d.Kind, d.Direction = pipeline.Freeze, pipeline.NotBelow
	return d
}

// index is what a day's air indices may be at the end of the day.
type index struct {
	day                        pipeline.Day
	low, high, sumLow, sumHigh float64
}

// at is an index without doubt, by both definitions.
func at(day string, cDays float64) index { return between(day, cDays, cDays) }

// between is an index that missing days leave open.
func between(day string, low, high float64) index { return index{date(day), low, high, low, high} }

func date(s string) pipeline.Day {
	d, err := pipeline.ParseDay(s)
	if err != nil {
		panic(err)
	}
	return d
}

type seasonKey struct {
	station string
	kind    pipeline.Kind
	start   pipeline.Day
}

// set makes days all that the database holds of a season, and leaves a line in
// changes from the first day that is new or differs. A season that is over goes
// on to its last day as it stands. A station has one kind of season in a test.
func (w *world) set(t *testing.T, stationID string, kind pipeline.Kind, startDate string, over bool, days ...index) {
	t.Helper()
	key := seasonKey{stationID, kind, date(startDate)}
	last := days[len(days)-1]
	if over {
		last.day = pipeline.DayOf(yearAfter(key.start)) - 1
		days = append(slices.Clone(days), last)
	}
	from, missing, before := last.day, 0, index{}
	for i, x := range days {
		if i >= len(w.held[key]) || w.held[key][i] != x {
			from = min(from, x.day)
		}
		if x.high-x.low > before.high-before.low {
			missing++
		}
		before = x
	}
	w.held[key] = days

	k, other := string(kind), "freeze"
	if kind == pipeline.Freeze {
		other = "thaw"
	}
	w.exec(t, `delete from thaw.index_blocks where station = $1 and `+k+`_season = $2`, stationID, key.start.Time())
	for _, x := range days {
		w.exec(t, `insert into thaw.index_blocks (station, month, first_day, last_day, `+k+`_season, `+other+`_season,
				thaw_running_c_days, freeze_running_c_days,
				`+k+`_curve_low_c_days, `+k+`_curve_high_c_days, `+k+`_sum_low_c_days, `+k+`_sum_high_c_days,
				`+other+`_curve_low_c_days, `+other+`_sum_low_c_days)
			values ($1, date_trunc('month', $2::date), $2, $2, $3, $2, array[null::float8], array[null::float8], array[$4::float8], array[$5::float8],
				array[$6::float8], array[$7::float8], array[0], array[0])`,
			stationID, x.day.Time(), key.start.Time(), x.low, x.high, x.sumLow, x.sumHigh)
	}
	year, _, _ := key.start.Date()
	label := fmt.Sprint(year)
	if kind == pipeline.Freeze {
		label = fmt.Sprintf("%d-%02d", year, (year+1)%100)
	}
	w.exec(t, `delete from thaw.air_index_season where station = $1 and kind = $2 and season_start = $3`, stationID, k, key.start.Time())
	w.exec(t, `insert into thaw.air_index_season (station, kind, definition, season_start, season, index_low_c_days, index_high_c_days,
			through_day, season_over, complete, no_season, edge_provisional, onset_provisional, days_observed,
			days_interpolated, days_missing, longest_gap_days, mean_rule, base_c)
		select $1, $2, d, $3, $4, $5, $6, $7, $8, false, false, false, false, $9, 1, $10, $10, 'max_min', 0
		from unnest('{curve,sum}'::text[]) d`,
		stationID, k, key.start.Time(), label, last.low, last.high, last.day.Time(), over, len(days)-missing, missing)
	w.exec(t, `insert into thaw.changes (station, from_day) values ($1, $2)`, stationID, from.Time())
}

// same compares what there is with what there should be.
func same(t *testing.T, what string, got, want []string) {
	t.Helper()
	if diff := cmp.Diff(want, got, cmpopts.EquateEmpty()); diff != "" {
		t.Errorf("%s, - wanted, + got:\n%s", what, diff)
	}
}

// eventually waits for a condition, and fails the test if it does not come true.
func eventually(t *testing.T, what string, isTrue func() bool) {
	t.Helper()
	tick := time.NewTicker(5 * time.Millisecond)
	defer tick.Stop()
	over := time.NewTimer(patience)
	defer over.Stop()
	for !isTrue() {
		select {
		case <-tick.C:
		case <-over.C:
			t.Fatalf("%s: not within %v", what, patience)
		}
	}
}
