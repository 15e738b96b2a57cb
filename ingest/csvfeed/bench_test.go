package csvfeed_test

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"io"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

// hours is a generated year of hourly rows, eight columns wide.
func hours() []byte {
	var b bytes.Buffer
	b.WriteString("id,time,temp,flag,humidity,wind,gust,pressure\n")
	at := time.Date(2031, 1, 1, 0, 0, 0, 0, time.UTC)
	for i := range 8760 {
		fmt.Fprintf(&b, "N1,%s,%.1f,,%d,%d,%.1f,%.2f\n", at.Format("2006-01-02 15:04"), float64(i%500)/10-25, i%100, i%360, float64(i%300)/10, 95+float64(i%1000)/100)
		at = at.Add(time.Hour)
	}
	return b.Bytes()
}

func hoursPlan(t testing.TB, change func(*pipeline.Layout)) *csvfeed.Plan {
	t.Helper()
	l := hourly()
	l.Station = pipeline.StationColumn{Column: "id", Map: map[string]string{"N1": "north"}, Clocks: l.Station.Clocks}
	l.Values[0].Flag = &pipeline.FlagColumn{Column: "flag", Marks: map[string]pipeline.Quality{"M": pipeline.QualityMissing}}
	change(l)
	plan, err := csvfeed.Compile(l)
	if err != nil {
		t.Fatal(err)
	}
	return plan
}

// adder is a Sink that adds up.
type adder struct {
	n    int
	sumC float64
	sumS int64
}

func (a *adder) Reading(_ string, _ int, r pipeline.Reading) error {
	a.n++
	a.sumC += r.ValueC
	a.sumS += r.StartS
	return nil
}

func (a *adder) SetAside(pipeline.SetAside) error { return nil }

// bare reads the same file with the standard library and checks nothing.
func bare(text []byte) (*adder, error) {
	a := &adder{}
	r := csv.NewReader(bytes.NewReader(text))
	r.ReuseRecord = true
	if _, err := r.Read(); err != nil {
		return nil, err
	}
	for {
		row, err := r.Read()
		if err == io.EOF {
			return a, nil
		}
		if err != nil {
			return nil, err
		}
		at, err := time.Parse("2006-01-02 15:04", row[1])
		if err != nil {
			return nil, err
		}
		v, err := strconv.ParseFloat(row[2], 64)
		if err != nil {
			return nil, err
		}
		a.n++
		a.sumC += v
		a.sumS += at.Unix() + 9*3600
	}
}

func TestDecodeAgreesWithBareLoop(t *testing.T) {
	text, got := hours(), &adder{}
	if _, err := hoursPlan(t, func(*pipeline.Layout) {}).Decode(t.Context(), bytes.NewReader(text), "", got); err != nil {
		t.Fatal(err)
	}
	want, err := bare(text)
	if err != nil {
		t.Fatal(err)
	}
	if *got != *want || got.n != 8760 {
		t.Errorf("got %+v, want %+v", *got, *want)
	}
}

// TestDecodeAllocatesNothingByTheRow: what is allocated does not grow with rows.
func TestDecodeAllocatesNothingByTheRow(t *testing.T) {
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
	}{
		{"one row, one value", func(*pipeline.Layout) {}},
		{"named zone, scaled", func(l *pipeline.Layout) {
			l.Time.Zone, l.Time.Ambiguous, l.Time.Skipped = "America/Edmonton", pipeline.AmbiguousEarlier, pipeline.SkippedShift
			l.Values[0].Scale, l.Values[0].Offset = 1.5, -1
		}},
		{"values of some rows", func(l *pipeline.Layout) {
			l.Values[0].When = map[string][]string{"humidity": {"50", "51"}}
			l.Values = append(l.Values, l.Values[0])
			l.Values[1].When = map[string][]string{"humidity": {"52"}, "id": {"N1"}}
		}},
		{"widths, not as CSV", func(l *pipeline.Layout) {
			l.Delimiter, l.Widths, l.NamesLine, l.Time.Columns, l.Values[0].Column = "", []int{3, 17, 5, 2}, 0, []string{"2"}, "3"
			l.Station.Column, l.Values[0].Flag.Column = "1", "4"
		}},
	}
	columns := regexp.MustCompile(`(?m)^N1,([^,]*),([^,]*),.*`).ReplaceAllFunc(hours()[bytes.IndexByte(hours(), '\n')+1:], func(line []byte) []byte {
		cells := bytes.Split(line, []byte(","))
		return fmt.Appendf(nil, "N1 %s %5s", cells[1], cells[2])
	})
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			text := hours()
			if strings.HasPrefix(tt.name, "widths") {
				text = columns
			}
			short := text[:bytes.LastIndexByte(text[:len(text)/10], '\n')+1]
			plan := hoursPlan(t, tt.layout)
			allocations := func(text []byte) float64 {
				return testing.AllocsPerRun(5, func() {
					c, err := plan.Decode(t.Context(), bytes.NewReader(text), "", &adder{})
					if err != nil || c.RowsRead == 0 || c.RowsSetAside > 0 {
						t.Fatal(c, err)
					}
				})
			}
			if few, many := allocations(short), allocations(text); many > few {
				t.Errorf("%v allocations for a tenth of the file, %v for all of it", few, many)
			}
		})
	}
}

func BenchmarkDecode(b *testing.B) {
	text, plan := hours(), hoursPlan(b, func(*pipeline.Layout) {})
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := plan.Decode(b.Context(), bytes.NewReader(text), "", &adder{}); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkBareLoop(b *testing.B) {
	text := hours()
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := bare(text); err != nil {
			b.Fatal(err)
		}
	}
}
