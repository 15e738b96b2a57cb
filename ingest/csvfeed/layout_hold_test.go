package csvfeed_test

import (
	"strings"
	"testing"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

func TestDecodeHoldsForms(t *testing.T) {
	header := func(n string) string {
		return "lines " + n + " = " + n + " header + 0 blank + 0 comments + 0 rows; rows 0 read, 0 without value, 0 set aside; cells 0 read, 0 missing, 0 set aside\n*csvfeed.HoldError: "
	}
	units := func(l *pipeline.Layout) { l.UnitsLine, l.Values[0].UnitText = 2, "degC" }
	preamble := func(l *pipeline.Layout) { l.PreambleEnds = "^DATA" }
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		text   string
		want   string
	}{
		{"none of the other names", func(l *pipeline.Layout) { l.Values[0].Or = []string{"TAVG", "TEMP"} }, "time,tavg\n", header("0") + `line 1: there is none of the columns "temp", "TAVG", "TEMP"; the columns are "time", "tavg"`},
		{"two of the other names", func(l *pipeline.Layout) { l.Values[0].Or = []string{"TAVG", "TEMP"} }, "TEMP,time,temp\n", header("0") + `line 1: the columns "temp", "TEMP" are there together, and the layout takes them for one; name the right one only`},
		{"one of the other names twice", func(l *pipeline.Layout) { l.Values[0].Or = []string{"TAVG"} }, "TAVG,time,TAVG\n", header("0") + `line 1: columns 1 and 3 are both named "TAVG"; give the number of the right one`},
		{"one column by two names", func(l *pipeline.Layout) {
			l.Values = append(l.Values, l.Values[0])
			l.Values[0].Or, l.Values[1].Column, l.Values[1].Or, l.Values[1].Sensor = []string{"TAVG"}, "TAVG", nil, "b"
		}, "time,TAVG\n", header("0") + `line 1: columns "temp" and "TAVG" of the layout are one`},
		{"column of a condition", long, "time,what,units,value\n", header("0") + `line 1: there is no column "unit", the nearest is "units"; the columns are "time", "what", "units", "value"`},

		{"another unit", units, "time,temp\n,degF\n2031-07-20 13:00,41\n", header("1") + `line 2: the unit of column 2 "temp" is "degF", and the layout was written for "degC"; see what it is now, and change unit and unit_text`},
		{"no unit", units, "time,temp\nUTC\n", header("1") + `line 2: the unit of column 2 "temp" is "", and the layout was written for "degC"; see what it is now, and change unit and unit_text`},
		{"another unit before the names", func(l *pipeline.Layout) { units(l); l.NamesLine, l.UnitsLine = 2, 1 }, ",K\ntime,temp\n", header("1") + `line 1: the unit of column 2 "temp" is "K", and the layout was written for "degC"; see what it is now, and change unit and unit_text`},
		{"units and a stray quote", units, "time,temp\n,\"degC\n", header("1") + `line 2: the units cannot be read: the quote at character 2, in column 2, is not closed on its line; a quote inside a quoted cell is written twice`},
		{"another unit after a preamble", func(l *pipeline.Layout) { units(l); preamble(l); l.DataLine = 4 }, "DATA\ntime,temp\n,degF\n---\n", header("3") + `line 3: the unit of column 2 "temp" is "degF", and the layout was written for "degC"; see what it is now, and change unit and unit_text`},

		{"preamble without end", preamble, "time,temp\n2031-07-20 13:00,5\n", header("2") + `the file ends after 2 lines, and none of them ends the preamble: none fits "^DATA"`},
		{"preamble longer than any", preamble, strings.Repeat("x\n", 1000) + "DATA\ntime,temp\n", header("999") + `line 1000: none of the first 1000 lines ends the preamble: none fits "^DATA"`},
		{"no names after the preamble", func(l *pipeline.Layout) { preamble(l); l.NamesLine = 2 }, "x\nDATA\nx\n", header("3") + "the file ends after 3 lines, and the column names are due on line 4"},
		{"end that is far into a line", func(l *pipeline.Layout) { l.PreambleEnds = "DATA" }, strings.Repeat("x", 5000) + "DATA\n", header("1") + `the file ends after 1 lines, and none of them ends the preamble: none fits "DATA"`},

		{"no station in the header", func(l *pipeline.Layout) {
			l.NamesLine, l.Station = 3, pipeline.StationColumn{Preamble: `^Id (\w*)`, Clocks: l.Station.Clocks}
		}, "Id \nid N1\ntime,temp\n2031-07-20 13:00,5\n", header("2") + `line 3: no line of the header says the station: none fits "^Id (\\w*)"`},
		{"station in the names only", func(l *pipeline.Layout) {
			preamble(l)
			l.Station = pipeline.StationColumn{Preamble: `(temp)`, Clocks: l.Station.Clocks}
		}, "DATA\ntime,temp\n", header("1") + `line 2: no line of the header says the station: none fits "(temp)"`},
		{"station far into a line, and after the names", func(l *pipeline.Layout) {
			l.NamesLine, l.DataLine, l.Station = 2, 4, pipeline.StationColumn{Preamble: `Id (\w+)`, Clocks: l.Station.Clocks}
		}, strings.Repeat("x", 5000) + "Id north\ntime,temp\nId north\n2031-07-20 13:00,5\n", header("2") + `line 3: no line of the header says the station: none fits "Id (\\w+)"`},
		{"no station in a preamble without names", func(l *pipeline.Layout) {
			preamble(l)
			l.NamesLine, l.Time.Columns, l.Values[0].Column = 0, []string{"1"}, "2"
			l.Station = pipeline.StationColumn{Preamble: `^Id (\w+)`, Clocks: l.Station.Clocks}
		}, "DATA\n2031-07-20 13:00,5\n", header("0") + `line 1: no line of the header says the station: none fits "^Id (\\w+)"`},
		{"over the share without a cell", func(l *pipeline.Layout) { long(l); l.MaxSetAside = 0.2 }, "time,what,unit,value\nx\n", `! line 2 row 1 column 0 "" wrong_width: has 1 of 4 columns
			lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 0 missing, 0 set aside
			*csvfeed.HoldError: 1 of 1 rows (100 %) could not be read, the feed allows 20 %; first: line 2: has 1 of 4 columns`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			tt.layout(l)
			diff(t, decode(t, l, "", strings.NewReader(tt.text)), tt.want)
		})
	}
}

