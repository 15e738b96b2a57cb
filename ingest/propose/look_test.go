package propose

import (
	"bytes"
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

func load(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func mustLook(t testing.TB, name, text string) *Proposal {
	t.Helper()
	p, err := Look(name, [][]byte{[]byte(text)})
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// outline writes what a layout says, one thing a line.
func outline(l *pipeline.Layout) []string {
	out := []string{
		fmt.Sprintf("%q %q names %d", l.Delimiter, l.Comment, l.NamesLine),
		fmt.Sprintf("time %s %q %s %s %d", strings.Join(l.Time.Columns, "+"), l.Time.Format, l.Time.Zone, l.Time.Covers, l.Time.SpanS),
		"station " + strings.TrimSpace(l.Station.Column+" "+l.Station.FileName+" "+l.Station.Constant),
	}
	for _, from := range slices.Sorted(maps.Keys(l.Station.Map)) {
		out = append(out, "map "+from+" = "+l.Station.Map[from])
	}
	for _, v := range l.Values {
		text := fmt.Sprintf("%s %s %s", v.Column, v.Variable, v.Unit)
		if len(v.Missing) > 0 {
			text += " missing " + strings.Join(v.Missing, " ")
		}
		if v.Flag != nil {
			text += " flag " + v.Flag.Column
			for _, mark := range slices.Sorted(maps.Keys(v.Flag.Marks)) {
				text += " " + mark + "=" + v.Flag.Marks[mark].String()
			}
		}
		out = append(out, text)
	}
	return out
}

func abouts(p *Proposal) []string {
	var out []string
	for _, q := range p.Questions {
		if !slices.Contains(out, string(q.About)) {
			out = append(out, string(q.About))
		}
	}
	slices.Sort(out)
	return out
}

// The samples have the shapes of files of national services and loggers, with
// invented stations and values; what they are to be read by was written down when
// they were made.
var shapes = []struct {
	name string
	want []string
	ask  string // what is asked, and nothing else
	read [4]int // rows, read, without value, set aside
}{
	{
		name: "quoted_flags.csv",
		want: []string{`"," "" names 1`, `time Date/Time "YYYY-MM-DD" station day 86400`, "station Climate ID",
			"Max Temp (°C) air_temp_max degC flag Max Temp Flag M=missing", "Min Temp (°C) air_temp_min degC flag Min Temp Flag E=estimated M=missing"},
		ask: "flag station zone", read: [4]int{61, 57, 4, 0},
	},
	{
		name: "hourly_utc.csv",
		want: []string{`"," "" names 1`, `time Date/Time (UTC) "YYYY-MM-DD hh:mm" +00:00 instant 0`, "station Climate ID", "Temp (°C) air_temp degC flag Temp Flag M=missing"},
		ask:  "covers station", read: [4]int{96, 83, 11, 2},
	},
	{
		name: "day_of_year.csv",
		want: []string{`"," "" names 1`, `time Year+Day "YYYY DDD" station day 86400`, "station TO-BE-NAMED", "Average air_temp_mean degF"},
		ask:  "station unit variable zone", read: [4]int{406, 406, 0, 0},
	},
	{
		name: "month_day.csv",
		want: []string{`"," "" names 1`, `time DATE "M/D/YYYY" station day 86400`, "station STATION", "TMAX air_temp_max degF", "TMIN air_temp_min degF"},
		ask:  "station unit zone", read: [4]int{300, 300, 0, 0},
	},
	{
		name: "white_space.txt",
		want: []string{`"space" "" names 0`, `time 2 "YYYYMMDD" station day 86400`, "station 1",
			"6 air_temp_max degC missing -99.000 -9999.0", "7 air_temp_min degC missing -99.000 -9999.0"},
		ask: "missing station unit variable zone", read: [4]int{120, 116, 4, 0},
	},
	{
		name: "702001-99999.csv",
		want: []string{`"," "" names 1`, `time t "YYYY-MM-DDThh:mmZ" +00:00 instant 0`, "station ^([0-9]+-[0-9]+)[.]csv$",
			"air_temperature air_temp degC flag air_temperature_quality 1=not_checked 9=missing"},
		ask: "covers flag station unit", read: [4]int{200, 190, 9, 1}, // the one value with flag 2 waits for an answer
	},
	{
		name: "five_minutes.csv",
		want: []string{`"," "" names 1`, `time ds "YYYY-MM-DD hh:mm:ss" station instant 0`, "station TO-BE-NAMED", "y air_temp degC missing NaN"},
		ask:  "covers station unit variable zone", read: [4]int{400, 395, 5, 0},
	},
	{
		name: "max_min.csv",
		want: []string{`"," "" names 1`, `time date "YYYY-MM-DD" station day 86400`, "station TO-BE-NAMED", "temp_max air_temp_max degC", "temp_min air_temp_min degC"},
		ask:  "station unit zone", read: [4]int{365, 365, 0, 0},
	},
	{
		name: "two_places.csv",
		want: []string{`"," "" names 1`, `time date "YYYY-MM-DD" station day 86400`, "station location", "map Fell Ridge = FELL-RIDGE",
			"temp_max air_temp_max degC", "temp_min air_temp_min degC"},
		ask: "station unit zone", read: [4]int{730, 730, 0, 0},
	},
	{
		name: "hourly_normals.csv",
		want: []string{`"," "" names 1`, `time date "YYYY-MM-DDThh:mm:ss" station instant 0`, "station TO-BE-NAMED", "temperature air_temp degC"},
		ask:  "covers station unit zone", read: [4]int{390, 390, 0, 0},
	},
	{
		name: "logger_FELL2.dat",
		want: []string{`"," "" names 4`, `time 1 "YYYY-MM-DD hh:mm:ss" station ending 3600`, "station TO-BE-NAMED", "4 air_temp_mean degC"},
		ask:  "covers station zone", read: [4]int{72, 72, 0, 0},
	},
	{
		name: "remarks.txt",
		want: []string{`"\t" "#" names 0`, `time 1 "DD.MM.YYYY hh:mm" +00:00 instant 0`, "station TO-BE-NAMED", "2 air_temp degC"},
		ask:  "covers station zone", read: [4]int{48, 48, 0, 0},
	},
}

func TestLookAtShapes(t *testing.T) {
	for _, tt := range shapes {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, tt.name, string(load(t, tt.name)))
			if diff := cmp.Diff(tt.want, outline(&p.Layout)); diff != "" {
				t.Errorf("layout (-want +got):\n%s", diff)
			}
			if got := strings.Join(abouts(p), " "); got != tt.ask {
				t.Errorf("asked about %q, want %q", got, tt.ask)
			}
			if got := [4]int{p.Rows, p.Read, p.WithoutValue, p.SetAside}; got != tt.read {
				t.Errorf("rows, read, without value, set aside: %v, want %v; first %s", got, tt.read, p.FirstSetAside)
			}
		})
	}
}

