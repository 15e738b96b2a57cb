package main

import (
	"os"
	"path/filepath"
	"testing"

	"github.com/google/go-cmp/cmp"
)

const seattleSettings = `
data: data
stations:
  - {id: SEATTLE, latitude: 47.6, longitude: -122.3, utc_offset: "-08:00", daily_mean: max_min}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {constant: SEATTLE}
    values: [{column: temp_max, variable: air_temp_max, unit: degC}, {column: temp_min, variable: air_temp_min, unit: degC}]
feeds:
  - {name: seattle, folder: feed, settle: 0s, layout: daily}
sites: []
`

// TestSeattle takes an open dataset the whole way. Source of the data:
// testdata/vega_seattle/SOURCE. Source of the figures: the separate calculation
// in indices.awk beside it, as it says on its top, for each season.
func TestSeattle(t *testing.T) {
	rows, err := os.ReadFile(filepath.Join("..", "..", "testdata", "vega_seattle", "seattle-weather.csv"))
	if err != nil {
		t.Fatal(err)
	}
	p := newPlace(t, seattleSettings, map[string]string{"feed/seattle.csv": string(rows)})
	p.run(t, "run", "--until-idle")
	got := p.rows(t, `select kind, season, definition, round(index_c_days::numeric, 2), complete, season_over from thaw.air_index_season
		where (kind, season) in (('thaw', '2012'), ('thaw', '2013'), ('freeze', '2012-13')) order by season, kind, definition`)
	want := []string{
		"(thaw,2012,curve,4105.45,t,t)", "(thaw,2012,sum,4107.65,t,t)",
		"(freeze,2012-13,curve,1.65,t,t)", "(freeze,2012-13,sum,1.65,t,t)",
		"(thaw,2013,curve,4477.25,t,t)", "(thaw,2013,sum,4488.40,t,t)",
	}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Errorf("(-separate calculation +thawledger):\n%s", diff)
	}
}
