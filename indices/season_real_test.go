package indices

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

// thawHand is a spring and summer made up by hand and added up by hand: a false
// start on the 4th and 5th day, the low after the 8th, the high after the 21st.
var thawHand = []float64{-6, -4, -2, 3, 2, -4, -5, -1, 1, 4, 6, 8, 9, 7, -3, 5, 6, 4, 2, -1, 3, -2, -5, -6, -8}

// load takes a record of daily means, one a day from first on, into a world of
// its own.
func load(t testing.TB, st pipeline.Station, first pipeline.Day, means ...float64) *world {
	t.Helper()
	w := newWorld(t, st)
	w.take(t, w.open(t, "fell", 1, delivery{"record", days(first, 1, means...)}, 500)...)
	return w
}

// from returns the station with both years starting on a day.
func from(month time.Month, day int) pipeline.Station {
	st := fell
	st.ThawYear = pipeline.MonthDay{Month: month, Day: day}
	st.FreezeYear = st.ThawYear
	return st
}

// wave makes means of degC with a period of 365 days, highest at day 200.
func wave(meanC, amplitudeC float64, days, shift int) []float64 {
	out := make([]float64, days)
	for i := range out {
		out[i] = meanC + amplitudeC*math.Cos(2*math.Pi*(float64((i+shift)%365)+0.5-200)/365)
	}
	return out
}

// Curve indices by US Army TM 5-852-1 (UFC 3-130-01): the rise of the
// cumulative curve from low to later high, days of the other sign counted. Sums
// as S. A. Harris has them. Series and figures were added up by hand.
func TestSeasonByHand(t *testing.T) {
	freezeHand := []float64{5, 3, -1, 2, -4, -6, 1, -8, -10, -12, 3, 2, -9, -7, -2, -1, 1, -3, 2, 4, -1, 6}
	cold := func(n int) []float64 {
		out := make([]float64, n)
		for i := range out {
			out[i] = -6
		}
		return out
	}
	const columns = `kind, definition, season, index_c_days, start_day, end_day, season_over, complete, onset_provisional, days_observed`
	for _, tc := range []struct {
		name  string
		st    pipeline.Station
		first pipeline.Day
		means []float64
		where string
		want  []string
	}{
		{"thaw series", from(time.April, 20), pipeline.DayOf(2030, time.April, 20), thawHand, "true", []string{
			"(freeze,curve,2030-31,21,2030-05-11,2030-05-14,f,f,t,25)", "(freeze,sum,2030-31,47,2030-04-20,2030-05-14,f,f,f,25)",
			"(thaw,curve,2030-31,51,2030-04-28,2030-05-10,f,f,f,25)", "(thaw,sum,2030-31,60,2030-04-23,2030-05-10,f,f,f,25)"}},
		{"thaw series in a cold year", fell, pipeline.DayOf(2030, time.January, 15), append(append(cold(95), thawHand...), cold(245)...),
			"kind = 'thaw' and season = '2030'", []string{
				"(thaw,curve,2030,51,2030-04-28,2030-05-10,t,t,f,365)", "(thaw,sum,2030,60,2030-04-23,2030-05-10,t,t,f,365)"}},
		{"freeze series", from(time.October, 1), pipeline.DayOf(2030, time.October, 1), freezeHand, "kind = 'freeze'", []string{
			"(freeze,curve,2030-31,55,2030-10-05,2030-10-18,f,f,f,22)", "(freeze,sum,2030-31,64,2030-10-03,2030-10-21,f,f,f,22)"}},
		// highest less lowest would be 25 for both
		{"high before low", from(time.April, 20), pipeline.DayOf(2030, time.April, 20), []float64{6, 4, -3, -8, -9, -5, 2, 7, 5, -1}, "true", []string{
			"(freeze,curve,2030-31,25,2030-04-22,2030-04-25,f,f,t,10)", "(freeze,sum,2030-31,26,2030-04-22,2030-04-29,f,f,f,10)",
			"(thaw,curve,2030-31,14,2030-04-26,2030-04-28,f,f,t,10)", "(thaw,sum,2030-31,24,2030-04-20,2030-04-28,f,f,f,10)"}},
		{"false start larger than what follows", from(time.April, 20), pipeline.DayOf(2030, time.April, 20), []float64{-1, 10, 10, 10, -20, -20, 5, 5, -1}, "kind = 'thaw'", []string{
			"(thaw,curve,2030-31,30,2030-04-21,2030-04-23,f,f,t,9)", "(thaw,sum,2030-31,40,2030-04-21,2030-04-27,f,f,f,9)"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := load(t, tc.st, tc.first, tc.means...)
			got := w.Rows(t, `select `+columns+` from thaw.air_index_season where `+tc.where+` order by kind, definition, season_start`)
			if diff := cmp.Diff(tc.want, got); diff != "" {
				t.Error(diff)
			}
		})
	}
}