// TestBeginningWithoutHeader: what a file has grown by cannot be read if its
// beginning has no whole header.
func TestBeginningWithoutHeader(t *testing.T) {
	for _, tt := range []struct {
		name   string
		layout func(*pipeline.Layout)
		head   string
		want   string
	}{
		{"no names", func(*pipeline.Layout) {}, "", "the file ends after 0 lines, and the column names are due on line 1"},
		{"no end of the preamble", func(l *pipeline.Layout) { l.PreambleEnds = "^DATA" }, "time,temp\n", `the file ends after 1 lines, and none of them ends the preamble: none fits "^DATA"`},
	} {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			tt.layout(l)
			plan, err := csvfeed.Compile(l)
			if err != nil {
				t.Fatal(err)
			}
			_, err = plan.DecodeRest(t.Context(), strings.NewReader(tt.head), 5, strings.NewReader("2031-07-20 13:00,5\n"), "", &written{series: plan.Series()})
			if err == nil || err.Error() != tt.want {
				t.Errorf("got %v, want %s", err, tt.want)
			}
		})
	}
}

func TestCompileRefusesForms(t *testing.T) {
	zone := func(l *pipeline.Layout) {
		l.Time.Zone, l.Time.Ambiguous, l.Time.Skipped = "America/Edmonton", pipeline.AmbiguousEarlier, pipeline.SkippedShift
	}
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		want   string
	}{
		{"decimal comma beside a delimiter of the kind", func(l *pipeline.Layout) { l.Decimal = "," }, `decimal: "," is the delimiter too; give another delimiter`},
		{"decimal mark", func(l *pipeline.Layout) { l.Decimal = "'" }, `decimal: "'" is no decimal mark; "," is, and "." if it is left out`},
		{"quote", func(l *pipeline.Layout) { l.Quote = "'" }, `quote: "'" is not known; none says that quotes are text, and left out they quote cells`},
		{"delimiter and widths", func(l *pipeline.Layout) { l.Widths = []int{5, 5} }, `delimiter: "," cannot be with widths, which part the columns; leave one of them out`},
		{"width of 0", func(l *pipeline.Layout) { l.Delimiter, l.Widths = "", []int{5, 0} }, `widths[1]: 0 is no width in characters; 1 to 1048576 are`},
		{"column past the widths", func(l *pipeline.Layout) {
			l.Delimiter, l.Widths, l.NamesLine, l.Time.Columns, l.Values[0].Column = "", []int{5, 5}, 0, []string{"1"}, "3"
		}, `values[0].column: column 3 is past the last, 2, that has a width`},

		{"units before the first line", func(l *pipeline.Layout) { l.UnitsLine = -1 }, `units_line: -1 is no line; lines are numbered from 1, and 0 says that there are no units`},
		{"units and names", func(l *pipeline.Layout) { l.UnitsLine = 1 }, `units_line: 1 is the line of the names too`},
		{"data before the first line", func(l *pipeline.Layout) { l.DataLine = -1 }, `data_line: -1 is no line; lines are numbered from 1, and left out data begin after names and units`},
		{"data on the line of names", func(l *pipeline.Layout) { l.DataLine = 1 }, `data_line: 1 is not after the lines of names and units; the last of them is 1`},
		{"data on the line of units", func(l *pipeline.Layout) { l.UnitsLine, l.DataLine = 3, 3 }, `data_line: 3 is not after the lines of names and units; the last of them is 3`},
		{"data far down", func(l *pipeline.Layout) { l.DataLine = 1002 }, `data_line: the header has 1001 lines; 1000 are the most`},
		{"unit without a line", func(l *pipeline.Layout) { l.Values[0].UnitText = "degC" }, `values[0].unit_text: there is no line of units to hold it against; say which it is by units_line`},
		{"end of the preamble", func(l *pipeline.Layout) { l.PreambleEnds = "(" }, "preamble_ends: error parsing regexp: missing closing ): `(`"},
		{"station without a group", func(l *pipeline.Layout) { l.PreambleEnds, l.Station.Constant, l.Station.Preamble = "x", "", "x" }, `station.preamble: "x" has no group; put the part of the line that is the station in parentheses`},
		{"station from no line", func(l *pipeline.Layout) { l.Station.Constant, l.Station.Preamble = "", "(x)" }, `station.preamble: there is no line before the names; say where they are by names_line, or how the preamble ends by preamble_ends`},
		{"station from two places", func(l *pipeline.Layout) { l.PreambleEnds, l.Station.Preamble = "x", "(x)" }, `station: preamble and constant are set; exactly one says which station a row is of`},

		{"other name without names", func(l *pipeline.Layout) {
			l.NamesLine, l.Time.Columns, l.Values[0].Column, l.Values[0].Or = 0, []string{"1"}, "2", []string{"temp"}
		}, `values[0].column: "2" is a number, and of several names for a column the file has one; give names only
			values[0].column: "temp" is a name, and names_line is 0: there are no names; give the column's number from 1`},
		{"other name of nothing", func(l *pipeline.Layout) { l.Station.Or = []string{"id"} }, `station.column: there are other names for a column that is not given`},
		{"other name that is empty", func(l *pipeline.Layout) { l.Time.Or = [][]string{{""}} }, `time.columns[0]: there is no column; name it as the header does, or by its number from 1`},
		{"other names of no column", func(l *pipeline.Layout) { l.Time.Or = [][]string{nil, {"day"}} }, `time.columns: there are other names for 2 of 1 columns`},

		{"conditions that do not part", func(l *pipeline.Layout) {
			long(l)
			l.Values[2].When = map[string][]string{"what": {"TB", "TA"}}
		}, `values[2].column: values[0] reads column "value" already`},
		{"one series by two conditions", func(l *pipeline.Layout) {
			long(l)
			l.Values[1].Column, l.Values[1].When = "other", map[string][]string{"what": {"TA"}}
		}, `values[1].sensor: values[0] has the same sensor, variable and level; readings of one would replace those of the other`},
		{"condition without a text", func(l *pipeline.Layout) { l.Values[0].When = map[string][]string{"what": nil} }, `values[0].when: there is no text for column "what"; no row would have it`},
		{"condition with blanks", func(l *pipeline.Layout) { l.Values[0].When = map[string][]string{"what": {"TA "}} }, `values[0].when: "TA " has blanks around it, which cells are read without; leave them out`},
		{"condition without a column", func(l *pipeline.Layout) { l.Values[0].When = map[string][]string{"": {"TA"}} }, `values[0].when: there is no column; name it as the header does, or by its number from 1`},

		{"epoch in another zone", func(l *pipeline.Layout) { l.Time.Format = "epoch" }, `time.zone: "station" cannot be with format epoch, which counts from 1970 in UTC; write Z`},
		{"epoch of a day", func(l *pipeline.Layout) { *l = *daily(); l.Time.Format, l.Time.Zone = "epoch_ms", "" }, `time.format: epoch_ms counts instants, and a day is a date; give a format with a date, or what else the row covers`},

		{"scale", func(l *pipeline.Layout) { l.Values[0].Scale = 1e-12 }, `values[0].scale: 1e-12 is no factor; 1e-09 to 1e+09 are`},
		{"offset", func(l *pipeline.Layout) { l.Values[0].Offset = 1e12 }, `values[0].offset: 1e+12 is nothing to add; up to 1e+09 is`},

		{"zone that is not there", func(l *pipeline.Layout) { zone(l); l.Time.Zone = "America/Tarn" }, `time.zone: there is no zone "America/Tarn" such as America/Edmonton`},
		{"zone without rules", func(l *pipeline.Layout) { l.Time.Zone = "America/Edmonton" }, `time.ambiguous: "" is none of earlier, later, set_aside: what a time is that the clocks of America/Edmonton show twice
			time.skipped: "" is none of shift, set_aside: what becomes of a time that the clocks of America/Edmonton leave out`},
		{"rules without a zone", func(l *pipeline.Layout) { zone(l); l.Time.Zone = "-07:00" }, `time.zone: "-07:00" has no times that are there twice or not at all; leave ambiguous and skipped out`},
		{"day in a zone", func(l *pipeline.Layout) { *l = *daily(); zone(l) }, `time.zone: "America/Edmonton" cannot be with covers day: a station's day goes by its utc_offset and day_starts; write station`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			tt.layout(l)
			plan, err := csvfeed.Compile(l)
			if err == nil || plan != nil {
				t.Fatalf("got %v, %v", plan, err)
			}
			diff(t, err.Error(), tt.want)
		})
	}
}

