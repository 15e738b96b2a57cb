package normal_test

import (
	"errors"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/ingest/normal"
)

func TestParseTime(t *testing.T) {
	tests := []struct {
		name, format, text string
		want               string // RFC 3339 as if UTC
		second             int32
		err                string
	}{
		{name: "date", format: "YYYY-MM-DD", text: "2031-07-20", want: "2031-07-20T00:00:00Z"},
		{name: "T and Z stand for themselves", format: "YYYY-MM-DDThh:mmZ", text: "2009-06-04T19:00Z", want: "2009-06-04T19:00:00Z", second: 68400},
		{name: "seconds", format: "YYYY-MM-DD hh:mm:ss", text: "2017-05-01 23:59:59", want: "2017-05-01T23:59:59Z", second: 86399},
		{name: "no punctuation", format: "YYYYMMDDhhmm", text: "202001011530", want: "2020-01-01T15:30:00Z", second: 55800},
		{name: "one digit", format: "M/D/YYYY", text: "1/2/1965", want: "1965-01-02T00:00:00Z"},
		{name: "two digits where one may be", format: "M/D/YYYY h:mm", text: "12/31/1965 9:05", want: "1965-12-31T09:05:00Z", second: 32700},
		{name: "day of the year", format: "YYYY DDD", text: "2020 60", want: "2020-02-29T00:00:00Z"},
		{name: "last day of a leap year", format: "DDD YYYY", text: "366 2020", want: "2020-12-31T00:00:00Z"},
		{name: "day of the year before a field", format: "YYYYDDDhhmm", text: "20190321200", want: "2019-02-01T12:00:00Z", second: 43200},
		{name: "leap day", format: "YYYY-MM-DD", text: "2000-02-29", want: "2000-02-29T00:00:00Z"},
		{name: "short year of this century", format: "DD.MM.YY", text: "01.03.68", want: "2068-03-01T00:00:00Z"},
		{name: "short year of the last", format: "DD.MM.YY", text: "01.03.69", want: "1969-03-01T00:00:00Z"},
		{name: "first year", format: "YYYY-MM-DD", text: "0001-01-01", want: "0001-01-01T00:00:00Z"},
		{name: "24:00", format: "YYYY-MM-DD hh:mm", text: "2020-02-28 24:00", want: "2020-02-29T00:00:00Z", second: 86400},
		{name: "24:00:00", format: "YYYY-MM-DD hh:mm:ss", text: "2019-12-31 24:00:00", want: "2020-01-01T00:00:00Z", second: 86400},
		{name: "literal text", format: "YYYY-MM-DD 12 noon", text: "2020-02-28 12 noon", want: "2020-02-28T00:00:00Z"},

		{name: "empty", format: "YYYY-MM-DD", err: "there is no time; YYYY-MM-DD is right"},
		{name: "month 13", format: "YYYY-MM-DD", text: "2024-13-01", err: `"2024-13-01" is no time of the form YYYY-MM-DD: month 13 is not 1 to 12`},
		{name: "month 0", format: "YYYY-MM-DD", text: "2024-00-01", err: `"2024-00-01" is no time of the form YYYY-MM-DD: month 0 is not 1 to 12`},
		{name: "29 February", format: "YYYY-MM-DD", text: "1900-02-29", err: `"1900-02-29" is no time of the form YYYY-MM-DD: day 29 is not 1 to 28, the days of 1900-02`},
		{name: "31 April", format: "YYYY-MM-DD", text: "2024-04-31", err: `"2024-04-31" is no time of the form YYYY-MM-DD: day 31 is not 1 to 30, the days of 2024-04`},
		{name: "day of the year", format: "YYYY DDD", text: "2019 366", err: `"2019 366" is no time of the form YYYY DDD: day of the year 366 is not 1 to 365, the days of 2019`},
		{name: "day 0 of the year", format: "YYYY DDD", text: "2019 0", err: `"2019 0" is no time of the form YYYY DDD: day of the year 0 is not 1 to 365, the days of 2019`},
		{name: "year 0", format: "YYYY-MM-DD", text: "0000-01-01", err: `"0000-01-01" is no time of the form YYYY-MM-DD: year 0 is not 1 to 9999`},
		{name: "hour 25", format: "YYYY-MM-DD hh:mm", text: "2024-01-01 25:00", err: `"2024-01-01 25:00" is no time of the form YYYY-MM-DD hh:mm: hour 25 is not 0 to 23`},
		{name: "after 24:00", format: "YYYY-MM-DD hh:mm", text: "2024-01-01 24:01", err: `"2024-01-01 24:01" is no time of the form YYYY-MM-DD hh:mm: hour 24 has no time after 24:00`},
		{name: "24 without minutes", format: "YYYY-MM-DD h", text: "2024-01-01 24", err: `"2024-01-01 24" is no time of the form YYYY-MM-DD h: hour 24 is not 0 to 23`},
		{name: "minute 60", format: "YYYY-MM-DD hh:mm", text: "2024-01-01 10:60", err: `"2024-01-01 10:60" is no time of the form YYYY-MM-DD hh:mm: minute 60 is not 0 to 59`},
		{name: "leap second", format: "YYYY-MM-DD hh:mm:ss", text: "2016-12-31 23:59:60", err: `"2016-12-31 23:59:60" is no time of the form YYYY-MM-DD hh:mm:ss: second 60 is not 0 to 59`},
		{name: "wrong character", format: "YYYY-MM-DD", text: "2024/01/01", err: `"2024/01/01" is no time of the form YYYY-MM-DD: found '/' at character 5 where '-' is right`},
		{name: "too few digits", format: "YYYY-MM-DD", text: "2024-1-01", err: `"2024-1-01" is no time of the form YYYY-MM-DD: found '-' at character 7 where MM (2 digits) is right`},
		{name: "no digit", format: "YYYY-M-D", text: "2024-x-01", err: `"2024-x-01" is no time of the form YYYY-M-D: found 'x' at character 6 where M (1 to 2 digits) is right`},
		{name: "too short", format: "YYYY-MM-DD", text: "2024-01", err: `"2024-01" is no time of the form YYYY-MM-DD: it ends where '-' is right`},
		{name: "too long", format: "YYYY-MM-DD", text: "2024-01-01 00:00", err: `"2024-01-01 00:00" is no time of the form YYYY-MM-DD: found ' ' at character 11 where the end is right`},
		{name: "names repeated in the file", format: "YYYY-MM-DD", text: "Date/Time", err: `"Date/Time" is no time of the form YYYY-MM-DD: found 'D' at character 1 where YYYY (4 digits) is right`},
		{name: "broken text", format: "YYYY-MM-DD", text: "2024\xb001-01", err: `"2024\xb001-01" is no time of the form YYYY-MM-DD: found '\xb0' at character 5 where '-' is right`},
		{name: "day of the year too short", format: "YYYYDDDhh", text: "201932", err: `"201932" is no time of the form YYYYDDDhh: it ends where DDD (3 digits) is right`},
		{name: "sign", format: "YYYY-MM-DD", text: "-024-01-01", err: `"-024-01-01" is no time of the form YYYY-MM-DD: found '-' at character 1 where YYYY (4 digits) is right`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			f, err := normal.CompileTime(tt.format)
			if err != nil {
				t.Fatal(err)
			}
			c, err := f.Parse([]byte(tt.text))
			if errText(err) != tt.err {
				t.Fatalf("error\n got %s\nwant %s", errText(err), tt.err)
			}
			if err != nil {
				return
			}
			if got := time.Unix(c.UnixS(), 0).UTC().Format(time.RFC3339); got != tt.want || c.SecondS != tt.second {
				t.Errorf("got %s, second %d; want %s, second %d", got, c.SecondS, tt.want, tt.second)
			}
		})
	}
}

