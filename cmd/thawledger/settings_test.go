package main

import (
	"bytes"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

const fiveMistakes = `data: data
stations:
  - {id: TARN, latitude: 690, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}
  - {id: FELL, latitude: 69, longitude: -121, utc_ofset: "-08:00", utc_offset: "-8", daily_mean: max_min}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {column: id}
    values: [{column: t, variable: air_temp_mean, unit: Fahrenheit}]
feeds:
  - {name: tarn, folder: arrivals, layout: dayly}
sites: []
`

// Five mistakes give five messages in one go, each with its place, what is wrong
// and what would be right, and nothing is started.
func TestFiveMistakes(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	p.settings = p.write(t, "settings.yaml", fiveMistakes)
	want := strings.NewReplacer("FILE", p.settings).Replace(`FILE:3:26: stations[0].latitude: "690" will not do; write a number from -90 to 90
FILE:4:47: stations[1].utc_ofset: there is no such key; did you mean utc_offset?
FILE:4:80: stations[1].utc_offset: "-8" is no offset; write standard time minus UTC, in quotes, such as "-08:00"
FILE:11:57: layouts.daily.values[0].unit: "Fahrenheit" is not known; write one of degC, degF, K, tenths degC, tenths degF
FILE:13:44: feeds[0].layout: there is no layout "dayly"; layouts are daily
`)
	for _, args := range [][]string{{"settings", "check"}, {"run"}, {"run", "--until-idle"}, {"schema", "apply"}} {
		var out, log bytes.Buffer
		status := (program{out: &out, err: &log}).main(t.Context(), append(args, "--settings", p.settings))
		if diff := cmp.Diff(want, strings.TrimPrefix(log.String(), "thawledger: ")); status != 1 || diff != "" || out.Len() > 0 {
			t.Errorf("%v: status %d (-want +got):\n%s", args, status, diff)
		}
	}
	if _, err := os.Stat(filepath.Join(p.dir, "data")); !os.IsNotExist(err) {
		t.Error("something was started")
	}
}
