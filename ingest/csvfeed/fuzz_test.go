package csvfeed

import (
	"bytes"
	"encoding/csv"
	"io"
	"math"
	"slices"
	"strings"
	"testing"
	"testing/iotest"
	_ "time/tzdata"

	"thawledger/pipeline"
)

// counter is a Sink that counts and looks at what it is given.
type counter struct {
	t                     testing.TB
	readings, rows, cells int64
	order                 int64 // row of what came last
	last                  pipeline.SetAside
}

func (s *counter) Reading(station string, column int, r pipeline.Reading) error {
	s.readings++
	if s.t != nil && (math.IsNaN(r.ValueC) || math.Abs(r.ValueC) > 100 || int64(r.Row) < s.order || station != "north" || r.Quality == pipeline.QualityMissing) {
		s.t.Fatalf("reading %+v of %q", r, station)
	}
	s.order = int64(r.Row)
	return nil
}

func (s *counter) SetAside(a pipeline.SetAside) error {
	if a.Column == 0 {
		s.rows++
	} else {
		s.cells++
	}
	if s.t != nil && (int64(a.Row) < s.order || a.Line < int64(a.Row) || a.Code == "" || a.Text == "" || len(a.Text) > 4096 || len(a.Raw) > pipeline.MaxRaw) {
		s.t.Fatalf("set aside %+v", a)
	}
	s.order = int64(a.Row)
	s.last = a
	return nil
}

