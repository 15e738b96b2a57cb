package normal_test

import (
	"strconv"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/ingest/normal"
)

func TestParseTimeFields(t *testing.T) {
	tests := []struct {
		name, format, text string
		want               string // RFC 3339 as if UTC
		err                string
	}{
		{name: "right-justified minutes", format: "YYYY DDD hmm", text: "2031 201 30", want: "2031-07-20T00:30:00Z"},
		{name: "minute of one digit", format: "YYYY DDD hmm", text: "2031 201 5", want: "2031-07-20T00:05:00Z"},
		{name: "midnight of one digit", format: "YYYY DDD hmm", text: "2031 201 0", want: "2031-07-20T00:00:00Z"},
		{name: "hour of one digit", format: "YYYY DDD hmm", text: "2031 201 930", want: "2031-07-20T09:30:00Z"},
		{name: "hours and minutes", format: "YYYY DDD hmm", text: "2031 201 0930", want: "2031-07-20T09:30:00Z"},
		{name: "end of the year", format: "YYYY DDD hmm", text: "2031 365 2400", want: "2032-01-01T00:00:00Z"},
		{name: "past the end of the day", format: "YYYY DDD hmm", text: "2031 201 2401", err: `"2031 201 2401" is no time of the form YYYY DDD hmm: hour 24 has no time after 24:00`},
		{name: "minute 60", format: "YYYY DDD hmm", text: "2031 201 60", err: `"2031 201 60" is no time of the form YYYY DDD hmm: minute 60 is not 0 to 59`},
		{name: "hour of five digits", format: "YYYY DDD hmm", text: "2031 201 12000", err: `"2031 201 12000" is no time of the form YYYY DDD hmm: found '0' at character 14 where the end is right`},
		{name: "no hour", format: "YYYY DDD hmm", text: "2031 201 ", err: `"2031 201 " is no time of the form YYYY DDD hmm: it ends where hmm (1 to 4 digits) is right`},

		{name: "name of the month", format: "DD-MMM-YYYY", text: "20-Jul-2031", want: "2031-07-20T00:00:00Z"},
		{name: "month in capitals", format: "DMMMYY", text: "1DEC31", want: "2031-12-01T00:00:00Z"},
		{name: "month in small letters", format: "MMM D, YYYY", text: "may 5, 2031", want: "2031-05-05T00:00:00Z"},
		{name: "month of another language", format: "DD-MMM-YYYY", text: "20-Okt-2031", err: `"20-Okt-2031" is no time of the form DD-MMM-YYYY: found 'O' at character 4 where MMM (Jan to Dec) is right`},
		{name: "month cut", format: "YYYY D MMM", text: "2031 20 Ju", err: `"2031 20 Ju" is no time of the form YYYY D MMM: found 'J' at character 9 where MMM (Jan to Dec) is right`},
		{name: "month written out", format: "DD MMM YYYY", text: "20 July 2031", err: `"20 July 2031" is no time of the form DD MMM YYYY: found 'y' at character 7 where ' ' is right`},
		{name: "day of a named month", format: "DD MMM YYYY", text: "31 Apr 2031", err: `"31 Apr 2031" is no time of the form DD MMM YYYY: day 31 is not 1 to 30, the days of 2031-04`},

		{name: "morning", format: "M/D/YYYY h:mm AM", text: "7/20/2031 9:05 AM", want: "2031-07-20T09:05:00Z"},
		{name: "afternoon", format: "M/D/YYYY h:mm:ss AM", text: "7/20/2031 1:05:09 pm", want: "2031-07-20T13:05:09Z"},
		{name: "noon", format: "M/D/YYYY hh:mmAM", text: "7/20/2031 12:00PM", want: "2031-07-20T12:00:00Z"},
		{name: "midnight", format: "M/D/YYYY hh:mmAM", text: "7/20/2031 12:00am", want: "2031-07-20T00:00:00Z"},
		{name: "half first", format: "YYYY-MM-DD AM h", text: "2031-07-20 PM 11", want: "2031-07-20T23:00:00Z"},
		{name: "hour 0 beside AM", format: "YYYY-MM-DD hh:mm AM", text: "2031-07-20 00:05 AM", err: `"2031-07-20 00:05 AM" is no time of the form YYYY-MM-DD hh:mm AM: hour 0 is not 1 to 12, the hours beside AM and PM`},
		{name: "hour 13 beside PM", format: "YYYY-MM-DD hh:mm AM", text: "2031-07-20 13:05 PM", err: `"2031-07-20 13:05 PM" is no time of the form YYYY-MM-DD hh:mm AM: hour 13 is not 1 to 12, the hours beside AM and PM`},
		{name: "no half", format: "YYYY-MM-DD h:mm AM", text: "2031-07-20 1:05", err: `"2031-07-20 1:05" is no time of the form YYYY-MM-DD h:mm AM: it ends where ' ' is right`},
		{name: "another half", format: "YYYY-MM-DD h:mm AM", text: "2031-07-20 1:05 xm", err: `"2031-07-20 1:05 xm" is no time of the form YYYY-MM-DD h:mm AM: found 'x' at character 17 where AM or PM is right`},

		{name: "zeros", format: "YYYY-MM-DD hh:mm:ss.f", text: "2031-07-20 13:00:01.000", want: "2031-07-20T13:00:01Z"},
		{name: "no fraction", format: "YYYY-MM-DD hh:mm:ss.fZ", text: "2031-07-20 13:00:01Z", want: "2031-07-20T13:00:01Z"},
		{name: "fraction after a comma", format: "YYYY-MM-DD hh:mm:ss,f", text: "2031-07-20 13:00:01,0", want: "2031-07-20T13:00:01Z"},
		{name: "fraction that is not 0", format: "YYYY-MM-DD hh:mm:ss.f", text: "2031-07-20 13:00:01.250", err: `"2031-07-20 13:00:01.250" is no time of the form YYYY-MM-DD hh:mm:ss.f: the second has a fraction that is not 0, and readings are at whole seconds`},
		{name: "point without a fraction", format: "YYYY-MM-DD hh:mm:ss.f", text: "2031-07-20 13:00:01.", err: `"2031-07-20 13:00:01." is no time of the form YYYY-MM-DD hh:mm:ss.f: found '.' at character 20 where .f (zeros) is right`},

		// 1,234,567,890 s is 2009-02-13T23:31:30Z: from memory; the test against the standard library below goes further.
		{name: "epoch", format: "epoch", text: "1234567890", want: "2009-02-13T23:31:30Z"},
		{name: "before 1970", format: "epoch", text: "-1", want: "1969-12-31T23:59:59Z"},
		{name: "epoch with zeros", format: "epoch", text: "1234567890.000", want: "2009-02-13T23:31:30Z"},
		{name: "milliseconds", format: "epoch_ms", text: "1234567890000", want: "2009-02-13T23:31:30Z"},
		{name: "milliseconds that are no second", format: "epoch_ms", text: "1234567890001", err: `"1234567890001" is no time of the form epoch_ms: the second has a fraction that is not 0, and readings are at whole seconds`},
		{name: "fraction of an epoch", format: "epoch", text: "1.5", err: `"1.5" is no time of the form epoch: the second has a fraction that is not 0, and readings are at whole seconds`},
		{name: "milliseconds as seconds", format: "epoch", text: "1234567890000", err: `"1234567890000" is no time of the form epoch: that is not in the years 1 to 9999`},
		{name: "date for an epoch", format: "epoch", text: "2031-07-20", err: `"2031-07-20" is no time of the form epoch: found '-' at character 5 where a digit is right`},
		{name: "sign only", format: "epoch", text: "-", err: `"-" is no time of the form epoch: it ends where a digit is right`},
		{name: "text after the zeros", format: "epoch", text: "1.0x", err: `"1.0x" is no time of the form epoch: after the point only zeros are right`},
		{name: "empty epoch", format: "epoch", err: "there is no time; epoch is right, such as 1767225600"},
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
			if got := time.Unix(c.UnixS(), 0).UTC().Format(time.RFC3339); err == nil && got != tt.want {
				t.Errorf("got %s, want %s", got, tt.want)
			}
		})
	}
}

