package main

import (
	"fmt"
	"strings"
	"testing"

	"thawledger/ingest/csvfeed"
	"thawledger/ingest/unpack"
	"thawledger/pipeline/settings"
)

// acceptedSettings have one layout; %s is what it says.
const acceptedSettings = `
stations: [{id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}]
layouts: {l: {%s}}
feeds: [{name: f, folder: f, layout: l}]
`

// What settings accept of encodings, ingest can read, and the other way about.
func TestEncodingsAgree(t *testing.T) {
	layout := func(encoding string) string {
		return fmt.Sprintf(acceptedSettings, `encoding: `+encoding+`, delimiter: ",", time: {columns: ["1"], format: YYYY-MM-DD, zone: station, covers: day},
			station: {constant: TARN}, values: [{column: "2", variable: air_temp_max, unit: degC}]`)
	}
	for _, e := range unpack.Encodings {
		if _, _, err := settings.Parse("s", []byte(layout(e)), ""); err != nil {
			t.Error(err)
		}
	}
	_, _, err := settings.Parse("s", []byte(layout("ebcdic")), "")
	if err == nil || !strings.Contains(err.Error(), strings.Join(unpack.Encodings, ", ")) {
		t.Errorf("%v; want one that names %v", err, unpack.Encodings)
	}
}

// Whatever layout settings accept can be made ready for reading: nothing of the
// kind turns up only when a file comes.
func TestAcceptedLayoutsCompile(t *testing.T) {
	accepted := 0
	for _, delimiter := range []string{`","`, `";"`, "tab", "space", `"|"`} {
		for _, names := range []string{"", "names_line: 2, "} {
			for _, at := range []string{
				`columns: ["1"], format: YYYY-MM-DD, zone: station, covers: day`, `columns: ["1", "3"], format: YYYY DDD, zone: station, covers: day`,
				`columns: ["1"], format: "YYYY-MM-DD hh:mm", zone: "+03:30", covers: instant`, `columns: ["1"], format: "M/D/YY h:mm", zone: Z, covers: ending, span: 1h`,
				`columns: ["1"], format: "YYYYMMDDhhmmss", zone: station, covers: beginning, span: 5m`, `columns: ["1"], format: "YYYY-MM", zone: station, covers: day`,
				`columns: ["1"], format: YYYY-MM-DD, zone: station, covers: instant`, `columns: ["1"], format: "YYYY-MM-DD q", zone: Z, covers: instant`,
			} {
				for _, value := range []string{"air_temp, unit: K", "air_temp_max, unit: tenths degC", `air_temp_mean, unit: degF, missing: ["-99"], flag: {column: "4", marks: {M: missing}}`} {
					for _, station := range []string{`{constant: TARN}`, `{column: "5", map: {x: TARN}}`, `{file_name: "^([A-Z]+)_"}`} {
						text := fmt.Sprintf(acceptedSettings, fmt.Sprintf("delimiter: %s, %stime: {%s}, station: %s, values: [{column: \"2\", variable: %s}]", delimiter, names, at, station, value))
						set, _, err := settings.Parse("s", []byte(text), "", readable)
						if err != nil {
							if !strings.HasPrefix(err.Error(), "s:3:") {
								t.Errorf("not where the layout is: %v", err)
							}
							continue
						}
						accepted++
						if _, err := csvfeed.Compile(&set.Feeds[0].Layout); err != nil {
							t.Errorf("settings accept what cannot be read: %v\n%s", err, text)
						}
					}
				}
			}
		}
	}
	if accepted < 100 {
		t.Errorf("only %d layouts accepted", accepted)
	}
}

// What only reading would refuse is told with its place by `settings check`.
func TestUnreadableLayoutIsAFault(t *testing.T) {
	text := fmt.Sprintf(acceptedSettings, `delimiter: ",", time: {columns: ["1"], format: YYYY-MM-DD, zone: station, covers: day}, station: {constant: TARN}, values: [{column: "2", variable: air_temp, unit: K}]`)
	_, _, err := settings.Parse("s", []byte(text), "", readable)
	const want = `s:3:163: layouts.l.values[0].variable: air_temp is a value at an instant, and time.covers is day; air_temp_mean, air_temp_max or air_temp_min is right`
	if err == nil || err.Error() != want {
		t.Errorf("%v; want %s", err, want)
	}
}
