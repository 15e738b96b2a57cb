package csvfeed_test

import (
	"encoding/json"
	"strings"
	"testing"
	"testing/iotest"
	_ "time/tzdata"

	"thawledger/pipeline"
)

// TestOldLayoutsKeepTheirText: what a layout can say besides does not show in one
// that does not say it, so that its hash stays.
func TestOldLayoutsKeepTheirText(t *testing.T) {
	const want = `{"name":"invented","delimiter":",","comment":"#","names_line":1,` +
		`"time":{"columns":["date"],"format":"YYYY-MM-DD","zone":"station","covers":"day","span_s":86400},` +
		`"station":{"column":"id","map":{"N1":"north"},"clocks":{"north":{"utc_offset_s":-32400,"day_starts_s":21600},"south":{"utc_offset_s":0,"day_starts_s":0}}},` +
		`"values":[{"column":"max","variable":"air_temp_max","unit":"degC","sensor":"","level_m":2,"missing":["-9999","NaN"],"flag":{"column":"flag","empty":0,"marks":{"E":6,"M":7}}},` +
		`{"column":"min","variable":"air_temp_min","unit":"degC","sensor":"","level_m":2,"missing":null}],"max_set_aside":1}`
	if got, err := json.Marshal(daily()); err != nil || string(got) != want {
		t.Errorf("got %s, %v\nwant %s", got, err, want)
	}
}

// long is a layout of hours in long form: time, variable, unit, value.
func long(l *pipeline.Layout) {
	value := func(sensor string, unit pipeline.TempUnit, when map[string][]string) pipeline.ValueColumn {
		return pipeline.ValueColumn{Column: "value", Variable: "air_temp", Sensor: sensor, Unit: unit, LevelM: 2, When: when}
	}
	l.Values = []pipeline.ValueColumn{
		value("a", pipeline.DegC, map[string][]string{"what": {"TA", "TAIR"}, "unit": {"C"}}),
		value("a", pipeline.DegF, map[string][]string{"what": {"TA", "TAIR"}, "unit": {"F"}}),
		value("b", pipeline.DegC, map[string][]string{"what": {"TB"}}),
	}
}

