package csvfeed_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

// A file read in pieces, cut at line ends, gives what it gives read at once.
func TestRestGivesWhatTheWholeGives(t *testing.T) {
	rows := []string{"2031-05-01,1,x\n", "2031-05-02,2.5,y\r\n", "\n", "# note\n", "2031-05-03,,z\n", "2031-13-01,1,x\n", "short\n", "2031-05-04,1,2,3\n"}
	tests := []struct {
		name   string
		header []string
		first  string // a row that is read: without names it gives the number of columns
		rows   []string
		layout func(*pipeline.Layout)
	}{
		{"no names", nil, "2031-04-30,1,x\n", rows, func(*pipeline.Layout) {}},
		{"names", []string{"first\n", "date,c,d\n"}, "2031-04-30,1,x\n", rows, func(l *pipeline.Layout) { l.NamesLine = 2 }},
		{"units, dashes, other names", []string{"date,c,d\n", "UTC,degC,\n", "---\n"}, "2031-04-30,1,x\n", rows, func(l *pipeline.Layout) {
			l.NamesLine, l.UnitsLine, l.DataLine, l.Values[0].UnitText = 1, 2, 4, "degC"
			l.Values[0].Column, l.Values[0].Or = "temp", []string{"c"}
		}},
		{"preamble with the station", []string{"Station N1\n", "2031-04-01,1,x\n", "# DATA\n", "date,c,d\n"}, "2031-04-30,1,x\n", rows, func(l *pipeline.Layout) {
			l.PreambleEnds, l.NamesLine = "DATA", 1
			l.Station = pipeline.StationColumn{Preamble: `^Station (\w+)`, Map: map[string]string{"N1": "N"}, Clocks: l.Station.Clocks}
		}},
		{"preamble and no names", []string{"N\n", "\n", "DATA\n"}, "2031-04-30,1,x\n", rows, func(l *pipeline.Layout) {
			l.PreambleEnds = "DATA"
			l.Station = pipeline.StationColumn{Preamble: `^(\w+)`, Clocks: l.Station.Clocks}
		}},
		{"long form", []string{"date,what,value\n"}, "2031-04-30,T,1\n", append([]string{"2031-05-01,H,x\n", "2031-05-01,T,x\n", "2031-05-02,T,-3\n"}, rows...), func(l *pipeline.Layout) {
			l.NamesLine, l.Values[0].Column, l.Values[0].When = 1, "value", map[string][]string{"what": {"T", "TA"}}
		}},
		{"widths after a preamble", []string{"x\n", "DATA\n", "\n"}, "2031-04-30  1.5x\n", []string{"2031-05-01 -2.5 y\n", "2031-05-02\n", "\n", "# note\n", "2031-05-03    1 a long note\n", "2031\n"}, func(l *pipeline.Layout) {
			l.Delimiter, l.Widths, l.PreambleEnds, l.DataLine = "", []int{10, 5, 1}, "DATA", 2
		}},
		{"decimal comma, quotes that are text", nil, "2031-04-30;1,5;x\n", []string{"2031-05-01;-2,5;\"\n", "2031-05-02;2.5;\n"}, func(l *pipeline.Layout) {
			l.Delimiter, l.Decimal, l.Quote = ";", ",", "none"
		}},
	}
	for _, tt := range tests {
		layout := &pipeline.Layout{
			Delimiter: ",", MaxSetAside: 1, Comment: "#",
			Time:    pipeline.TimeColumns{Columns: []string{"1"}, Format: "YYYY-MM-DD", Zone: "station", Covers: pipeline.CoversDay, SpanS: 86400},
			Station: pipeline.StationColumn{Constant: "N", Clocks: map[string]pipeline.StationClock{"N": {}}},
			Values:  []pipeline.ValueColumn{{Column: "2", Variable: "air_temp_mean", Unit: pipeline.DegC}},
		}
		tt.layout(layout)
		t.Run(tt.name, func(t *testing.T) {
			plan, err := csvfeed.Compile(layout)
			if err != nil {
				t.Fatal(err)
			}
			rapid.Check(t, func(t *rapid.T) {
				lines := append(slices.Clone(tt.header), tt.first)
				for range rapid.IntRange(1, 30).Draw(t, "rows") {
					lines = append(lines, rapid.SampledFrom(tt.rows).Draw(t, "line"))
				}
				whole := &written{series: plan.Series()}
				want, err := plan.Decode(t.Context(), strings.NewReader(strings.Join(lines, "")), "", whole)
				if err != nil {
					t.Fatal(err)
				}
				var got pipeline.Counts
				pieces := &written{series: plan.Series()}
				at := rapid.IntRange(len(tt.header)+1, len(lines)).Draw(t, "first piece")
				head := strings.Join(lines[:at], "")
				sums := func(c pipeline.Counts, err error) {
					if err != nil {
						t.Fatal(err)
					}
					got.Lines, got.Header, got.Blank, got.Comments = got.Lines+c.Lines, got.Header+c.Header, got.Blank+c.Blank, got.Comments+c.Comments
					got.Rows, got.RowsRead, got.RowsWithoutValue, got.RowsSetAside = got.Rows+c.Rows, got.RowsRead+c.RowsRead, got.RowsWithoutValue+c.RowsWithoutValue, got.RowsSetAside+c.RowsSetAside
					got.Cells, got.CellsRead, got.CellsMissing, got.CellsSetAside = got.Cells+c.Cells, got.CellsRead+c.CellsRead, got.CellsMissing+c.CellsMissing, got.CellsSetAside+c.CellsSetAside
				}
				sums(plan.Decode(t.Context(), strings.NewReader(head), "", pieces))
				for at < len(lines) {
					n := rapid.IntRange(1, len(lines)-at).Draw(t, "piece")
					sums(plan.DecodeRest(t.Context(), strings.NewReader(head), int64(at), strings.NewReader(strings.Join(lines[at:at+n], "")), "", pieces))
					at += n
				}
				if got != want {
					t.Fatalf("counts %+v in pieces, %+v at once", got, want)
				}
				if diff := cmp.Diff(withoutRows(whole.String()), withoutRows(pieces.String())); diff != "" {
					t.Fatalf("(-at once +in pieces):\n%s", diff)
				}
			})
		})
	}
}

// withoutRows takes the numbers of rows out: they begin again with each piece.
func withoutRows(text string) string {
	var b strings.Builder
	for line := range strings.Lines(text) {
		var row, number int
		if _, err := fmt.Sscanf(line, "! line %d row %d ", &number, &row); err == nil {
			line = strings.Replace(line, fmt.Sprintf(" row %d ", row), " ", 1)
		} else if _, after, ok := strings.Cut(line, " "); ok {
			line = after
		}
		b.WriteString(line)
	}
	return b.String()
}
