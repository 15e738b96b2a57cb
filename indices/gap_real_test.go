package indices

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// made is what follows from the readings, whatever batches they came by.
func (w *world) made(t testing.TB) string {
	t.Helper()
	return strings.Join(w.Rows(t, `select * from thaw.fingerprint_tables() where part in ('daily_values', 'air_index_daily', 'air_index_season')`), "\n")
}

// everyDayOnce fails if the record has a hole, or a day without an index.
func (w *world) everyDayOnce(t testing.TB) {
	t.Helper()
	got := w.Rows(t, `select count(*) = max(day) - min(day) + 1, count(distinct day) = count(*) from thaw.daily_values
		union all select count(*) = max(day) - min(day) + 1, count(distinct day) = count(*) from thaw.air_index_daily`)
	if diff := cmp.Diff([]string{"(t,t)", "(t,t)"}, got); diff != "" {
		t.Errorf("days skipped or double: %s", diff)
	}
}

var recordStart = pipeline.DayOf(2029, time.January, 1)

// threeYears is a record with weather in it.
func threeYears() []float64 {
	means := wave(-4, 18, 3*365, 0)
	for i := range means {
		means[i] = math.Round(10*(means[i]+4*math.Sin(float64(i)*0.9)+2*math.Sin(float64(i)*2.3))) / 10
	}
	return means
}

// without returns the means with the days of a gap left out.
func without(means []float64, first pipeline.Day, n int) []float64 {
	out := slices.Clone(means)
	for i := range n {
		out[int(first-recordStart)+i] = math.NaN()
	}
	return out
}

func TestShortGapIsBridged(t *testing.T) {
	w := load(t, fell, pipeline.DayOf(2030, time.June, 1), 4, math.NaN(), math.NaN(), 10, 2, math.NaN(), 3)
	got := w.Rows(t, `select day, mean_c, low_c, high_c, origin, quality, max_c from thaw.daily_values where day >= '2030-06-01' order by day`)
	want := []string{"(2030-06-01,4,4,4,1,0,6)", "(2030-06-02,6,6,6,2,6,)", "(2030-06-03,8,8,8,2,6,)", "(2030-06-04,10,10,10,1,0,12)",
		"(2030-06-05,2,2,2,1,0,4)", "(2030-06-06,2.5,2.5,2.5,2,6,)", "(2030-06-07,3,3,3,1,0,5)"}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
	first := pipeline.DayOf(2030, time.June, 11)
	w = load(t, fell, recordStart, without(threeYears(), first, 2)...)
	w.everyDayOnce(t)
	got = w.Rows(t, `select definition, index_c_days = index_low_c_days and index_c_days = index_high_c_days, complete, days_observed, days_interpolated,
		days_missing, longest_gap_days from thaw.air_index_season where kind = 'thaw' and season = '2030' order by 1`)
	if diff := cmp.Diff([]string{"(curve,t,t,363,2,0,2)", "(sum,t,t,363,2,0,2)"}, got); diff != "" {
		t.Error(diff)
	}
}