// A long file is looked at in pieces: the names are in the first only.
func TestLookAtPieces(t *testing.T) {
	text := load(t, "max_min.csv")
	lines := bytes.SplitAfter(text, []byte("\n"))
	pieces := [][]byte{bytes.Join(lines[:100], nil), bytes.Join(lines[150:200], nil), bytes.Join(lines[300:], nil)}
	p, err := Look("max_min.csv", pieces)
	if err != nil {
		t.Fatal(err)
	}
	whole := mustLook(t, "max_min.csv", string(text))
	if diff := cmp.Diff(whole.Layout, p.Layout); diff != "" {
		t.Errorf("by pieces another layout (-whole +pieces):\n%s", diff)
	}
	if want := len(lines) - 1 - 50 - 100 - 1; p.Rows != want {
		t.Errorf("%d rows, want %d", p.Rows, want)
	}
}

// The first readings are those of the file, in degC, by hand.
func TestFirstReadings(t *testing.T) {
	p := mustLook(t, "month_day.csv", string(load(t, "month_day.csv")))
	if len(p.First) != 5 {
		t.Fatalf("%d first readings", len(p.First))
	}
	// 27 degF on 1 January 2031: 27 - 32 = -5, / 1.8 = -2.78.
	r := p.First[0]
	if r.Station != "USX00026001" || r.Column != "TMAX" || r.Start.Format("2006-01-02 15:04") != "2031-01-01 00:00" || fmt.Sprintf("%.2f", r.ValueC) != "-2.78" {
		t.Errorf("first reading %+v", r)
	}
}
