package csvfeed_test

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

func TestDecodeHolds(t *testing.T) {
	const nothing = "lines 0 = 0 header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside\n*csvfeed.HoldError: "
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		source string
		text   string
		want   string
	}{
		{name: "empty file", text: "", want: nothing + "the file ends after 0 lines, and the column names are due on line 1"},
		{
			name: "too few lines for the names", layout: func(l *pipeline.Layout) { l.NamesLine = 3 }, text: "a\nb\n",
			want: "lines 2 = 2 header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside\n*csvfeed.HoldError: the file ends after 2 lines, and the column names are due on line 3",
		},
		{
			name: "columns that are not there", text: "id,Date,maxi,flag,min\n",
			want: nothing + `line 1: there is no column "date", the nearest is "Date"; there is no column "max", the nearest is "maxi"; the columns are "id", "Date", "maxi", "flag", "min"`,
		},
		{
			name: "nothing near", text: "id,date,temperature,flag,min\n",
			want: nothing + `line 1: there is no column "max"; the columns are "id", "date", "temperature", "flag", "min"`,
		},
		{
			name: "another delimiter", text: "id;date;max;flag;min\n",
			want: nothing + `line 1: there is no column "date"; there is no column "id"; there is no column "max"; there is no column "flag"; there is no column "min"; the columns are "id;date;max;flag;min"`,
		},
		{
			name: "mapped name twice", text: "id,date,max,flag,max,min\n",
			want: nothing + `line 1: columns 3 and 5 are both named "max"; give the number of the right one`,
		},
		{
			name: "name twice that is not mapped", text: "id,date,max,flag,x,x,min\n",
			want: "lines 1 = 1 header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside",
		},
		{
			name: "number past the names", layout: func(l *pipeline.Layout) { l.Values[0].Column = "7" }, text: names,
			want: nothing + `line 1: there is no column 7; the last is 5`,
		},
		{
			name: "one column by name and by number", layout: func(l *pipeline.Layout) { l.Values[0].Column = "5" }, text: names,
			want: nothing + `line 1: columns "5" and "min" of the layout are one`,
		},
		{
			name: "stray quote in the names", text: "id,date,\"max,flag,min\n",
			want: nothing + `line 1: the column names cannot be read: the quote at character 9, in column 3, is not closed on its line; a quote inside a quoted cell is written twice`,
		},
		{
			name: "names too long", text: strings.Repeat("id,", csvfeed.MaxLine/3+1) + "\n",
			want: nothing + `line 1: the column names cannot be read: the line is longer than 1048576 bytes, the most that a line may have`,
		},
		{
			name: "many columns", text: strings.Repeat("x,", 50) + "x\n", layout: func(l *pipeline.Layout) {
				l.Time.Columns, l.Station.Column, l.Values = []string{"1"}, "1", l.Values[1:]
			},
			want: nothing + `line 1: there is no column "min"; the columns are ` + strings.Repeat(`"x", `, 39) + `"x" and 11 more`,
		},
		{
			name: "file name", layout: func(l *pipeline.Layout) { l.Station.Column, l.Station.FileName = "", `^log_(\w+)\.csv$` }, source: "in/other.csv", text: names,
			want: nothing + `the file name "other.csv" does not say its station: it does not fit "^log_(\\w+)\\.csv$"`,
		},
		{
			name: "over the share", layout: func(l *pipeline.Layout) { l.MaxSetAside = 0.2 }, text: names + "N1,2031-07-20,,,1\nN1,20.07.2031,,,1\n",
			want: `1 north air_temp_min 2031-07-20T15:00:00 1 not_checked
				! line 3 row 2 column 0 "" bad_time: column 2 "date": "20.07.2031" is no time of the form YYYY-MM-DD: found '.' at character 3 where YYYY (4 digits) is right
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 1 read, 0 without value, 1 set aside; cells 1 read, 1 missing, 2 set aside
				*csvfeed.HoldError: 1 of 2 rows (50 %) could not be read, the feed allows 20 %; first: line 3: column 2 "date": "20.07.2031" is no time of the form YYYY-MM-DD: found '.' at character 3 where YYYY (4 digits) is right`,
		},
		{
			name: "over the share by cells", layout: func(l *pipeline.Layout) { l.MaxSetAside = 0 }, text: names + "N1,2031-07-20,x,,1\nN1,2031-07-21,y,,z\n",
			want: `! line 2 row 1 column 3 "max" bad_number: "x" is no number such as -12.5: found 'x' at character 1; a text that stands for no value is declared as missing
				1 north air_temp_min 2031-07-20T15:00:00 1 not_checked
				! line 3 row 2 column 3 "max" bad_number: "y" is no number such as -12.5: found 'y' at character 1; a text that stands for no value is declared as missing
				! line 3 row 2 column 5 "min" bad_number: "z" is no number such as -12.5: found 'z' at character 1; a text that stands for no value is declared as missing
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 1 read, 0 without value, 1 set aside; cells 1 read, 0 missing, 3 set aside
				*csvfeed.HoldError: 1 of 2 rows (50 %) could not be read, the feed allows 0 %; first: line 3: column 3 "max": "y" is no number such as -12.5: found 'y' at character 1; a text that stands for no value is declared as missing`,
		},
		{
			name: "at the share", layout: func(l *pipeline.Layout) { l.MaxSetAside = 0.5 }, text: names + "N1,2031-07-20,,,1\nN1,2031-07-21,,,y\n",
			want: `1 north air_temp_min 2031-07-20T15:00:00 1 not_checked
				! line 3 row 2 column 5 "min" bad_number: "y" is no number such as -12.5: found 'y' at character 1; a text that stands for no value is declared as missing
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 1 read, 0 without value, 1 set aside; cells 1 read, 2 missing, 1 set aside`,
		},
		{
			name: "rows without value are not set aside", layout: func(l *pipeline.Layout) { l.MaxSetAside = 0 }, text: names + "N1,2031-07-20,,,\n",
			want: "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 1 without value, 0 set aside; cells 0 read, 2 missing, 0 set aside",
		},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := daily()
			if tt.layout != nil {
				tt.layout(l)
			}
			diff(t, decode(t, l, tt.source, strings.NewReader(tt.text)), tt.want)
		})
	}
}

