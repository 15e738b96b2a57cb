package main

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// joinedSettings have two stations, and a record that takes the one up to a day
// and then the other, adjusted; %s is what else the first station says.
const joinedSettings = `
data: data
stations:
  - {id: OLD, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min%s}
  - {id: NEW, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}
  - id: BOTH
    latitude: 69
    longitude: -121
    utc_offset: "-08:00"
    joined:
      - {station: OLD, until: 2024-06-10}
      - {station: NEW, adjust_c: [0, 0, 0, 0, 0, -1.5, 0, 0, 0, 0, 0, 0], error_c: 0.3, source: side by side}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {file_name: "^([A-Z]+)_"}
    values: [{column: tmax, variable: air_temp_max, unit: degC}, {column: tmin, variable: air_temp_min, unit: degC}]
feeds:
  - {name: feed, folder: feed, settle: 0s, layout: daily}
sites:
  - id: strip
    station: BOTH
    surfaces:
      - id: gravel
        design_values:
          - {kind: thaw, definition: sum, of: air, direction: not_above, index: 100, unit: degC.d, source: invented}
`

// A joined record takes each member's days in its time, adjusts daily values and
// not the index, and follows what is corrected in a member.
func TestJoinedRecord(t *testing.T) {
	t.Parallel()
	constant := func(first string, n int, c float64) string {
		return daysOf(first, n, func(float64) float64 { return c })
	}
	p := newPlace(t, fmt.Sprintf(joinedSettings, ""), map[string]string{
		"feed/OLD_0.csv": constant("2024-01-15", 138, -10), // to the end of May, so that no day of the season is missing
		"feed/OLD_1.csv": constant("2024-06-01", 15, 4), "feed/NEW_1.csv": constant("2024-06-06", 15, 6),
	})
	p.run(t, "run", "--until-idle")
	// the marks of the values themselves: a test doubts the same value day after day
	days := `select to_char(day, 'DD'), d.mean_c, b.quality[day - b.first_day + 1] from thaw.daily_values d
		join thaw.daily_blocks b on b.station = d.station and day between b.first_day and b.last_day
		where d.station = 'BOTH' and day > '2024-05-31' order by day`
	want := []string{}
	for d := 1; d <= 20; d++ {
		if d <= 10 {
			want = append(want, fmt.Sprintf("(%02d,4,4)", d))
		} else {
			want = append(want, fmt.Sprintf("(%02d,4.5,5)", d)) // 6 - 1.5, marked changed
		}
	}
	if diff := cmp.Diff(want, p.rows(t, days)); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	// 10 days of 4 and 10 of 4.5, by hand
	standing := `select state, index_c_days from thaw.standing_now where site = 'strip'`
	if got := p.rows(t, standing); !strings.HasSuffix(got[0], ",85)") {
		t.Errorf("standing %v; want 85 degC.d", got)
	}
	// 4 - 6 on ten days
	if got := p.run(t, "station", "compare", "OLD", "NEW"); !strings.Contains(got, "-2.00") || !strings.Contains(got, "less than two years") {
		t.Errorf("compared:\n%s", got)
	}

	p.write(t, "feed/OLD_2.csv", constant("2024-06-01", 1, 14))
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, standing); !strings.HasSuffix(got[0], ",95)") {
		t.Errorf("standing %v once a member is corrected; want 95 degC.d", got)
	}
	p.settle(t, fmt.Sprintf(joinedSettings, `, history: [{what: maintenance, from: 2024-06-01, to: 2024-06-02, note: mast down}, {what: sensor, on: 2024-06-03, note: new}]`))
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, standing); !strings.HasSuffix(got[0], ",77)") {
		t.Errorf("standing %v without the days of maintenance, 14 and 4; want 77 degC.d", got)
	}
	if got := p.rows(t, `select count(*) from thaw.station_history where retired_at is null`); got[0] != "(2)" {
		t.Errorf("history %v", got)
	}
	p.settle(t, fmt.Sprintf(joinedSettings, ""))
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, standing); !strings.HasSuffix(got[0], ",95)") {
		t.Errorf("standing %v with the maintenance taken back; want 95 degC.d", got)
	}
}