func TestCompileTimeRefusesFields(t *testing.T) {
	tests := []struct{ name, format, err string }{
		{"half without hours", "YYYY-MM-DD AM", `format "YYYY-MM-DD AM": AM stands there without hours; add hh`},
		{"minutes twice", "YYYY-MM-DD hmm mm", `format "YYYY-MM-DD hmm mm": the minute is there twice`},
		{"hours twice", "YYYY-MM-DD hh hmm", `format "YYYY-MM-DD hh hmm": the hour is there twice`},
		{"month twice", "YYYY-MM-DD MMM", `format "YYYY-MM-DD MMM": the month is there twice`},
		{"no end of hmm", "YYYY DDD hmmss", `format "YYYY DDD hmmss": nothing tells where hmm ends; write hhmm`},
		{"no end of the fraction", "YYYY DDD hhmmss.f0", `format "YYYY DDD hhmmss.f0": nothing tells where .f ends; it stands before a blank or at the end`},
		{"two letters of a fraction", "YYYY DDD hhmmss.ff", `format "YYYY DDD hhmmss.ff": .ff is no field; fields are YYYY YY MMM MM M D DD DDD hh h hmm mm ss .f AM`},
		{"epoch and more", "epoch Z", `format "epoch Z": there is no year; add YYYY`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if _, err := normal.CompileTime(tt.format); errText(err) != tt.err {
				t.Errorf("error\n got %s\nwant %s", errText(err), tt.err)
			}
		})
	}
}

// TestFieldsAgainstStandardLibrary writes instants as the standard library does
// and reads them back.
func TestFieldsAgainstStandardLibrary(t *testing.T) {
	forms := []struct{ ours, theirs string }{
		{"DDMMMYYYY hh:mm:ss", "02Jan2006 15:04:05"}, {"M/D/YYYY h:mm:ss AM", "1/2/2006 3:04:05 PM"}, {"MMM D, YYYY hh:mm:ssAM", "Jan 2, 2006 03:04:05pm"},
		{"YYYY DDD hhmmss.f", "2006 002 150405.000"}, {"YYYY-MM-DDThh:mm:ss,fZ", "2006-01-02T15:04:05,00Z"},
	}
	var formats []*normal.TimeFormat
	for _, f := range forms {
		c, err := normal.CompileTime(f.ours)
		if err != nil {
			t.Fatal(err)
		}
		formats = append(formats, c)
	}
	seconds, err := normal.CompileTime("epoch")
	if err != nil {
		t.Fatal(err)
	}
	rapid.Check(t, func(t *rapid.T) {
		at := time.Unix(rapid.Int64Range(-62135596800, 253402300799).Draw(t, "s"), 0).UTC()
		for i, f := range forms {
			text := at.Format(f.theirs)
			if c, err := formats[i].Parse([]byte(text)); err != nil || c.UnixS() != at.Unix() {
				t.Fatalf("%s: got %d, %v; want %d", text, c.UnixS(), err, at.Unix())
			}
		}
		c, err := seconds.Parse(strconv.AppendInt(nil, at.Unix(), 10))
		if err != nil || c.UnixS() != at.Unix() || c.SecondS < 0 || c.SecondS >= 86400 {
			t.Fatalf("%d: got %+v, %v", at.Unix(), c, err)
		}
	})
}
