package propose

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline/settings"
)

// inForce reads a proposal as settings, with the stations that it needs.
func inForce(p *Proposal) (*settings.Settings, error) {
	text := "data: data\nstations:\n"
	for _, id := range p.ids {
		text += fmt.Sprintf("  - {id: %q, latitude: 69.3, longitude: -121, utc_offset: \"-08:00\", daily_mean: max_min}\n", id)
	}
	s, _, err := settings.Parse("settings.yaml", []byte(text+p.YAML()+"sites: []\n"), ".")
	return s, err
}

// comesTrue fails unless settings read from the YAML the very layout.
func comesTrue(t fataler, p *Proposal) {
	t.Helper()
	s, err := inForce(p)
	if err != nil {
		t.Fatalf("%v\n%s", err, p.YAML())
	}
	want, got := p.Layout, *s.Layouts[p.Layout.Name]
	if diff := cmp.Diff(outline(&want), outline(&got)); diff != "" {
		t.Fatalf("by settings another layout (-proposed +read):\n%s\n%s", diff, p.YAML())
	}
	if got.Comment != want.Comment || got.MaxSetAside != want.MaxSetAside || got.Values[0].LevelM != want.Values[0].LevelM || got.Values[0].Sensor != want.Values[0].Sensor {
		t.Fatalf("by settings %+v, proposed %+v", got, want)
	}
	if len(s.Feeds) != 1 || s.Feeds[0].Layout.Name != want.Name {
		t.Fatalf("feeds %+v", s.Feeds)
	}
}

type fataler interface {
	Helper()
	Fatalf(format string, args ...any)
}

func TestYAMLOfShapes(t *testing.T) {
	for _, tt := range shapes {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, tt.name, string(load(t, tt.name)))
			comesTrue(t, p)
			text := p.YAML()
			if n := strings.Count(text, "# ? "); n != len(p.Questions) {
				t.Errorf("%d questions in the YAML, %d in the proposal:\n%s", n, len(p.Questions), text)
			}
		})
	}
}

func TestYAMLOfOddNames(t *testing.T) {
	rows := daily("", "2006-01-02", on(2031, 5, 1), 30, 0, 10)[1:]
	for _, name := range []string{"Temp: max", "Temp # max", `Temp "max"`, "Temp 'max'", "Temp {max}, C", "- Temp max", "*Temp max", "Temp max, ~", "Temp max\\n", "Tmax °C", "temp\tmax", "Temp max \u2028 C", "yes temp max"} {
		header := "date,\"" + strings.ReplaceAll(name, `"`, `""`) + "\",tmin\n"
		p := mustLook(t, "f.csv", header+rows)
		comesTrue(t, p)
		if p.Read != 30 {
			t.Errorf("%q: %d read", name, p.Read)
		}
	}
	for _, file := range []string{"", "no.csv", "x: y.csv", "# a.csv", "ä.csv", "f\nlayouts: {}.csv", `C:\data\f.csv`, "/a/b/f", "12.csv", strings.Repeat("long", 60) + ".csv", "f.c sv", "f.[a-"} {
		comesTrue(t, mustLook(t, file, "date,tmax,tmin\n"+rows))
	}
}

// Questions stand straight above what they are about.
func TestQuestionsStandWhereTheyBelong(t *testing.T) {
	p := mustLook(t, "five.csv", string(load(t, "white_space.txt")))
	lines := strings.Split(p.YAML(), "\n")
	below := map[About]string{Missing: "missing:", Zone: "zone:", Station: "column: \"1\"", Unit: "- {column: \"6\"", Variable: "- {column: \""}
	for i, l := range lines {
		_, text, ok := strings.Cut(l, "# ? ")
		if !ok {
			continue
		}
		about, _, _ := strings.Cut(text, ":")
		for i++; strings.HasPrefix(strings.TrimSpace(lines[i]), "#"); i++ {
		}
		if want := below[About(about)]; want == "" || !strings.HasPrefix(strings.TrimSpace(lines[i]), want) {
			t.Errorf("%q stands above %q", text, lines[i])
		}
	}
}