// Day by day, added up by hand.
func TestIndexDaysByHand(t *testing.T) {
	w := load(t, from(time.April, 20), pipeline.DayOf(2030, time.April, 20), thawHand...)
	for column, want := range map[string]string{
		"thaw_running_c_days": "0 0 0 3 5 1 0 0 1 5 11 19 28 35 32 37 43 47 49 48 51 49 44 38 30",
		"thaw_curve_c_days":   "0 0 0 3 5 5 5 5 5 5 11 19 28 35 35 37 43 47 49 49 51 51 51 51 51",
		"thaw_sum_c_days":     "0 0 0 3 5 5 5 5 6 10 16 24 33 40 40 45 51 55 57 57 60 60 60 60 60",
	} {
		got := w.Rows(t, `select string_agg(`+column+`::text, ' ' order by day) from thaw.air_index_daily`)
		if diff := cmp.Diff(want, strings.Trim(got[0], `()"`)); diff != "" {
			t.Errorf("%s: %s", column, diff)
		}
	}
}

// The onset is that of the false start until the relapse has undone it.
func TestSpringRelapse(t *testing.T) {
	w := newWorld(t, from(time.April, 20))
	first := pipeline.DayOf(2030, time.April, 20)
	for _, tc := range []struct {
		days int
		want string
	}{
		{5, "(5,2030-04-23,2030-04-24,t)"}, {8, "(5,2030-04-23,2030-04-24,t)"}, {10, "(5,2030-04-23,2030-04-24,t)"},
		{11, "(11,2030-04-28,2030-04-30,t)"}, {25, "(51,2030-04-28,2030-05-10,f)"},
	} {
		d := delivery{fmt.Sprint("to day ", tc.days), days(first, 1, thawHand[:tc.days]...)}
		w.take(t, w.open(t, "fell", int64(tc.days), d, 500)...)
		got := w.Rows(t, `select index_c_days, start_day, end_day, onset_provisional from thaw.air_index_season where kind = 'thaw' and definition = 'curve'`)
		if got[0] != tc.want {
			t.Errorf("after %d days %s, want %s", tc.days, got[0], tc.want)
		}
	}
}

// Means on a cosine M + A cos(2 pi (d + 0.5 - 200) / 365): sums from a separate
// calculation in another language, to six figures after the point; the integral
// over the thaw season is (365/pi) (A sin p + M p) with p = arccos(-M/A).
func TestSeasonOfWave(t *testing.T) {
	south := fell
	south.ThawYear, south.FreezeYear = fell.FreezeYear, fell.ThawYear
	first := pipeline.DayOf(2029, time.January, 1) // three years of 365 days
	for _, tc := range []struct {
		name              string
		st                pipeline.Station
		meanC, amplitudeC float64
		shift             int
		thaw, freeze      float64
		thawAs, freezeAs  string
	}{
		{"cold", fell, -5, 20, 0, 1484.128669, 3309.128669, "2030", "2030-31"},
		{"colder", fell, -10, 18, 0, 598.245229, 4248.245229, "2030", "2030-31"},
		{"milder", fell, -2.7, 20.5, 0, 1909.658121, 2895.158121, "2030", "2030-31"},
		{"short summer", fell, -11, 16, 0, 311.220030, 4326.220030, "2030", "2030-31"},
		{"southern", south, -5, 20, 182, 1484.128669, 3309.128669, "2030-31", "2030"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := load(t, tc.st, first, wave(tc.meanC, tc.amplitudeC, 3*365, tc.shift)...)
			p := math.Acos(-tc.meanC / tc.amplitudeC)
			integral := 365 / math.Pi * (tc.amplitudeC*math.Sin(p) + tc.meanC*p)
			for _, s := range []struct {
				kind, season            string
				want, integral, lengthD float64
			}{{"thaw", tc.thawAs, tc.thaw, integral, 365 * p / math.Pi}, {"freeze", tc.freezeAs, tc.freeze, integral - 365*tc.meanC, 365 * (1 - p/math.Pi)}} {
				rows := w.Rows(t, `select index_c_days, end_day - start_day + 1 from thaw.air_index_season
					where kind = $1 and season = $2 and complete and not edge_provisional and not no_season order by definition`, s.kind, s.season)
				if len(rows) != 2 {
					t.Fatalf("%s of %s: %v, want a curve and a sum index", s.kind, s.season, rows)
				}
				for _, row := range rows {
					var index, length float64
					if _, err := fmt.Sscanf(row, "(%g,%g)", &index, &length); err != nil {
						t.Fatal(row, err)
					}
					if math.Abs(index-s.want) > 1e-6 || math.Abs(index-s.integral) > 0.1 || math.Abs(length-s.lengthD) > 1 {
						t.Errorf("%s %s, want %.6f degC.d near %.3f, over about %.1f days", s.kind, row, s.want, s.integral, s.lengthD)
					}
				}
			}
		})
	}
}

