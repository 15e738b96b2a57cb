package csvfeed_test

import (
	"fmt"
	"io"
	"strings"
	"testing"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

// written writes down what a Sink is given.
type written struct {
	strings.Builder
	series []pipeline.Series
}

func (s *written) Reading(station string, column int, r pipeline.Reading) error {
	fmt.Fprintf(s, "%d %s %s %s %.6g %s\n", r.Row, station, s.series[column].Variable, r.Start().Format("2006-01-02T15:04:05"), r.ValueC, r.Quality)
	return nil
}

func (s *written) SetAside(a pipeline.SetAside) error {
	fmt.Fprintf(s, "! line %d row %d column %d %q %s: %s\n", a.Line, a.Row, a.Column, a.Name, a.Code, a.Text)
	return nil
}

// decode returns what came of text, line by line: readings, what was set aside,
// the counts of rows and cells, the error.
func decode(t *testing.T, layout *pipeline.Layout, source string, text io.Reader) string {
	t.Helper()
	plan, err := csvfeed.Compile(layout)
	if err != nil {
		t.Fatal(err)
	}
	s := &written{series: plan.Series()}
	c, err := plan.Decode(t.Context(), text, source, s)
	if sums := c.Check(); sums != nil {
		t.Error(sums)
	}
	fmt.Fprintf(s, "lines %d = %d header + %d blank + %d comments + %d rows; rows %d read, %d without value, %d set aside; cells %d read, %d missing, %d set aside\n",
		c.Lines, c.Header, c.Blank, c.Comments, c.Rows, c.RowsRead, c.RowsWithoutValue, c.RowsSetAside, c.CellsRead, c.CellsMissing, c.CellsSetAside)
	if err != nil {
		fmt.Fprintf(s, "%T: %s\n", err, err)
	}
	return s.String()
}

// diff compares two transcripts and shows where they part.
func diff(t *testing.T, got, want string) {
	t.Helper()
	got, want = strings.TrimSpace(got), strings.TrimSpace(want)
	if got == want {
		return
	}
	g, w := strings.Split(got, "\n"), strings.Split(want, "\n")
	for i := range max(len(g), len(w)) {
		a, b := "(end)", "(end)"
		if i < len(g) {
			a = g[i]
		}
		if i < len(w) {
			b = strings.TrimSpace(w[i])
		}
		if a != b {
			t.Errorf("line %d\n got %s\nwant %s", i+1, a, b)
		}
	}
}

// north is a station nine hours behind UTC whose day begins at 06:00.
var north = pipeline.StationClock{UTCOffsetS: -9 * 3600, DayStartsS: 6 * 3600}

// daily is a layout of days: station, date, highest, its flag, lowest.
func daily() *pipeline.Layout {
	return &pipeline.Layout{
		Name: "invented", Delimiter: ",", Comment: "#", NamesLine: 1,
		Time:    pipeline.TimeColumns{Columns: []string{"date"}, Format: "YYYY-MM-DD", Zone: "station", Covers: pipeline.CoversDay, SpanS: 86400},
		Station: pipeline.StationColumn{Column: "id", Map: map[string]string{"N1": "north"}, Clocks: map[string]pipeline.StationClock{"north": north, "south": {}}},
		Values: []pipeline.ValueColumn{
			{Column: "max", Variable: "air_temp_max", Unit: pipeline.DegC, LevelM: 2, Missing: []string{"-9999", "NaN"}, Flag: &pipeline.FlagColumn{
				Column: "flag", Empty: pipeline.QualityGood, Marks: map[string]pipeline.Quality{"E": pipeline.QualityEstimated, "M": pipeline.QualityMissing}}},
			{Column: "min", Variable: "air_temp_min", Unit: pipeline.DegC, LevelM: 2},
		},
		MaxSetAside: 1,
	}
}

// hourly is a layout of instants: time and temperature.
func hourly() *pipeline.Layout {
	return &pipeline.Layout{
		Name: "invented", Delimiter: ",", NamesLine: 1,
		Time:        pipeline.TimeColumns{Columns: []string{"time"}, Format: "YYYY-MM-DD hh:mm", Zone: "station", Covers: pipeline.CoversInstant},
		Station:     pipeline.StationColumn{Constant: "north", Clocks: map[string]pipeline.StationClock{"north": north}},
		Values:      []pipeline.ValueColumn{{Column: "temp", Variable: "air_temp", Unit: pipeline.DegC, LevelM: 2}},
		MaxSetAside: 1,
	}
}
