package csvfeed_test

import (
	"strings"
	"testing"
	"testing/iotest"

	"thawledger/pipeline"
)

const names = "id,date,max,flag,min\n"

func TestDecodeRows(t *testing.T) {
	tests := []struct {
		name string
		text string
		want string
	}{
		{
			name: "days, marks, map of the stations",
			text: names + "N1,2031-07-20,12.5,,3\nsouth,2031-07-20,9,E,-0.5\n",
			want: `1 north air_temp_max 2031-07-20T15:00:00 12.5 good
				1 north air_temp_min 2031-07-20T15:00:00 3 not_checked
				2 south air_temp_max 2031-07-20T00:00:00 9 estimated
				2 south air_temp_min 2031-07-20T00:00:00 -0.5 not_checked
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 2 read, 0 without value, 0 set aside; cells 4 read, 0 missing, 0 set aside`,
		},
		{
			name: "byte order mark, CRLF, CR, LF, no end of the last line",
			text: "\ufeff\"id\",date,max,flag,min\r\nN1,2031-07-20,1,,\rN1,2031-07-21,2,,\n\nN1,2031-07-22,3,,",
			want: `1 north air_temp_max 2031-07-20T15:00:00 1 good
				2 north air_temp_max 2031-07-21T15:00:00 2 good
				3 north air_temp_max 2031-07-22T15:00:00 3 good
				lines 5 = 1 header + 1 blank + 0 comments + 3 rows; rows 3 read, 0 without value, 0 set aside; cells 3 read, 3 missing, 0 set aside`,
		},
		{
			name: "blank and comment lines",
			text: names + "# by hand\n \t \nN1,2031-07-20,1,,\n#N1,2031-07-21,1,,\n\n",
			want: `1 north air_temp_max 2031-07-20T15:00:00 1 good
				lines 6 = 1 header + 2 blank + 2 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 1 read, 1 missing, 0 set aside`,
		},
		{
			name: "blanks around cells",
			text: " id , date,max , flag,min\n N1 , 2031-07-20 ,\t1 , E , 2\n",
			want: `1 north air_temp_max 2031-07-20T15:00:00 1 estimated
				1 north air_temp_min 2031-07-20T15:00:00 2 not_checked
				lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 2 read, 0 missing, 0 set aside`,
		},
		{
			name: "without value: empty, missing text, flag of missing",
			text: names + "N1,2031-07-20,,,\nN1,2031-07-21,-9999,,\nN1,2031-07-22,NaN,,\nN1,2031-07-23,12.5,M,\nN1,2031-07-24,,X,\n",
			want: `lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 0 read, 5 without value, 0 set aside; cells 0 read, 10 missing, 0 set aside`,
		},
		{
			name: "missing text is compared as text",
			text: names + "N1,2031-07-20,-9999.0,,\n",
			want: `! line 2 row 1 column 3 "max" out_of_bounds: -9999 degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value
				lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 1 missing, 1 set aside`,
		},
		{
			name: "a bad cell leaves the others",
			text: names + "N1,2031-07-20,1O,,2\nN1,2031-07-21,150,,3\nN1,2031-07-22,1,Q,4\nN1,2031-07-23,abc,,x\n",
			want: `! line 2 row 1 column 3 "max" bad_number: "1O" is no number such as -12.5: found 'O' at character 2
				1 north air_temp_min 2031-07-20T15:00:00 2 not_checked
				! line 3 row 2 column 3 "max" out_of_bounds: 150 degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value
				2 north air_temp_min 2031-07-21T15:00:00 3 not_checked
				! line 4 row 3 column 3 "max" unknown_flag: flag "Q" in column 4 "flag" has no mark; those that have are "E", "M"
				3 north air_temp_min 2031-07-22T15:00:00 4 not_checked
				! line 5 row 4 column 3 "max" bad_number: "abc" is no number such as -12.5: found 'a' at character 1; a text that stands for no value is declared as missing
				! line 5 row 4 column 5 "min" bad_number: "x" is no number such as -12.5: found 'x' at character 1; a text that stands for no value is declared as missing
				lines 5 = 1 header + 0 blank + 0 comments + 4 rows; rows 3 read, 0 without value, 1 set aside; cells 3 read, 0 missing, 5 set aside`,
		},
		{
			name: "rows set aside whole",
			text: names + "N1,2031-07-20\nN1,2031-07-20,1,,2,\nN1,2031-02-29,1,,2\nN2,2031-07-20,1,,2\n,2031-07-20,1,,2\nN1,2031-07-20,\x00,,2\nN1,2031-07-20,\xb0,,2\nN1,2031-07-20,1,,2\n",
			want: `! line 2 row 1 column 0 "" wrong_width: has 2 of 5 columns
				! line 3 row 2 column 0 "" wrong_width: has 6 of 5 columns
				! line 4 row 3 column 0 "" bad_time: column 2 "date": "2031-02-29" is no time of the form YYYY-MM-DD: day 29 is not 1 to 28, the days of 2031-02
				! line 5 row 4 column 0 "" unknown_station: station "N2" in column 1 "id" is not among the feed's: "N1", "north", "south"
				! line 6 row 5 column 0 "" unknown_station: there is no station in column 1 "id"
				! line 7 row 6 column 0 "" bad_text: there is a NUL at byte 15; UTF-8 text is right
				! line 8 row 7 column 0 "" bad_text: the byte 0xb0 at byte 15 is no UTF-8 text; save the file as UTF-8
				8 north air_temp_max 2031-07-20T15:00:00 1 good
				8 north air_temp_min 2031-07-20T15:00:00 2 not_checked
				lines 9 = 1 header + 0 blank + 0 comments + 8 rows; rows 1 read, 0 without value, 7 set aside; cells 2 read, 0 missing, 14 set aside`,
		},
		{
			name: "a stray quote spoils its own line only",
			text: names + "N1,2031-07-20,\"1,,2\nN1,2031-07-21,1,,2\nN1,2031-07-22,1\"2,,2\nN1,2031-07-23,\"1\"2,,2\nN1,2031-07-24,1,,\"2\"\n",
			want: `! line 2 row 1 column 0 "" bad_quote: the quote at character 15, in column 3, is not closed on its line; a quote inside a quoted cell is written twice
				2 north air_temp_max 2031-07-21T15:00:00 1 good
				2 north air_temp_min 2031-07-21T15:00:00 2 not_checked
				! line 4 row 3 column 0 "" bad_quote: the quote at character 16, in column 3, stands inside a cell that does not begin with one; such a cell is quoted whole and its quotes written twice
				! line 5 row 4 column 0 "" bad_quote: the quote at character 17, in column 3, closes its cell, but more text follows; a quote inside a quoted cell is written twice
				5 north air_temp_max 2031-07-24T15:00:00 1 good
				5 north air_temp_min 2031-07-24T15:00:00 2 not_checked
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 2 read, 0 without value, 3 set aside; cells 4 read, 0 missing, 6 set aside`,
		},
		{
			name: "names only",
			text: names,
			want: `lines 1 = 1 header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside`,
		},
		{
			name: "order of the columns is the file's",
			text: "min,max,other,\"flag\",date,id\n2,1,\"a,\"\"b\",E,2031-07-20,N1\n",
			want: `1 north air_temp_max 2031-07-20T15:00:00 1 estimated
				1 north air_temp_min 2031-07-20T15:00:00 2 not_checked
				lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 2 read, 0 missing, 0 set aside`,
		},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			diff(t, decode(t, daily(), "in/a.csv", strings.NewReader(tt.text)), tt.want)
			diff(t, decode(t, daily(), "in/a.csv", iotest.OneByteReader(strings.NewReader(tt.text))), tt.want)
		})
	}
}