// 29 February counts, and a place that never thaws has no season, not an index of zero.
func TestLeapDayAndNoSeason(t *testing.T) {
	means := make([]float64, int(pipeline.DayOf(2028, time.December, 31)-pipeline.DayOf(2026, time.July, 1))+1)
	for i := range means {
		means[i] = -1
	}
	w := load(t, fell, pipeline.DayOf(2026, time.July, 1), means...)
	got := w.Rows(t, `select kind, season, index_c_days, start_day, days_observed, no_season, season_over from thaw.air_index_season
		where definition = 'curve' and days_missing = 0 order by kind, season_start`)
	want := []string{"(freeze,2026-27,365,2026-07-15,365,f,t)", "(freeze,2027-28,366,2027-07-15,366,f,t)", "(freeze,2028-29,170,2028-07-15,170,f,f)",
		"(thaw,2027,0,,365,t,t)", "(thaw,2028,0,,352,f,f)"}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
	if got := w.Rows(t, `select origin, mean_c from thaw.daily_values where day = '2028-02-29'`); len(got) != 1 || got[0] != "(1,-1)" {
		t.Errorf("29 February %v", got)
	}
}

// Hand series in degF, as a feed would send it, and about another base.
func TestUnitAndBase(t *testing.T) {
	var read, above []float64
	for _, c := range thawHand {
		f := math.Round((1.8*c+32)*10) / 10
		c2, err := pipeline.DegF.Celsius(f)
		if err != nil {
			t.Fatal(err)
		}
		read, above = append(read, c2), append(above, c-1.5)
	}
	based := from(time.April, 20)
	based.BaseC = -1.5
	for _, tc := range []struct {
		name  string
		st    pipeline.Station
		means []float64
	}{{"degF", from(time.April, 20), read}, {"base", based, above}} {
		w := load(t, tc.st, pipeline.DayOf(2030, time.April, 20), tc.means...)
		got := w.Rows(t, `select round(index_c_days::numeric, 9), start_day, end_day, base_c from thaw.air_index_season where kind = 'thaw' order by definition`)
		want := []string{fmt.Sprintf("(51.000000000,2030-04-28,2030-05-10,%v)", tc.st.BaseC), fmt.Sprintf("(60.000000000,2030-04-23,2030-05-10,%v)", tc.st.BaseC)}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Errorf("%s: %s", tc.name, diff)
		}
	}
}

// Freezing is thawing of the mirrored temperatures, bit for bit, gaps included.
func TestMirrored(t *testing.T) {
	first := pipeline.DayOf(2029, time.January, 1)
	plain := wave(-3, 17, 3*365, 0)
	for i := range plain {
		plain[i] += 3 * math.Sin(float64(i)*1.7)
		if i%97 < 2 || i%203 < 6 {
			plain[i] = math.NaN()
		}
	}
	turned := make([]float64, len(plain))
	for i, c := range plain {
		turned[i] = -c
	}
	st := fell
	st.ThawYear, st.FreezeYear = fell.FreezeYear, fell.ThawYear
	a, b := load(t, fell, first, plain...), load(t, st, first, turned...)
	const seasons = `select definition, season_start, season, index_c_days, index_low_c_days, index_high_c_days, start_day, end_day, season_over,
		complete, no_season, edge_provisional, onset_provisional, days_missing, days_interpolated from thaw.air_index_season where kind = '%s' order by 1, 2`
	const daily = `select day, K_season, K_running_c_days, K_curve_c_days, K_curve_low_c_days, K_curve_high_c_days, K_sum_low_c_days, K_sum_high_c_days from thaw.air_index_daily order by day`
	for _, k := range [][2]string{{"thaw", "freeze"}, {"freeze", "thaw"}} {
		rows := a.Rows(t, fmt.Sprintf(seasons, k[0]))
		if diff := cmp.Diff(rows, b.Rows(t, fmt.Sprintf(seasons, k[1]))); diff != "" || len(rows) < 6 {
			t.Errorf("%d seasons: %s", len(rows), diff)
		}
		if diff := cmp.Diff(a.Rows(t, strings.ReplaceAll(daily, "K", k[0])), b.Rows(t, strings.ReplaceAll(daily, "K", k[1]))); diff != "" {
			t.Error(diff)
		}
	}
}
