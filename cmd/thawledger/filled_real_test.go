package main

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// neighbourSettings have two air stations near each other, the first filled from the
// second, and a sensor in a surface.
const neighbourSettings = `
data: data
stations:
  - {id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: as_reported, neighbours: [FELL]}
  - {id: FELL, latitude: 69, longitude: -120, utc_offset: "-08:00", daily_mean: as_reported}
  - {id: STRIP, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: as_reported, measures: surface}
  - {id: ROAD, latitude: 69, longitude: -121, utc_offset: "-08:00", base_by_date: [{from: 02-01, base_c: -1.5}, {from: 06-01, base_c: 0}], joined: [{station: TARN}]}
layouts:
  air:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {file_name: "^([A-Z]+)"}
    values: [{column: t, variable: air_temp_mean, unit: degC}]
  surface:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {file_name: "^([A-Z]+)"}
    values: [{column: t, variable: surface_temp_mean, unit: degC}]
feeds:
  - {name: air, folder: air, settle: 0s, layout: air}
  - {name: surface, folder: surface, settle: 0s, layout: surface}
sites:
  - id: strip
    station: TARN
    surfaces:
      - id: runway
        measured_by: STRIP
        n_factors: [{kind: thaw, value: 1.5, low: 1.25, high: 2, source: invented}]
        design_values:
          - {kind: thaw, definition: curve, of: surface, direction: not_above, index: 9000, unit: degC.d, source: invented}
`

// neighbours are invented records of 2016 to 20 September 2025: weather that the two
// stations share, and some of their own. The first has no June of 2024 and ends
// on 31 August; the surface is half as warm again in summer.
func neighbours() (tarn, fell, strip string) {
	random := rand.New(rand.NewPCG(3, 4))
	var a, b, c strings.Builder
	for _, f := range []*strings.Builder{&a, &b, &c} {
		f.WriteString("date,t\n")
	}
	shared := 0.0
	for d := time.Date(2016, 1, 15, 0, 0, 0, 0, time.UTC); d.Before(time.Date(2025, 9, 21, 0, 0, 0, 0, time.UTC)); d = d.AddDate(0, 0, 1) {
		shared = 0.7*shared + 3*random.NormFloat64()
		wave := -7 + 18*math.Cos(float64(d.YearDay()-200)/58.09) + shared
		day := d.Format(time.DateOnly)
		if !(d.Year() == 2024 && d.Month() == time.June) && day <= "2025-08-31" {
			fmt.Fprintf(&a, "%s,%.2f\n", day, wave+0.5*random.NormFloat64())
		}
		fmt.Fprintf(&b, "%s,%.2f\n", day, wave*0.9+1+0.5*random.NormFloat64())
		fmt.Fprintf(&c, "%s,%.2f\n", day, wave*1.5)
	}
	return a.String(), b.String(), c.String()
}

// Gaps and the end of a record are filled from a neighbour, whatever comes first;
// what the neighbour corrects comes through; and what rests on it says so.
func TestFilledFromANeighbour(t *testing.T) {
	t.Parallel()
	tarn, fell, strip := neighbours()
	p := newPlace(t, neighbourSettings, map[string]string{"air/TARN.csv": tarn, "surface/STRIP.csv": strip})
	p.run(t, "run", "--until-idle")
	season := `select days_observed, days_neighbour, days_missing, through_day, standard_error_c_days between 3 and 40, index_c_days is null, complete
		from thaw.air_index_season where station = 'TARN' and kind = 'thaw' and definition = 'curve' and season >= '2024' order by season`
	if diff := cmp.Diff([]string{"(336,0,30,2025-01-14,,t,f)", "(229,0,0,2025-08-31,,f,f)"}, p.rows(t, season)); diff != "" {
		t.Errorf("alone (-want +got):\n%s", diff)
	}
	p.write(t, "air/FELL.csv", fell)
	p.run(t, "run", "--until-idle")
	if diff := cmp.Diff([]string{"(336,30,0,2025-01-14,t,f,t)", "(229,20,0,2025-09-20,t,f,f)"}, p.rows(t, season)); diff != "" {
		t.Errorf("with its neighbour (-want +got):\n%s", diff)
	}
	if got := p.rows(t, `select count(*), min(filled_from), max(filled_from), bool_and(error_c between 0.3 and 3), bool_and(quality = 6) from thaw.daily_values
		where station = 'TARN' and origin = 3`); got[0] != "(50,FELL,FELL,t,t)" {
		t.Errorf("filled days: %v", got)
	}
	tables := `select part, hash from thaw.fingerprint_tables() where part in ('daily_values', 'air_index_daily', 'air_index_season', 'standings')`
	made := p.rows(t, tables)

	both := newPlace(t, neighbourSettings, map[string]string{"air/TARN.csv": tarn, "air/FELL.csv": fell, "surface/STRIP.csv": strip})
	both.run(t, "run", "--until-idle")
	if diff := cmp.Diff(both.rows(t, tables), made); diff != "" {
		t.Errorf("one after the other differs from both at once (-want +got):\n%s", diff)
	}

	// the neighbour's 10 June of 2024 becomes 5 degC warmer
	at := strings.Index(fell, "2024-06-10,") + len("2024-06-10,")
	line, _, _ := strings.Cut(fell[at:], "\n")
	var c float64
	fmt.Sscan(line, &c) //nolint:errcheck // it was written above
	june10 := `select mean_c from thaw.daily_values where station = 'TARN' and day = '2024-06-10'`
	before := p.rows(t, june10)
	p.write(t, "air/FELL_2.csv", fmt.Sprintf("date,t\n2024-06-10,%.2f\n", c+5))
	p.run(t, "run", "--until-idle")
	if after := p.rows(t, june10); after[0] == before[0] {
		t.Errorf("a corrected neighbour leaves the filled day at %s", after[0])
	}

	shown := p.run(t, "standing", "strip")
	if !strings.Contains(shown, "20 ±") {
		t.Errorf("the days filled and their error are not shown:\n%s", shown)
	}

	// a record of another base has an index of its own: June alone, by the bases
	road := `select round(sum(greatest(mean_c - case when to_char(day, 'MMDD') between '0201' and '0531' then -1.5 else 0 end, 0))::numeric, 6)
			= round((select index_c_days from thaw.air_index_season where station = 'ROAD' and season = '2023' and kind = 'thaw' and definition = 'sum')::numeric, 6)
		from thaw.daily_values where station = 'ROAD' and day between '2023-01-15' and '2024-01-14'`
	if got := p.rows(t, road); got[0] != "(t)" {
		t.Errorf("the index by bases of the date is another: %v", got)
	}

	n := `select count(*), bool_and(n_measured between 1.4 and 1.6) from thaw.measured_n where site = 'strip' and kind = 'thaw' and definition = 'sum'`
	if got := p.rows(t, n); got[0] != "(9,t)" {
		t.Errorf("measured n: %v; want about 1.5 of nine seasons", got)
	}
	if got := p.rows(t, `select at_n_low_c_days / index_low_c_days, at_n_high_c_days / index_high_c_days from thaw.surface_index_season
		where site = 'strip' and kind = 'thaw' and definition = 'curve' and season = '2023'`); got[0] != "(0.8333333333333334,1.3333333333333333)" {
		t.Errorf("range of n: %v; want 1.25/1.5 and 2/1.5", got)
	}
}
