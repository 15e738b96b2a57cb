package main

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"thawledger/pipeline/settings"
)

// feed try shows what would come of a file, and uses nothing of it.
func TestFeedTry(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	p.settle(t, fmt.Sprintf(hourlySettings, "Z", ""))
	file := p.write(t, "a.csv", hours(0, 1, 2, 3, 4, 5)+"2025-07-10 05:00,x\n")
	said := p.run(t, "feed", "try", file, "--feed", "tarn")
	for _, want := range []string{"rows   6  read 5, without value 0, set aside 1", "row 1  TARN  air_temp  2025-07-10 00:00 UTC  1.00 degC  not_checked",
		"bad_number: 1", "line 7: ", "5.0 ┤", "nothing of it is used"} {
		if !strings.Contains(said, want) {
			t.Errorf("no %q in\n%s", want, said)
		}
	}
	var out bytes.Buffer
	other := p.write(t, "b.csv", "when,t\n2025-07-10 00:00,1\n")
	if status := (program{out: &out, err: &out}).main(t.Context(), []string{"feed", "try", other, "--feed", "tarn", "--settings", p.settings}); status != 1 ||
		!strings.Contains(out.String(), `would be held back: line 1: there is no column "time"`) {
		t.Errorf("another layout: status %d\n%s", status, out.String())
	}
	if _, err := os.Stat(filepath.Join(p.dir, "data")); !os.IsNotExist(err) {
		t.Error("something was started")
	}
}

// A proposal for an unknown file can be pasted into the settings as it is.
func TestFeedTryProposes(t *testing.T) {
	file := filepath.Join("..", "..", "testdata", "vega_seattle", "seattle-weather.csv")
	var out bytes.Buffer
	if status := (program{out: &out, err: &out}).main(t.Context(), []string{"feed", "try", file}); status != 0 {
		t.Fatalf("status %d\n%s", status, out.String())
	}
	said := out.String()
	for _, want := range []string{"of what unit", "station's standard time", "rows looked at it reads 762"} {
		if !strings.Contains(said, want) {
			t.Errorf("no %q in\n%s", want, said)
		}
	}
	proposal := regexp.MustCompile(`(?ms)^layouts:.*^    layout: [^\n]*\n`).FindString(said)
	stations := "stations: [{id: TO-BE-NAMED, latitude: 47.6, longitude: -122.3, utc_offset: \"-08:00\", daily_mean: max_min}]\n"
	set, _, err := settings.Parse("s", []byte(stations+proposal), "", readable)
	if err != nil {
		t.Fatalf("%v\n%s", err, proposal)
	}
	if v := set.Feeds[0].Layout.Values; len(v) != 2 || v[0].Column != "temp_max" || v[0].Unit != "degC" || v[1].Variable != "air_temp_min" {
		t.Errorf("proposed %+v", v)
	}
}
