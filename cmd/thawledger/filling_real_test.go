package main

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"thawledger/pipeline"
)

const fillingSettings = `
data: data
stations:
  - {id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: as_reported}
  - {id: MERE, latitude: 69, longitude: -122, utc_offset: "-08:00", daily_mean: as_reported}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {file_name: "^([A-Z]+)[.]"}
    values: [{column: mean, variable: air_temp_mean, unit: degC}]
feeds:
  - {name: feed, folder: feed, settle: 0s, layout: daily}
sites: []
`

// pair returns two invented records of six years from 1 January 2010: TARN's
// departures from a course of the year that both have, 3 degC warmer at TARN, are
// 0.8 times MERE's and independent errors of 0.5 degC.
func pair() (tarn, mere string) {
	random := rand.New(rand.NewPCG(4, 4))
	var a, b strings.Builder
	a.WriteString("date,mean\n")
	b.WriteString("date,mean\n")
	x := 0.0
	for d := pipeline.DayOf(2010, 1, 1); d <= pipeline.DayOf(2015, 12, 31); d++ {
		x = 0.7*x + 2.5*random.NormFloat64()
		normal := -6 + 16*math.Cos(2*math.Pi*float64(d-pipeline.DayOf(2010, 7, 20))/365.25)
		fmt.Fprintf(&a, "%s,%.2f\n", d, normal+3+0.8*x+0.5*random.NormFloat64())
		fmt.Fprintf(&b, "%s,%.2f\n", d, normal+x)
	}
	return a.String(), b.String()
}

// What the commands say of a pair of stations is what the pair was made with.
func TestFillingCommands(t *testing.T) {
	tarn, mere := pair()
	p := newPlace(t, fillingSettings, map[string]string{"feed/TARN.csv": tarn, "feed/MERE.csv": mere})
	p.run(t, "run", "--until-idle")

	said := p.run(t, "filling", "show", "--station", "TARN", "--neighbour", "MERE")
	months := 0
	for line := range strings.Lines(said) {
		f := strings.Fields(line)
		if len(f) != 13 || f[12] != "yes" {
			continue
		}
		months++
		var slope, sd float64
		if _, err := fmt.Sscan(f[5], &slope); err != nil || math.Abs(slope-0.8) > 0.05 {
			t.Errorf("slope %q; want 0.8: %s", f[5], line)
		}
		if _, err := fmt.Sscan(f[8], &sd); err != nil || math.Abs(sd-0.5) > 0.1 {
			t.Errorf("s %q; want 0.5: %s", f[8], line)
		}
	}
	if months != 12 || !strings.HasSuffix(said, pipeline.Caution+"\n") {
		t.Errorf("%d months:\n%s", months, said)
	}

	test := func() string {
		return p.run(t, "filling", "test", "--station", "TARN", "--neighbour", "MERE", "--repeats", "10", "--seed", "3")
	}
	said = test()
	for _, want := range []string{"TARN, thaw index: 5 seasons, 2010 to 2014", "days removed in all", "outside 90 to 98 %", "neighbour", "line", pipeline.Caution} {
		if !strings.Contains(said, want) {
			t.Errorf("no %q in\n%s", want, said)
		}
	}
	if again := test(); again != said {
		t.Errorf("the same seed gave\n%s\nand\n%s", said, again)
	}
}

func TestFillingCommandsRefuse(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	p.settle(t, fillingSettings)
	for _, c := range []struct {
		args   string
		status int
		want   string
	}{
		{"filling", 2, "filling show"},
		{"filling show --station TARN", 2, "filling show"},
		{"filling test --station TARN --kind melt", 2, "filling show"},
		{"filling test --station TARN --repeats 0", 2, "filling show"},
		{"filling test --station FELL", 1, `there is no station "FELL"`},
		{"filling test --station TARN --neighbour FELL", 1, `there is no station "FELL"`},
		{"filling test --station TARN --neighbour TARN", 1, "the station itself"},
		{"filling test --station TARN", 1, "there is no database"},
	} {
		var out bytes.Buffer
		args := append(strings.Fields(c.args), "--settings", p.settings)
		if c.args == "filling" {
			args = args[:1]
		}
		if status := (program{out: &out, err: &out}).main(t.Context(), args); status != c.status || !strings.Contains(out.String(), c.want) {
			t.Errorf("%s: status %d; want %d and %q\n%s", c.args, status, c.status, c.want, out.String())
		}
	}
}