// A gap too long for a straight line leaves the index open between bounds that
// hold the true value, and they close when the days come after all.
func TestLongGapIsBounded(t *testing.T) {
	whole := threeYears()
	complete := load(t, fell, recordStart, whole...)
	const season = `select definition, index_low_c_days, index_high_c_days, index_c_days is null, complete, days_missing, longest_gap_days
		from thaw.air_index_season where kind = $1 and season = $2 order by 1`
	for _, tc := range []struct {
		name  string
		kind  string
		of    string
		first pipeline.Day
		days  int
	}{
		{"onset", "thaw", "2030", pipeline.DayOf(2030, time.May, 5), 5},
		{"summer", "thaw", "2030", pipeline.DayOf(2030, time.July, 10), 5},
		{"just too long", "thaw", "2030", pipeline.DayOf(2030, time.August, 2), 3},
		{"end of season", "thaw", "2030", pipeline.DayOf(2030, time.September, 20), 9},
		{"winter", "freeze", "2029-30", pipeline.DayOf(2030, time.January, 12), 20},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := load(t, fell, recordStart, without(whole, tc.first, tc.days)...)
			w.everyDayOnce(t)
			truth, got := complete.Rows(t, season, tc.kind, tc.of), w.Rows(t, season, tc.kind, tc.of)
			if len(got) != 2 || len(truth) != 2 {
				t.Fatalf("seasons %v and %v", truth, got)
			}
			for i := range got {
				var definition, rest string
				var low, high, is float64
				parse(t, truth[i], &definition, &is, &is, &rest)
				if rest != "f,t,0,0" {
					t.Errorf("complete record: %s", truth[i])
				}
				parse(t, got[i], &definition, &low, &high, &rest)
				if low >= high || is < low || is > high || rest != fmt.Sprintf("t,f,%d,%[1]d", tc.days) {
					t.Errorf("%s, want bounds around %v, null, not complete, and %d days missing", got[i], is, tc.days)
				}
			}
			last := tc.first + pipeline.Day(tc.days) - 1
			got = w.Rows(t, `select count(*), count(*) filter (where mean_c is null and low_c < high_c and quality = 7) from thaw.daily_values
				where day between $1 and $2 and origin = 0`, tc.first.Time(), last.Time())
			if want := fmt.Sprintf("(%d,%[1]d)", tc.days); got[0] != want {
				t.Errorf("missing days %s, want %s without a mean and with bounds", got[0], want)
			}
			// All but two days come: what is left is bridged. Then the rest comes.
			i := int(tc.first - recordStart)
			w.take(t, w.open(t, "fell", 2, delivery{"most", days(tc.first, 1, whole[i:i+tc.days-2]...)}, 500)...)
			got = w.Rows(t, `select index_c_days is null, complete, days_interpolated, days_missing from thaw.air_index_season
				where kind = $1 and season = $2 and definition = 'curve'`, tc.kind, tc.of)
			if got[0] != "(f,t,2,0)" {
				t.Errorf("with two days still to come %s", got[0])
			}
			w.take(t, w.open(t, "fell", 3, delivery{"rest", days(last-1, 1, whole[i+tc.days-2:i+tc.days]...)}, 500)...)
			if diff := cmp.Diff(complete.made(t), w.made(t)); diff != "" {
				t.Errorf("closed gap leaves other tables than the complete record: %s", diff)
			}
		})
	}
}

// parse reads a row of a text, two numbers and the rest.
func parse(t testing.TB, row string, text *string, low, high *float64, rest *string) {
	t.Helper()
	cells := strings.SplitN(strings.Trim(row, "()"), ",", 4)
	*text, *rest = cells[0], cells[3]
	if _, err := fmt.Sscan(cells[1], low); err != nil {
		t.Fatal(row, err)
	}
	if _, err := fmt.Sscan(cells[2], high); err != nil {
		t.Fatal(row, err)
	}
}

// An hourly day has to have enough hours, and no hole too long.
func TestHourlyRule(t *testing.T) {
	st := fell
	st.Mean, st.FillDays = pipeline.MeanHourly, 0
	series := []pipeline.Series{{Sensor: "air", Variable: pipeline.AirTemp, LevelM: 1.5}}
	for _, tc := range []struct {
		name    string
		missing []int
		want    string
	}{
		{"all", nil, "(1,24,0,11.5)"},
		{"20 of 24", []int{1, 5, 9, 13}, "(1,20,1,12.4)"},
		{"19 of 24", []int{1, 5, 9, 13, 17}, "(0,19,1,)"},
		{"hole of 3", []int{10, 11, 12}, "(1,21,3,11.571429)"},
		{"hole of 4", []int{10, 11, 12, 13}, "(0,20,4,)"},
		{"hole at the day's end", []int{20, 21, 22, 23}, "(0,20,4,)"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, st)
			day := pipeline.DayOf(2030, time.June, 2)
			var rs []pipeline.Reading
			for d := day - 1; d <= day+1; d++ {
				for hour := range 24 {
					if d == day && slices.Contains(tc.missing, hour) {
						continue
					}
					start := st.DayStart(d).Unix() + int64(hour)*3600
					rs = append(rs, pipeline.Reading{Row: int32(len(rs) + 1), StartS: start, ValueC: float64(hour)})
				}
			}
			parts := w.open(t, "fell", 1, delivery{"hours", rs}, 500)
			parts[0].Series = series
			w.take(t, parts...)
			got := w.Rows(t, `select origin, hours, longest_hole, round(mean_c::numeric, 6)::float8 from thaw.daily_values where day = $1`, day.Time())
			if len(got) != 1 || got[0] != tc.want {
				t.Errorf("got %v, want %s", got, tc.want)
			}
			w.everyDayOnce(t)
		})
	}
}