func TestDecodeForms(t *testing.T) {
	counts := func(lines string) string {
		return lines + "; rows 1 read, 0 without value, 0 set aside; cells 1 read, 0 missing, 0 set aside"
	}
	ok := counts("lines 2 = 1 header + 0 blank + 0 comments + 1 rows")
	aside := "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 0 missing, 1 set aside"
	const five = "1 north air_temp 2031-07-20T22:00:00 5 not_checked\n"
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		text   string
		want   string
	}{
		{"decimal comma", func(l *pipeline.Layout) { l.Delimiter, l.Decimal = ";", "," }, "time;temp\n2031-07-20 13:00;-5,25\n", "1 north air_temp 2031-07-20T22:00:00 -5.25 not_checked\n" + ok},
		{
			"decimal point where a comma is declared", func(l *pipeline.Layout) { l.Delimiter, l.Decimal = ";", "," }, "time;temp\n2031-07-20 13:00;-5.25\n",
			`! line 2 row 1 column 2 "temp" bad_number: "-5.25" is no number such as -12,5: found '.' at character 3; the layout says decimal: ",", and thousands have no mark` + "\n" + aside,
		},
		{
			"decimal comma that is not declared", func(l *pipeline.Layout) { l.Delimiter = ";" }, "time;temp\n2031-07-20 13:00;-5,25\n",
			`! line 2 row 1 column 2 "temp" bad_number: "-5,25" is no number such as -12.5: found ',' at character 3; the decimal mark is a point where the layout does not say decimal: ",", and thousands have none` + "\n" + aside,
		},

		{"other names", func(l *pipeline.Layout) {
			l.Time.Columns, l.Time.Or = []string{"date", "hour"}, [][]string{{"day", "DATE"}}
			l.Station = pipeline.StationColumn{Column: "id", Or: []string{"STN"}, Clocks: l.Station.Clocks}
			l.Values[0].Or, l.Values[0].Flag = []string{"TAVG"}, &pipeline.FlagColumn{Column: "f", Or: []string{"FLAG"}, Marks: map[string]pipeline.Quality{"E": pipeline.QualityEstimated}}
		}, "STN,DATE,hour,TAVG,FLAG\nnorth,2031-07-20,13:00,5,E\n", "1 north air_temp 2031-07-20T22:00:00 5 estimated\n" + ok},

		{"data line", func(l *pipeline.Layout) { l.DataLine = 4 }, "time,temp\nUTC,degC\n-----,-----\n2031-07-20 13:00,5\n", five + counts("lines 4 = 3 header + 0 blank + 0 comments + 1 rows")},
		{"data line without names", func(l *pipeline.Layout) {
			l.NamesLine, l.DataLine, l.Time.Columns, l.Values[0].Column = 0, 3, []string{"1"}, "2"
		}, "anything \"at all\n\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"dashes after names, blanks between", func(l *pipeline.Layout) {
			l.Delimiter, l.DataLine, l.Time.Columns = "space", 3, []string{"date", "hour"}
		}, "date       hour   temp\n---------- -----  ----\n2031-07-20 13:00  5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"units as declared", func(l *pipeline.Layout) { l.UnitsLine, l.Values[0].UnitText = 2, "Deg C" }, "time,temp\nTS,\" Deg C \"\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"units before names", func(l *pipeline.Layout) { l.NamesLine, l.UnitsLine, l.Values[0].UnitText = 2, 1, "°C" }, "\ufeff,°C\ntime,temp\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"units that nobody holds against anything", func(l *pipeline.Layout) { l.UnitsLine = 2 }, "time,temp\nx\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},

		{"preamble", func(l *pipeline.Layout) { l.PreambleEnds, l.DataLine, l.Comment = "^# end", 3, "#" }, "# of FELL\n\n# end of it\ntime,temp\n,degC\n# now\n2031-07-20 13:00,5\n", five + counts("lines 7 = 5 header + 0 blank + 1 comments + 1 rows")},
		{"preamble without names", func(l *pipeline.Layout) {
			l.PreambleEnds, l.NamesLine, l.Time.Columns, l.Values[0].Column = `^DATA$`, 0, []string{"1"}, "2"
		}, "1,2\nDATA\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"preamble that ends at once", func(l *pipeline.Layout) { l.PreambleEnds = "" + "." }, "x\ntime,temp\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"station from the preamble", func(l *pipeline.Layout) {
			l.PreambleEnds, l.Station = `^DATA`, pipeline.StationColumn{Preamble: `^Station: *(\w+)`, Map: map[string]string{"N1": "north"}, Clocks: l.Station.Clocks}
		}, "Station: N1\nStation: N2\nDATA\ntime,temp\n2031-07-20 13:00,5\n", five + counts("lines 5 = 4 header + 0 blank + 0 comments + 1 rows")},
		{"station from a line before the names", func(l *pipeline.Layout) {
			l.NamesLine, l.Station = 2, pipeline.StationColumn{Preamble: `"(\w+)"`, Clocks: l.Station.Clocks}
		}, "LOG,\"north\",logger\ntime,temp\n2031-07-20 13:00,5\n", five + counts("lines 3 = 2 header + 0 blank + 0 comments + 1 rows")},
		{"station from the last line of a preamble", func(l *pipeline.Layout) {
			l.NamesLine, l.Time.Columns, l.Values[0].Column = 0, []string{"1"}, "2"
			l.PreambleEnds, l.Station = `^\w+:$`, pipeline.StationColumn{Preamble: `^(\w+):$`, Clocks: l.Station.Clocks}
		}, "north:\n2031-07-20 13:00,5\n", five + ok},
		{
			"unknown station from the preamble", func(l *pipeline.Layout) {
				l.NamesLine, l.Station = 2, pipeline.StationColumn{Preamble: `^(\w+)`, Clocks: l.Station.Clocks}
			}, "TARN\ntime,temp\n2031-07-20 13:00,5\n",
			`! line 3 row 1 column 0 "" unknown_station: station "TARN" of the file is not among the feed's: "north"
				lines 3 = 2 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 0 missing, 1 set aside`,
		},

		{
			"long form", long,
			"time,what,unit,value\n2031-07-20 13:00,TA,C,5\n2031-07-20 13:00,RH,%,81\n2031-07-20 14:00,TAIR,F,41\n2031-07-20 14:00,TB,?,6\nnever,RH,%,x\n2031-07-20 15:00,TA,K,280\n2031-07-20 13:00,dew point,C,4\n",
			`1 north air_temp 2031-07-20T22:00:00 5 not_checked
				3 north air_temp 2031-07-20T23:00:00 5 not_checked
				4 north air_temp 2031-07-20T23:00:00 6 not_checked
				lines 8 = 1 header + 0 blank + 0 comments + 7 rows; rows 3 read, 4 without value, 0 set aside; cells 3 read, 0 missing, 0 set aside`,
		},
		{
			"long form, what is wrong", func(l *pipeline.Layout) { long(l); l.Values[2].Missing = []string{"-99"} },
			"time,what,unit,value\nnever,TA,C,5\n2031-07-20 13:00,TA,C,x\n2031-07-20 13:00,TB,,-99\nTA\n\"x\n",
			`! line 2 row 1 column 0 "" bad_time: column 1 "time": "never" is no time of the form YYYY-MM-DD hh:mm: found 'n' at character 1 where YYYY (4 digits) is right
				! line 3 row 2 column 4 "value" bad_number: "x" is no number such as -12.5: found 'x' at character 1; a text that stands for no value is declared as missing
				! line 5 row 4 column 0 "" wrong_width: has 1 of 4 columns
				! line 6 row 5 column 0 "" bad_quote: the quote at character 1, in column 1, is not closed on its line; a quote inside a quoted cell is written twice
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 0 read, 1 without value, 4 set aside; cells 0 read, 1 missing, 2 set aside`,
		},
		{
			"of all rows and of some", func(l *pipeline.Layout) {
				l.Values = append(l.Values, pipeline.ValueColumn{Column: "temp2", Variable: "air_temp", Sensor: "b", Unit: pipeline.DegC, When: map[string][]string{"ok": {"", "1"}}})
			}, "time,temp,temp2,ok\n2031-07-20 13:00,5,6,\n2031-07-20 14:00,5,6,0\nx\n",
			`1 north air_temp 2031-07-20T22:00:00 5 not_checked
				1 north air_temp 2031-07-20T22:00:00 6 not_checked
				2 north air_temp 2031-07-20T23:00:00 5 not_checked
				! line 4 row 3 column 0 "" wrong_width: has 1 of 4 columns
				lines 4 = 1 header + 0 blank + 0 comments + 3 rows; rows 2 read, 0 without value, 1 set aside; cells 3 read, 0 missing, 1 set aside`,
		},

		{"epoch", func(l *pipeline.Layout) { l.Time.Format, l.Time.Zone = "epoch", "" }, "time,temp\n1942351200,5\n", five + ok},
		{"milliseconds", func(l *pipeline.Layout) { l.Time.Format, l.Time.Zone = "epoch_ms", "Z" }, "time,temp\n1942351200000,5\n", five + ok},
		{"epoch of an hour that ends", func(l *pipeline.Layout) {
			l.Time.Format, l.Time.Zone, l.Time.Covers, l.Time.SpanS, l.Values[0].Variable = "epoch", "Z", pipeline.CoversEnding, 3600, "air_temp_mean"
		}, "time,temp\n1942354800,5\n", "1 north air_temp_mean 2031-07-20T22:00:00 5 not_checked\n" + ok},
		{"year, day of the year, hours and minutes", func(l *pipeline.Layout) {
			l.Time.Columns, l.Time.Format = []string{"year", "day", "hhmm"}, "YYYY DDD hmm"
		}, "year,day,hhmm,temp\n2031,201,1300,5\n", five + ok},
		{"the end of the day", func(l *pipeline.Layout) {
			l.Time.Columns, l.Time.Format = []string{"year", "day", "hhmm"}, "YYYY DDD hmm"
		}, "year,day,hhmm,temp\n2031,200,2400,5\n", "1 north air_temp 2031-07-20T09:00:00 5 not_checked\n" + ok},

		{
			"widths", func(l *pipeline.Layout) {
				l.Delimiter, l.Widths, l.NamesLine, l.Time.Columns, l.Values[0].Column = "", []int{6, 4, 4, 5, 6, 1}, 0, []string{"2", "3", "4"}, "5"
				l.Station, l.Time.Format = pipeline.StationColumn{Column: "1", Clocks: map[string]pipeline.StationClock{"höhe": {}}}, "YYYY DDD hmm"
				l.Values[0].Flag = &pipeline.FlagColumn{Column: "6", Marks: map[string]pipeline.Quality{"E": pipeline.QualityEstimated}}
			},
			"höhe  2031 201   30 -12.5\nhöhe  2031 201  100  -7\"1E  \n\nhöhe  2031 201  200  -7.1E\nhöhe  2031 201  300\nhöhe  2031 2\n",
			`1 höhe air_temp 2031-07-20T00:30:00 -12.5 good
				! line 2 row 2 column 5 "" bad_number: "-7\"1" is no number such as -12.5: found '"' at character 3
				3 höhe air_temp 2031-07-20T02:00:00 -7.1 estimated
				! line 6 row 5 column 0 "" bad_time: column 2, column 3, column 4: "2031 2 " is no time of the form YYYY DDD hmm: it ends where hmm (1 to 4 digits) is right
				lines 6 = 0 header + 1 blank + 0 comments + 5 rows; rows 2 read, 1 without value, 2 set aside; cells 2 read, 1 missing, 2 set aside`,
		},
		{"names by widths, the last column as long as it is", func(l *pipeline.Layout) { l.Delimiter, l.Widths = "", []int{18, 1} }, "time              temp\n2031-07-20 13:00  5.000\n", five + ok},
		{"quotes are text", func(l *pipeline.Layout) { l.Quote = "none" }, "time,temp,note\n2031-07-20 13:00,5,a 5\" nail, no\n2031-07-20 13:00,5,a 5\" nail\n", `! line 2 row 1 column 0 "" wrong_width: has 4 of 3 columns
			2 north air_temp 2031-07-20T22:00:00 5 not_checked
			lines 3 = 1 header + 0 blank + 0 comments + 2 rows; rows 1 read, 0 without value, 1 set aside; cells 1 read, 0 missing, 1 set aside`},

		{"scale and offset", func(l *pipeline.Layout) { l.Values[0].Scale, l.Values[0].Offset = 0.01, -40 }, "time,temp\n2031-07-20 13:00,4500\n", five + ok},
		{"offset alone", func(l *pipeline.Layout) { l.Values[0].Offset = 9 }, "time,temp\n2031-07-20 13:00,-4\n", five + ok},
		{"scale before the unit", func(l *pipeline.Layout) { l.Values[0].Scale, l.Values[0].Unit = 10, pipeline.DegF }, "time,temp\n2031-07-20 13:00,4.1\n", five + ok},
		{"scaled out of bounds", func(l *pipeline.Layout) { l.Values[0].Scale = 1e9 }, "time,temp\n2031-07-20 13:00,1e300\n", `! line 2 row 1 column 2 "temp" out_of_bounds: +Inf degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value` + "\n" + aside},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			tt.layout(l)
			diff(t, decode(t, l, "", strings.NewReader(tt.text)), tt.want)
			diff(t, decode(t, l, "", iotest.OneByteReader(strings.NewReader(tt.text))), tt.want)
		})
	}
}