func TestCompileTimeRefuses(t *testing.T) {
	const all = "; fields are YYYY YY MMM MM M D DD DDD hh h hmm mm ss .f AM"
	tests := []struct{ name, format, err string }{
		{"empty", "", `format "": there is no year; add YYYY`},
		{"no date", "YYYY hh:mm", `format "YYYY hh:mm": there is no full date; it needs month and day, or the day of the year DDD`},
		{"no day", "YYYY-MM", `format "YYYY-MM": there is no full date; it needs month and day, or the day of the year DDD`},
		{"two kinds of day", "YYYY-MM-DDD", `format "YYYY-MM-DDD": the day of the year DDD stands beside a month or a day; keep one of them`},
		{"minutes alone", "YYYY-MM-DD mm", `format "YYYY-MM-DD mm": there are minutes without hours; add hh`},
		{"seconds alone", "YYYY-MM-DD hh:ss", `format "YYYY-MM-DD hh:ss": there are seconds without minutes; add mm`},
		{"year of three", "YYY-MM-DD", `format "YYY-MM-DD": YYY is no field` + all},
		{"minutes for months", "YYYY-mm-DD", `format "YYYY-mm-DD": there is no full date; it needs month and day, or the day of the year DDD`},
		{"hours of one letter m", "YYYY-MM-DD h:m", `format "YYYY-MM-DD h:m": m is no field` + all},
		{"twice", "YYYY-MM-DD YY", `format "YYYY-MM-DD YY": the year is there twice`},
		{"no end", "YYYYMDD", `format "YYYYMDD": nothing tells where M ends; write MM`},
		{"no end before a digit", "YYYY-M-D0", `format "YYYY-M-D0": nothing tells where D ends; write DD`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := normal.CompileTime(tt.format); errText(err) != tt.err {
				t.Errorf("error\n got %s\nwant %s", errText(err), tt.err)
			}
		})
	}
}