func TestNamedZones(t *testing.T) {
	const ok = "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 1 read, 0 without value, 0 set aside; cells 1 read, 0 missing, 0 set aside"
	const aside = "lines 2 = 1 header + 0 blank + 0 comments + 1 rows; rows 0 read, 0 without value, 1 set aside; cells 0 read, 0 missing, 1 set aside"
	marks := func(l *pipeline.Layout) {
		l.Values[0].Flag = &pipeline.FlagColumn{Column: "flag", Empty: pipeline.QualityGood, Marks: map[string]pipeline.Quality{"D": pipeline.QualityDoubtful, "E": pipeline.QualityEstimated, "W": pipeline.QualityWrong}}
	}
	none := func(*pipeline.Layout) {}
	// The instants are those of normal.TestNamedZone, held there against package time.
	tests := []struct {
		name      string
		layout    func(*pipeline.Layout)
		zone      string
		ambiguous pipeline.Ambiguous
		skipped   pipeline.Skipped
		text      string
		want      string
	}{
		{"nothing in doubt", none, "America/Edmonton", "set_aside", "set_aside", "time,temp\n2024-07-15 12:00,5\n", "1 north air_temp 2024-07-15T18:00:00 5 not_checked\n" + ok},
		{"earlier", none, "America/Edmonton", "earlier", "set_aside", "time,temp\n2024-11-03 01:00,5\n", "1 north air_temp 2024-11-03T07:00:00 5 changed\n" + ok},
		{"later", none, "America/Edmonton", "later", "set_aside", "time,temp\n2024-11-03 01:00,5\n", "1 north air_temp 2024-11-03T08:00:00 5 changed\n" + ok},
		{"twice, set aside", none, "America/Edmonton", "set_aside", "shift", "time,temp\n2024-11-03 01:00,5\n", `! line 2 row 1 column 0 "" bad_time: column 1 "time": the clocks of America/Edmonton showed 2024-11-03 01:00:00 twice` + "\n" + aside},
		{"skipped, shifted", none, "America/Edmonton", "set_aside", "shift", "time,temp\n2024-03-10 02:00,5\n", "1 north air_temp 2024-03-10T09:00:00 5 changed\n" + ok},
		{"skipped, set aside", none, "America/Edmonton", "earlier", "set_aside", "time,temp\n2024-03-10 02:00,5\n", `! line 2 row 1 column 0 "" bad_time: column 1 "time": the clocks of America/Edmonton never showed 2024-03-10 02:00:00` + "\n" + aside},
		{"south, half an hour", none, "Australia/Lord_Howe", "later", "shift", "time,temp\n2024-04-07 01:30,5\n", "1 north air_temp 2024-04-06T15:00:00 5 changed\n" + ok},
		{"hour that ends when the clocks are put back", func(l *pipeline.Layout) {
			l.Time.Covers, l.Time.SpanS, l.Values[0].Variable = pipeline.CoversEnding, 3600, "air_temp_mean"
		}, "America/Edmonton", "later", "shift", "time,temp\n2024-11-03 01:00,5\n", "1 north air_temp_mean 2024-11-03T07:00:00 5 changed\n" + ok},
		{"a worse mark stays", marks, "America/Edmonton", "later", "shift", "time,temp,flag\n2024-11-03 01:00,5,\n2024-11-03 01:10,5,D\n2024-11-03 01:20,5,E\n2024-11-03 01:30,5,W\n2024-11-03 02:30,5,\n", `1 north air_temp 2024-11-03T08:00:00 5 changed
			2 north air_temp 2024-11-03T08:10:00 5 doubtful
			3 north air_temp 2024-11-03T08:20:00 5 estimated
			4 north air_temp 2024-11-03T08:30:00 5 wrong
			5 north air_temp 2024-11-03T09:30:00 5 good
			lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 5 read, 0 without value, 0 set aside; cells 5 read, 0 missing, 0 set aside`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := hourly()
			l.Time.Zone, l.Time.Ambiguous, l.Time.Skipped = tt.zone, tt.ambiguous, tt.skipped
			tt.layout(l)
			diff(t, decode(t, l, "", strings.NewReader(tt.text)), tt.want)
		})
	}
}
