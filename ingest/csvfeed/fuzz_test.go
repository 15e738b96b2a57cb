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

// FuzzDecode: for any bytes the sums hold, the sink has been given what they
// say, and it makes no difference in which pieces the bytes arrive.
func FuzzDecode(f *testing.F) {
	for _, s := range []string{
		"", "time,temp\n2031-07-20 13:00,5\n", "\ufefftime,temp\r\n\"2031-07-20 13:00\",\"5\"\r\n2031-07-20 14:00,x\r\n#\r\n\r\n",
		"203107201300 1.5 32 M north\n203107201400\t1.5  -99 \"\" north\n203107201500 1 1e2 E south\n", "time,temp\n\"2031-07-20 13:00,5\n2031-07-20 14:00,5\n",
		"time,temp\rx\x00,\xff\r1,2,3\r", "203107201300,1.5,70,,north\n,,,,\n203107201300,1.5,9e9,M,north\n", "time,temp,time\n",
	} {
		f.Add([]byte(s))
	}
	plans := []*Plan{planForFuzz(f, ","), planForFuzz(f, "space"), planForFuzz(f, ";"), planForFuzz(f, "\t")}
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
			if s.readings != c.CellsRead || s.rows*int64(len(p.values))+s.cells != c.CellsSetAside {
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