// Rules changed over a record give what a load under those rules gives.
func TestChangedRules(t *testing.T) {
	for _, tc := range []struct {
		name   string
		change func(*store.Stated)
	}{
		{"base", func(s *store.Stated) { s.Stations[0].BaseC = -1.1 }},
		{"longer gaps bridged", func(s *store.Stated) { s.Stations[0].FillDays = 6 }},
		{"no gaps bridged", func(s *store.Stated) { s.Stations[0].FillDays = 0 }},
		{"as reported", func(s *store.Stated) { s.Stations[0].Mean = pipeline.MeanAsReported }},
		{"years start elsewhere", func(s *store.Stated) {
			s.Stations[0].ThawYear = pipeline.MonthDay{Month: time.February, Day: 29}
			s.Stations[0].FreezeYear = pipeline.MonthDay{Month: time.August, Day: 1}
		}},
		{"years start earlier", func(s *store.Stated) {
			s.Stations[0].ThawYear = pipeline.MonthDay{Month: time.January, Day: 2}
			s.Stations[0].FreezeYear = pipeline.MonthDay{Month: time.July, Day: 2}
		}},
		{"rule that nothing meets", func(s *store.Stated) { s.Stations[0].Mean = pipeline.MeanHourly }},
		{"day begins elsewhere", func(s *store.Stated) { s.Stations[0].DayStarts = 6 * time.Hour }},
		{"other feed first", func(s *store.Stated) { s.Feeds[0].Rank = 9 }},
	} {
		t.Run(tc.name, func(t *testing.T) {
			means := without(without(threeYears(), pipeline.DayOf(2029, time.July, 1), 2), pipeline.DayOf(2030, time.June, 3), 5)
			fill := func(w *world) {
				reported := w.open(t, "fell", 2, delivery{"reported", days(recordStart, 1, means[:700]...)}, 500)
				for _, p := range reported {
					p.Series = []pipeline.Series{{Sensor: "air", Variable: pipeline.AirTempMean, LevelM: 1.5, SpanS: 86400}, maxMin[1]}
				}
				rival := w.open(t, "other", 3, delivery{"rival", days(recordStart+200, 1, wave(-1, 9, 300, 0)...)}, 500)
				w.take(t, w.open(t, "fell", 1, delivery{"record", days(recordStart, 1, means...)}, 500)...)
				w.take(t, append(reported, rival...)...)
			}
			stated := store.Stated{Hash: "changed", Stations: []pipeline.Station{fell}, Feeds: []pipeline.Feed{{Name: "fell"}, {Name: "other", Rank: 5}}}
			tc.change(&stated)
			changed, anew := newWorld(t, fell), newWorld(t, fell)
			if err := anew.State(t.Context(), stated); err != nil {
				t.Fatal(err)
			}
			fill(anew)
			fill(changed)
			before := changed.made(t)
			if err := changed.State(t.Context(), stated); err != nil {
				t.Fatal(err)
			}
			marks := `select recompute or reindex from thaw.stations`
			if marked := changed.Rows(t, marks); marked[0] != "(t)" {
				t.Fatalf("FELL is not marked")
			}
			if err := changed.service.MakeMarked(t.Context()); err != nil {
				t.Fatal(err)
			}
			if marked := changed.Rows(t, marks); marked[0] != "(f)" {
				t.Error("FELL is still marked")
			}
			if diff := cmp.Diff(anew.fingerprint(t), changed.fingerprint(t)); diff != "" {
				t.Errorf("loaded under the rules (-) and changed to them (+): %s", diff)
			}
			if changed.made(t) == before {
				t.Error("the change has changed nothing")
			}
		})
	}
}