func TestDecodeLayouts(t *testing.T) {
	const ok = "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 1 read, 0 missing, 0 set aside"
	const bare = "lines 1 = 0 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 1 read, 0 missing, 0 set aside"
	const aside = "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 0 missing, 1 set aside"
	mean := func(l *pipeline.Layout, covers pipeline.Covers, spanS int32) {
		l.Time.Covers, l.Time.SpanS, l.Values[0].Variable = covers, spanS, "air_temp_mean"
	}
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		source string
		text   string
		want   string
	}{
		{name: "station's standard time", layout: func(*pipeline.Layout) {}, text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "24:00", layout: func(*pipeline.Layout) {}, text: "time,temp\n2031-07-20 24:00,5\n", want: "1 north air_temp 2031-07-21T09:00:00 5 not_checked\n" + ok},
		{name: "fixed offset", layout: func(l *pipeline.Layout) { l.Time.Zone = "+03:00" }, text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T10:00:00 5 not_checked\n" + ok},
		{name: "UTC", layout: func(l *pipeline.Layout) { l.Time.Zone = "Z" }, text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T13:00:00 5 not_checked\n" + ok},
		{name: "hour that ends", layout: func(l *pipeline.Layout) { l.Time.Zone = "Z"; mean(l, pipeline.CoversEnding, 3600) }, text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp_mean 2031-07-20T12:00:00 5 not_checked\n" + ok},
		{name: "hour that begins", layout: func(l *pipeline.Layout) { l.Time.Zone = "Z"; mean(l, pipeline.CoversBeginning, 3600) }, text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp_mean 2031-07-20T13:00:00 5 not_checked\n" + ok},
		{name: "day with midnight", layout: func(l *pipeline.Layout) { mean(l, pipeline.CoversDay, 86400) }, text: "time,temp\n2031-07-20 00:00,5\n", want: "1 north air_temp_mean 2031-07-20T15:00:00 5 not_checked\n" + ok},
		{
			name: "day with a time of the day", layout: func(l *pipeline.Layout) { mean(l, pipeline.CoversDay, 86400) }, text: "time,temp\n2031-07-20 12:00,5\n",
			want: "! line 2 row 1 column 0 \"\" bad_time: column 1 \"time\": \"2031-07-20 12:00\" has a time of the day, and the row covers a day; 00:00 is right\n" + aside,
		},
		{
			name: "day with 24:00", layout: func(l *pipeline.Layout) { mean(l, pipeline.CoversDay, 86400) }, text: "time,temp\n2031-07-20 24:00,5\n",
			want: "! line 2 row 1 column 0 \"\" bad_time: column 1 \"time\": \"2031-07-20 24:00\" has a time of the day, and the row covers a day; 00:00 is right\n" + aside,
		},
		{name: "time in two columns", layout: func(l *pipeline.Layout) { l.Time.Columns = []string{"date", "hour"} }, text: "hour,temp,date\n13:00,5,2031-07-20\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{
			name: "bad time in two columns", layout: func(l *pipeline.Layout) { l.Time.Columns = []string{"date", "hour"} }, text: "hour,temp,date\n1300,5,2031-07-20\n",
			want: "! line 2 row 1 column 0 \"\" bad_time: column 3 \"date\", column 1 \"hour\": \"2031-07-20 1300\" is no time of the form YYYY-MM-DD hh:mm: found '0' at character 14 where ':' is right\n" + aside,
		},
		{name: "fahrenheit", layout: func(l *pipeline.Layout) { l.Values[0].Unit = pipeline.DegF }, text: "time,temp\n2031-07-20 13:00,41\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "tab", layout: func(l *pipeline.Layout) { l.Delimiter = "\t" }, text: "time\ttemp\tnote\n2031-07-20 13:00\t5\t\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "semicolon", layout: func(l *pipeline.Layout) { l.Delimiter = ";" }, text: "time;temp\n2031-07-20 13:00;5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "blanks", layout: func(l *pipeline.Layout) { l.Delimiter, l.Time.Columns = "space", []string{"date", "hour"} }, text: " date  hour\ttemp\n  2031-07-20   13:00 \"5\"  \n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "numbers for names", layout: func(l *pipeline.Layout) {
			l.NamesLine, l.Time.Columns, l.Values[0].Column = 0, []string{"1"}, "3"
		}, text: "2031-07-20 13:00,x,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + bare},
		{name: "numbers beside names", layout: func(l *pipeline.Layout) { l.Values[0].Column = "2" }, text: "time,x\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "a name that is a number", layout: func(l *pipeline.Layout) { l.Values[0].Column = "2" }, text: "time,1,2\n2031-07-20 13:00,6,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{name: "names that are no UTF-8", layout: func(l *pipeline.Layout) { l.Values[0].Column = "2" }, text: "time,temp (\xb0C)\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{
			name: "width of the first row that has all", layout: func(l *pipeline.Layout) { l.NamesLine, l.Time.Columns, l.Values[0].Column = 0, []string{"1"}, "2" },
			text: "total\n2031-07-20 13:00,5,a\n2031-07-20 14:00,6\n",
			want: `! line 1 row 1 column 0 "" wrong_width: has 1 columns, the layout reads column 2
				2 north air_temp 2031-07-20T22:00:00 5 not_checked
				! line 3 row 3 column 0 "" wrong_width: has 2 of 3 columns
				lines 3 = 0 header + 0 blank + 0 comments + 3 rows; rows 1 read, 0 without value, 2 set aside; cells 1 read, 0 missing, 2 set aside`,
		},
		{
			name: "names further down", layout: func(l *pipeline.Layout) { l.NamesLine, l.Comment = 4, "#" }, text: "Station North\n\n# invented\ntime,temp\n2031-07-20 13:00,5\n",
			want: `1 north air_temp 2031-07-20T22:00:00 5 not_checked
				lines 5 = 4 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 1 read, 0 missing, 0 set aside`,
		},
		{name: "station from the file's name", layout: func(l *pipeline.Layout) {
			l.Station.Constant, l.Station.FileName, l.Station.Map = "", `^log_(\w+)_\d+\.csv$`, map[string]string{"N1": "north"}
		}, source: "2031/log_N1_07.csv", text: "time,temp\n2031-07-20 13:00,5\n", want: "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{
			name: "unknown station from the file's name", layout: func(l *pipeline.Layout) { l.Station.Constant, l.Station.FileName = "", `^log_(\w+)\.csv$` }, source: "log_S1.csv", text: "time,temp\n2031-07-20 13:00,5\n",
			want: "! line 2 row 1 column 0 \"\" unknown_station: station \"S1\" of the file is not among the feed's: \"north\"\n" + aside,
		},
		{
			name: "station that is mapped to one that is not there", layout: func(l *pipeline.Layout) { l.Station.Map = map[string]string{"north": "gone"} }, text: "time,temp\n2031-07-20 13:00,5\n",
			want: "! line 2 row 1 column 0 \"\" unknown_station: station \"north\" of the file, which is \"gone\" here, is not among the feed's, which has none\n" + aside,
		},
		{
			name: "stations that change places", layout: func(l *pipeline.Layout) {
				l.Station = pipeline.StationColumn{Column: "id", Map: map[string]string{"north": "south", "south": "north"}, Clocks: map[string]pipeline.StationClock{"north": north, "south": {}}}
			}, text: "id,time,temp\nnorth,2031-07-20 13:00,5\nsouth,2031-07-20 13:00,6\n",
			want: `1 south air_temp 2031-07-20T13:00:00 5 not_checked
				2 north air_temp 2031-07-20T22:00:00 6 not_checked
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 2 read, 0 without value, 0 set aside; cells 2 read, 0 missing, 0 set aside`,
		},
		{
			name: "no flag has a mark", layout: func(l *pipeline.Layout) { l.Values[0].Flag = &pipeline.FlagColumn{Column: "flag"} }, text: "time,temp,flag\n2031-07-20 13:00,5,x\n",
			want: "! line 2 row 1 column 2 \"temp\" unknown_flag: flag \"x\" in column 3 \"flag\" has no mark; no flag has one\n" + aside,
		},
		{
			name: "an empty flag may say missing", layout: func(l *pipeline.Layout) {
				l.Values[0].Flag = &pipeline.FlagColumn{Column: "flag", Empty: pipeline.QualityMissing, Marks: map[string]pipeline.Quality{"1": pipeline.QualityGood}}
			}, text: "time,temp,flag\n2031-07-20 13:00,5,\n2031-07-20 14:00,5,1\n",
			want: `2 north air_temp 2031-07-20T23:00:00 5 good
				lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 1 read, 1 without value, 0 set aside; cells 1 read, 1 missing, 0 set aside`,
		},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			tt.layout(l)
			diff(t, decode(t, l, tt.source, strings.NewReader(tt.text)), tt.want)
		})
	}
}