// TestEveryDay compares every date of the first 400 years, after which the
// calendar repeats itself, and of 1900 to 2100 with the standard library.
func TestEveryDay(t *testing.T) {
	f, err := normal.CompileTime("YYYY-MM-DD")
	if err != nil {
		t.Fatal(err)
	}
	g, err := normal.CompileTime("YYYY DDD")
	if err != nil {
		t.Fatal(err)
	}
	for day := time.Date(1, 1, 1, 0, 0, 0, 0, time.UTC); day.Year() <= 2100; day = day.AddDate(0, 0, 1) {
		if day.Year() == 401 {
			day = time.Date(1900, 1, 1, 0, 0, 0, 0, time.UTC)
		}
		a, err1 := f.Parse(day.AppendFormat(nil, time.DateOnly))
		b, err2 := g.Parse(day.AppendFormat(nil, "2006 002"))
		if err1 != nil || err2 != nil || a.UnixS() != day.Unix() || a != b {
			t.Fatalf("%s: got %d (%v) and %d (%v), want %d", day, a.UnixS(), err1, b.UnixS(), err2, day.Unix())
		}
	}
}

// TestTimesAgainstStandardLibrary draws times that may and may not exist.
func TestTimesAgainstStandardLibrary(t *testing.T) {
	f, err := normal.CompileTime("YYYY-MM-DDThh:mm:ssZ")
	if err != nil {
		t.Fatal(err)
	}
	rapid.Check(t, func(t *rapid.T) {
		text := rapid.StringMatching(`[0-9]{3}[1-9]-[01][0-9]-[0-3][0-9]T[0-2][0-9]:[0-6][0-9]:[0-6][0-9]Z`).Draw(t, "text")
		want, wantErr := time.Parse("2006-01-02T15:04:05Z", text)
		got, err := f.Parse([]byte(text))
		if got.SecondS == 86400 {
			return // 24:00:00, which the standard library does not know
		}
		if (err == nil) != (wantErr == nil) || err == nil && got.UnixS() != want.Unix() {
			t.Fatalf("%s: got %d, %v; want %d, %v", text, got.UnixS(), err, want.Unix(), wantErr)
		}
	})
}

func FuzzTime(f *testing.F) {
	for _, s := range [][2]string{
		{"YYYY-MM-DD hh:mm:ss", "2017-05-01 00:05:00"}, {"M/D/YYYY", "2/29/1965"}, {"YYYY DDD", "2002 366"},
		{"YYYYMMDD", "20200101"}, {"YYYY-MM-DDThh:mmZ", "2009-06-04T24:00Z"}, {"DDDYYhhmm", "365690000"}, {"YY°MMDD", "31\xb00101"},
		{"YYYY DDD hmm", "2031 201 30"}, {"DMMMYY h:mm:ss.fAM", "20Jul31 12:00:00.000pm"}, {"epoch_ms", "-1234567890000.0"},
	} {
		f.Add(s[0], []byte(s[1]))
	}
	f.Fuzz(func(t *testing.T, format string, text []byte) {
		tf, err := normal.CompileTime(format)
		if err != nil {
			return
		}
		c, err := tf.Parse(text)
		if err != nil {
			if c != (normal.Civil{}) {
				t.Fatalf("error %v beside %+v", err, c)
			}
			return
		}
		y := time.Unix(c.UnixS(), 0).UTC().Year()
		if y < 1 || y > 10000 || c.SecondS < 0 || c.SecondS > 86400 || !tf.HasHour() && c.SecondS != 0 {
			t.Fatalf("%s %q: got %+v", format, text, c)
		}
	})
}

func TestParseAllocatesNothing(t *testing.T) {
	f, err := normal.CompileTime("YYYY-MM-DD hh:mm")
	if err != nil {
		t.Fatal(err)
	}
	g, err := normal.CompileTime("DMMMYYYY h:mm:ss.f AM")
	if err != nil {
		t.Fatal(err)
	}
	e, err := normal.CompileTime("epoch_ms")
	if err != nil {
		t.Fatal(err)
	}
	text, number := []byte("2031-07-20 13:00"), []byte("-12.5")
	odd, count := []byte("20Jul2031 1:00:00.000 PM"), []byte("1234567890000")
	n := testing.AllocsPerRun(100, func() {
		_, err1 := f.Parse(text)
		_, err4 := g.Parse(odd)
		_, err5 := e.Parse(count)
		v, err2 := normal.ParseNumber(number)
		_, err3 := normal.Celsius(v, "degF")
		if err := errors.Join(err1, err2, err3, err4, err5); err != nil {
			t.Fatal(err)
		}
	})
	if n != 0 {
		t.Errorf("%v allocations for a row, want none", n)
	}
}

func BenchmarkParseTime(b *testing.B) {
	f, err := normal.CompileTime("YYYY-MM-DD hh:mm")
	if err != nil {
		b.Fatal(err)
	}
	text := []byte("2031-07-20 13:00")
	b.ReportAllocs()
	for b.Loop() {
		if _, err := f.Parse(text); err != nil {
			b.Fatal(err)
		}
	}
}

func errText(err error) string {
	if err == nil {
		return ""
	}
	return err.Error()
}