// planForFuzz is a layout of time, temperature and a flagged second temperature.
func planForFuzz(t testing.TB, delimiter string) *Plan {
	t.Helper()
	l := &pipeline.Layout{
		Name: "invented", Delimiter: delimiter, Comment: "#", NamesLine: 1, MaxSetAside: 1,
		Time:    pipeline.TimeColumns{Columns: []string{"time"}, Format: "YYYY-MM-DD hh:mm", Zone: "Z", Covers: pipeline.CoversInstant},
		Station: pipeline.StationColumn{Constant: "north", Clocks: map[string]pipeline.StationClock{"north": {}}},
		Values: []pipeline.ValueColumn{
			{Column: "temp", Variable: "air_temp", Unit: pipeline.DegC},
		},
	}
	if delimiter != "," {
		l.NamesLine, l.Time.Columns, l.Time.Format, l.Values[0].Column = 0, []string{"1"}, "YYYYMMDDhhmm", "2"
		l.Station = pipeline.StationColumn{Column: "5", Clocks: map[string]pipeline.StationClock{"north": {}}}
		l.Values = append(l.Values, pipeline.ValueColumn{Column: "3", Variable: "air_temp", Sensor: "b", Unit: pipeline.DegF, Missing: []string{"-99"},
			Flag: &pipeline.FlagColumn{Column: "4", Marks: map[string]pipeline.Quality{"M": pipeline.QualityMissing}}})
	}
	p, err := Compile(l)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// plansOfForms are layouts of what planForFuzz does not have: a preamble with the
// station, units, long form, a named zone, widths, quotes that are text.
func plansOfForms(t testing.TB) []*Plan {
	t.Helper()
	clocks := map[string]pipeline.StationClock{"north": {}}
	instant := func(format, zone string, columns ...string) pipeline.TimeColumns {
		return pipeline.TimeColumns{Columns: columns, Format: format, Zone: zone, Covers: pipeline.CoversInstant}
	}
	long := func(sensor, what string, unit pipeline.TempUnit) pipeline.ValueColumn {
		return pipeline.ValueColumn{Column: "value", Or: []string{"v"}, Variable: "air_temp", Sensor: sensor, Unit: unit, When: map[string][]string{"what": {what}}, UnitText: "x"}
	}
	layouts := []pipeline.Layout{
		{
			Delimiter: ";", Decimal: ",", PreambleEnds: "^end", NamesLine: 1, UnitsLine: 2, DataLine: 4, MaxSetAside: 1,
			Time: instant("YYYY DDD hmm", "Z", "y", "d", "h"), Station: pipeline.StationColumn{Preamble: `of (\w+)`, Clocks: clocks},
			Values: []pipeline.ValueColumn{long("a", "T", pipeline.DegC), long("b", "F", pipeline.DegF)},
		},
		{
			Widths: []int{13, 5, 1}, Comment: "#", MaxSetAside: 1, Time: instant("epoch_ms", "", "1"), Station: pipeline.StationColumn{Constant: "north", Clocks: clocks},
			Values: []pipeline.ValueColumn{{Column: "2", Variable: "air_temp", Unit: pipeline.DegC, Scale: 0.1, Offset: 1, When: map[string][]string{"3": {"", "a"}}}},
		},
		{
			Delimiter: ",", Quote: "none", MaxSetAside: 1, Time: instant("MMM D YYYY h:mm:ss.f AM", "America/Edmonton", "1"), Station: pipeline.StationColumn{Constant: "north", Clocks: clocks},
			Values: []pipeline.ValueColumn{{Column: "2", Variable: "air_temp", Unit: pipeline.DegC}},
		},
	}
	layouts[2].Time.Ambiguous, layouts[2].Time.Skipped = pipeline.AmbiguousEarlier, pipeline.SkippedSetAside
	var plans []*Plan
	for i := range layouts {
		p, err := Compile(&layouts[i])
		if err != nil {
			t.Fatal(err)
		}
		plans = append(plans, p)
	}
	return plans
}

// FuzzDecode: for any bytes the sums hold, the sink has been given what they
// say, and it makes no difference in which pieces the bytes arrive.
func FuzzDecode(f *testing.F) {
	for _, s := range []string{
		"", "time,temp\n2031-07-20 13:00,5\n", "\ufefftime,temp\r\n\"2031-07-20 13:00\",\"5\"\r\n2031-07-20 14:00,x\r\n#\r\n\r\n",
		"203107201300 1.5 32 M north\n203107201400\t1.5  -99 \"\" north\n203107201500 1 1e2 E south\n", "time,temp\n\"2031-07-20 13:00,5\n2031-07-20 14:00,5\n",
		"time,temp\rx\x00,\xff\r1,2,3\r", "203107201300,1.5,70,,north\n,,,,\n203107201300,1.5,9e9,M,north\n", "time,temp,time\n",
		"log of north\nend\ny;d;h;what;value\n;;;;x\n---\n2031;201;30;T;-1,5\n2031;201;2400;F;32\n2031;201;0;H;y\nx;201;0;T;1\n2031\n", "of north\nend\ny;d;h;what;v;value\n;;;;x\n",
		"194235120000012.5\n1942351200000 12.5a\n1942351200001-1   b \n\n#\n19423512000", "Nov 3 2024 1:00:00.000 AM,5\nMar 10 2024 2:30:00 AM,5\nJul 20 2031 1:00:00.5 PM,\"\n",
	} {
		f.Add([]byte(s))
	}
	plans := append([]*Plan{planForFuzz(f, ","), planForFuzz(f, "space"), planForFuzz(f, ";"), planForFuzz(f, "\t")}, plansOfForms(f)...)
	f.Fuzz(func(t *testing.T, text []byte) {
		if len(text) > 1<<16 {
			return
		}
		for _, p := range plans {
			s := &counter{t: t}
			c, err := p.Decode(t.Context(), bytes.NewReader(text), "", s)
			if err != nil {
				if _, hold := err.(*HoldError); !hold {
					t.Fatal(err)
				}
			}
			if sums := c.Check(); sums != nil {
				t.Fatal(sums)
			}
			least, most := s.rows*p.cells+s.cells, s.rows*int64(len(p.values))+s.cells
			if s.readings != c.CellsRead || c.CellsSetAside < least || c.CellsSetAside > most || c.RowsSetAside < s.rows {
				t.Fatalf("given %d readings, %d rows, %d cells; counted %+v", s.readings, s.rows, s.cells, c)
			}
			if err == nil {
				plain := strings.ReplaceAll(strings.ReplaceAll(string(text), "\r\n", "\n"), "\r", "\n")
				n := strings.Count(plain, "\n")
				if len(plain) > 0 && plain[len(plain)-1] != '\n' {
					n++
				}
				if c.Lines != int64(n) {
					t.Fatalf("%d lines counted, there are %d", c.Lines, n)
				}
			}
			pieces := &counter{}
			again, _ := p.Decode(t.Context(), iotest.OneByteReader(bytes.NewReader(text)), "", pieces)
			if again != c || pieces.last != s.last {
				t.Fatalf("byte by byte: got %+v, want %+v", again, c)
			}
		}
	})
}

// FuzzSplit: one line has the cells that encoding/csv gives it, or is refused by
// both.
func FuzzSplit(f *testing.F) {
	for _, s := range []string{"a,b,c", `"a","b,c",`, `"a""b",c`, `"a"b,c`, `a"b`, `"a`, ",,", `""`, `"""`, `""""`, ` "a"`, `"é",ü`, `"a,""",b`} {
		f.Add(s, uint8(0))
		f.Add(s, uint8(2))
	}
	f.Fuzz(func(t *testing.T, line string, need uint8) {
		if line == "" || strings.ContainsAny(line, "\r\n") {
			return // a line ends there; encoding/csv skips empty ones
		}
		r := csv.NewReader(strings.NewReader(line))
		want, wantErr := r.Read()
		c := cells{delimiter: ',', need: math.MaxInt}
		fault, ok := c.split([]byte(line))
		if ok != (wantErr == nil) {
			t.Fatalf("%q: got %v, %s; want %v", line, ok, fault.text([]byte(line)), wantErr)
		}
		if !ok {
			if fault.column < 1 || line[fault.at] != '"' {
				t.Fatalf("%q: got %+v", line, fault)
			}
			return
		}
		got := texts(c.list)
		if !slices.Equal(got, want) || c.width != len(want) {
			t.Fatalf("%q: got %q, width %d; want %q", line, got, c.width, want)
		}
		c.need = int(need)
		if _, ok := c.split([]byte(line)); !ok || c.width != len(want) || !slices.Equal(texts(c.list), want[:min(len(want), int(need))]) {
			t.Fatalf("%q: the first %d cells are %q, width %d; want %q", line, need, texts(c.list), c.width, want)
		}
		if _, err := r.Read(); err != io.EOF {
			t.Fatalf("%q: encoding/csv has more: %v", line, err)
		}
	})
}

func texts(list [][]byte) []string {
	var got []string
	for _, cell := range list {
		got = append(got, string(cell))
	}
	return got
}

func TestSplitAtBlanks(t *testing.T) {
	tests := []struct {
		name, line string
		want       []string
	}{
		{"runs", "a  b \t c", []string{"a", "b", "c"}},
		{"blanks at the ends", "  a b  ", []string{"a", "b"}},
		{"quoted", `"a b" "c ""d" e`, []string{"a b", `c "d`, "e"}},
		{"quoted and empty", `"" a`, []string{"", "a"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			c := cells{delimiter: ' ', blanks: true, need: math.MaxInt}
			if _, ok := c.split([]byte(tt.line)); !ok || !slices.Equal(texts(c.list), tt.want) || c.width != len(tt.want) {
				t.Errorf("got %q, width %d, want %q", texts(c.list), c.width, tt.want)
			}
		})
	}
}

func TestSplitByWidths(t *testing.T) {
	tests := []struct {
		name, line string
		want       []string
	}{
		{"as wide as said", "abcdefg", []string{"ab", "cde", "fg"}},
		{"longer", "abcdefghi", []string{"ab", "cde", "fghi"}},
		{"shorter", "abcd", []string{"ab", "cd", ""}},
		{"empty", "", []string{"", "", ""}},
		{"two bytes a letter", "äbcéefü", []string{"äb", "cée", "fü"}},
		{"quotes and delimiters", `",""` + "\t;", []string{`",`, "\"\"\t", ";"}},
		{"no UTF-8", "a\xb0cde\xff", []string{"a\xb0", "cde", "\xff"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			c := cells{widths: []int{2, 3, 2}, need: math.MaxInt}
			if _, ok := c.split([]byte(tt.line)); !ok || !slices.Equal(texts(c.list), tt.want) || c.width != 3 {
				t.Errorf("got %q, width %d, want %q", texts(c.list), c.width, tt.want)
			}
			c.need = 2
			if _, ok := c.split([]byte(tt.line)); !ok || !slices.Equal(texts(c.list), tt.want[:2]) || c.width != 3 {
				t.Errorf("the first two: got %q, width %d", texts(c.list), c.width)
			}
		})
	}
}
