package csvfeed_test

import (
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

// A file read in pieces, cut at line ends, gives what it gives read at once.
func TestRestGivesWhatTheWholeGives(t *testing.T) {
	for _, names := range []int{0, 2} {
		layout := &pipeline.Layout{
			Delimiter: ",", NamesLine: names, MaxSetAside: 1, Comment: "#",
			Time:    pipeline.TimeColumns{Columns: []string{"1"}, Format: "YYYY-MM-DD", Zone: "station", Covers: pipeline.CoversDay, SpanS: 86400},
			Station: pipeline.StationColumn{Constant: "N", Clocks: map[string]pipeline.StationClock{"N": {}}},
			Values:  []pipeline.ValueColumn{{Column: "2", Variable: "air_temp_mean", Unit: pipeline.DegC}},
		}
		plan, err := csvfeed.Compile(layout)
		if err != nil {
			t.Fatal(err)
		}
		rapid.Check(t, func(t *rapid.T) {
			// The first piece has a row that was read: without names it gives the number of columns.
			lines := append([]string{"first\n", "date,c,d\n"}[:names:names], "2031-04-30,1,x\n")
			for range rapid.IntRange(1, 30).Draw(t, "rows") {
				lines = append(lines, rapid.SampledFrom([]string{"2031-05-01,1,x\n", "2031-05-02,2.5,y\r\n", "\n", "# note\n", "2031-05-03,,z\n", "2031-13-01,1,x\n", "short\n", "2031-05-04,1,2,3\n"}).Draw(t, "line"))
			}
			whole := &written{series: plan.Series()}
			want, err := plan.Decode(t.Context(), strings.NewReader(strings.Join(lines, "")), "", whole)
			if err != nil {
				t.Fatal(err)
			}
			var got pipeline.Counts
			pieces := &written{series: plan.Series()}
			at := rapid.IntRange(names+1, len(lines)).Draw(t, "first piece")
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
