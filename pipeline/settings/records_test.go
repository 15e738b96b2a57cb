package settings

import (
	"strings"
	"testing"
)

const recordsFile = `stations:
  - {id: OLD, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: as_reported, history: [%HISTORY]}
  - {id: NEW, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}
  - {id: BOTH, latitude: 69, longitude: -121, utc_offset: "-08:00"%MORE, joined: [%JOINED]}
layouts:
  l: {delimiter: ",", names_line: 1, time: {columns: [d], format: YYYY-MM-DD, zone: station, covers: day}, station: {column: s},
      values: [{column: t, variable: air_temp_mean, unit: degC}]}
feeds: [{name: f, folder: f, layout: l%FEED}]
`

func records(history, more, joined, feed string) string {
	return strings.NewReplacer("%HISTORY", history, "%MORE", more, "%JOINED", joined, "%FEED", feed).Replace(recordsFile)
}

const goodJoined = `{station: OLD, until: 2020-01-01}, {station: NEW, adjust_c: -0.5, source: s}`

// Histories and joined records are shown as they were read, and their faults found.
func TestRecords(t *testing.T) {
	good := records(`{what: moved, on: 2020-01-01, note: up the hill}, {what: maintenance, from: 2020-02-01, to: 2020-02-03}`, "", goodJoined, "")
	s, warnings, err := Parse("s", []byte(good), "")
	if err != nil || len(warnings) > 0 {
		t.Fatal(err, warnings)
	}
	if st := s.Stations[2]; len(st.Joined) != 2 || st.Joined[1].AdjustC[11] != -0.5 || st.Mean != "max_min" {
		t.Errorf("joined record %+v", st)
	}
	if f := s.Stations[0].Facts; len(f) != 2 || f[0].From != f[0].To || f[1].To-f[1].From != 2 {
		t.Errorf("history %+v", f)
	}
	if _, joined := s.Feeds[0].Layout.Station.Clocks["BOTH"]; joined {
		t.Error("a feed can bring readings of a joined record")
	}
	again, _, err := Parse("s", []byte(s.Text()), "")
	if err != nil || again.Hash != s.Hash {
		t.Errorf("shown and read again: %v\n%s", err, s.Text())
	}
	for _, c := range []struct{ name, text, says string }{
		{"two dates", records(`{what: moved, on: 2020-01-01, to: 2020-02-01}`, "", goodJoined, ""), "dated twice"},
		{"ends first", records(`{what: moved, from: 2020-02-01, to: 2020-01-01}`, "", goodJoined, ""), "before it begins"},
		{"no date", records(`{what: moved}`, "", goodJoined, ""), "history[0].from: it is missing"},
		{"what", records(`{what: painted, on: 2020-01-01}`, "", goodJoined, ""), "sensor"},
		{"no such member", records("", "", `{station: OTHER}`, ""), `"OTHER", which there is not`},
		{"member is joined", records("", "", `{station: BOTH}`, ""), "joined itself"},
		{"open member in the middle", records("", "", `{station: OLD}, {station: NEW}`, ""), "has no end"},
		{"last member ends", records("", "", `{station: OLD, until: 2020-01-01}`, ""), "leave until out"},
		{"order", records("", "", `{station: OLD, until: 2020-01-01}, {station: NEW, until: 2019-01-01}, {station: OLD}`, ""), "order of time"},
		{"no source", records("", "", `{station: OLD, until: 2020-01-01}, {station: NEW, adjust_c: 1}`, ""), "where the adjustment is from"},
		{"eleven months", records("", "", `{station: NEW, source: s, adjust_c: [0, 0, 0, 0, 0, 0, 0, 0, 0, 0, 0]}`, ""), "twelve"},
		{"a month is no number", records("", "", `{station: NEW, source: s, adjust_c: [0, 0, 0, x, 0, 0, 0, 0, 0, 0, 0, 0]}`, ""), `"x" will not do`},
		{"rule", records("", ", daily_mean: hourly", goodJoined, ""), "leave it out"},
		{"feed of it", records("", "", goodJoined, ", station: {constant: BOTH}"), "no readings of its own"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, _, err := Parse("s", []byte(c.text), "")
			if err == nil || !strings.Contains(err.Error(), c.says) || !strings.HasPrefix(err.Error(), "s:") {
				t.Errorf("%v; want %q", err, c.says)
			}
		})
	}
}