func TestHoldErrorNamesLineAndColumn(t *testing.T) {
	plan, err := csvfeed.Compile(daily())
	if err != nil {
		t.Fatal(err)
	}
	_, err = plan.Decode(t.Context(), strings.NewReader("id,date,maxi,flag,mini\n"), "", &written{})
	hold, ok := errors.AsType[*csvfeed.HoldError](fmt.Errorf("read: %w", err))
	if !ok || hold.Line != 1 || hold.Column != "max" {
		t.Errorf("got %+v, want line 1, column max", hold)
	}
}

func TestShareInWords(t *testing.T) {
	tests := []struct {
		rows, bad int
		share     float64
		want      string
	}{
		{500, 412, 0.2, "412 of 500 rows (82 %) could not be read, the feed allows 20 %; "},
		{3000, 7, 0.001, "7 of 3000 rows (0.23 %) could not be read, the feed allows 0.1 %; "},
		{3, 3, 0.125, "3 of 3 rows (100 %) could not be read, the feed allows 12.5 %; "},
	}
	for _, tt := range tests {
		t.Run(tt.want, func(t *testing.T) {
			l := daily()
			l.MaxSetAside = tt.share
			got := decode(t, l, "", strings.NewReader(names+strings.Repeat("x\n", tt.bad)+strings.Repeat("N1,2031-07-20,1,,\n", tt.rows-tt.bad)))
			if want := tt.want + "first: line 2: has 1 of 5 columns\n"; !strings.HasSuffix(got, want) {
				t.Errorf("got %s\nwant %s", got[max(0, len(got)-200):], want)
			}
		})
	}
}

// TestEmptyFileWithoutNames: where no names are due, no rows are no fault.
func TestEmptyFileWithoutNames(t *testing.T) {
	l := hourly()
	l.NamesLine, l.Time.Columns, l.Values[0].Column, l.MaxSetAside = 0, []string{"1"}, "2", 0
	diff(t, decode(t, l, "", strings.NewReader("")), "lines 0 = 0 header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside")
}

// stopper is a Sink that fails at the nth thing it is given.
type stopper struct{ n int }

var errFull = errors.New("full")

func (s *stopper) Reading(string, int, pipeline.Reading) error {
	return s.SetAside(pipeline.SetAside{})
}
func (s *stopper) SetAside(pipeline.SetAside) error {
	if s.n--; s.n < 0 {
		return errFull
	}
	return nil
}

type brokenReader struct{}

var errCut = errors.New("cut")

func (brokenReader) Read([]byte) (int, error) { return 0, errCut }

type idleReader struct{}

func (idleReader) Read([]byte) (int, error) { return 0, nil }

func TestDecodePassesErrorsOn(t *testing.T) {
	plan, err := csvfeed.Compile(daily())
	if err != nil {
		t.Fatal(err)
	}
	const text = names + "N1,2031-07-20,1,,x\nbad\n"
	for n := range 3 {
		c, err := plan.Decode(t.Context(), strings.NewReader(text), "", &stopper{n})
		if !errors.Is(err, errFull) || c.Check() != nil || c.Lines != int64(1+n/2) {
			t.Errorf("place %d: got %+v, %v, %v", n, c, c.Check(), err)
		}
	}
	for _, r := range []struct {
		tail io.Reader
		want error
	}{{brokenReader{}, errCut}, {idleReader{}, io.ErrNoProgress}} {
		c, err := plan.Decode(t.Context(), io.MultiReader(strings.NewReader(text+"N1,20"), r.tail), "", &stopper{9})
		if !errors.Is(err, r.want) || err.Error() != "read line 4: "+r.want.Error() || c.Check() != nil || c.Lines != 3 {
			t.Errorf("got %+v, %v; want %v", c, err, r.want)
		}
	}
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := plan.Decode(ctx, strings.NewReader(text), "", &stopper{9}); !errors.Is(err, context.Canceled) {
		t.Errorf("got %v, want %v", err, context.Canceled)
	}
}
