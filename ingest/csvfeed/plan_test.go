package csvfeed_test

import (
	"math"
	"strings"
	"testing"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

func TestCompileRefuses(t *testing.T) {
	tests := []struct {
		name   string
		layout func(*pipeline.Layout)
		want   string
	}{
		{"delimiter of two", func(l *pipeline.Layout) { l.Delimiter = ",," }, `delimiter: ",," is no delimiter; one ASCII character such as "," or ";" is right, or space for any run of blanks`},
		{"no delimiter", func(l *pipeline.Layout) { l.Delimiter = "" }, `delimiter: "" is no delimiter; one ASCII character such as "," or ";" is right, or space for any run of blanks`},
		{"quote for a delimiter", func(l *pipeline.Layout) { l.Delimiter = `"` }, `delimiter: "\"" is no delimiter; one ASCII character such as "," or ";" is right, or space for any run of blanks`},
		{"line end in the comment", func(l *pipeline.Layout) { l.Comment = "#\n" }, `comment: "#\n" holds a line end; comments are known by how a line begins`},
		{"line before the first", func(l *pipeline.Layout) { l.NamesLine = -1 }, `names_line: -1 is no line; lines are numbered from 1, and 0 says that there are no names`},
		{"share above 1", func(l *pipeline.Layout) { l.MaxSetAside = 20 }, `max_set_aside: 20 is not a share from 0 to 1`},
		{"share that is no number", func(l *pipeline.Layout) { l.MaxSetAside = math.NaN() }, `max_set_aside: NaN is not a share from 0 to 1`},
		{"no time", func(l *pipeline.Layout) { l.Time.Columns = nil }, `time.columns: there are none; name the column that holds the time, or those that together do`},
		{"format", func(l *pipeline.Layout) { l.Time.Format = "YYYY-MM" }, `time.format: format "YYYY-MM": there is no full date; it needs month and day, or the day of the year DDD`},
		{"zone by name", func(l *pipeline.Layout) { l.Time.Zone = "UTC" }, `time.zone: "UTC" is no offset from UTC such as Z, +03:00 or -09:00, not "station", which is the station's standard time, and no named zone such as America/Edmonton`},
		{"no zone", func(l *pipeline.Layout) {
			l.Time.Zone, l.Time.Covers, l.Time.SpanS, l.Time.Format = "", "ending", 3600, "YYYY-MM-DD hh"
		}, `time.zone: "" is no offset from UTC such as Z, +03:00 or -09:00, not "station", which is the station's standard time, and no named zone such as America/Edmonton`},
		{"day with an offset", func(l *pipeline.Layout) { l.Time.Zone = "Z" }, `time.zone: "Z" cannot be with covers day: a station's day goes by its utc_offset and day_starts; write station`},
		{"day that is short", func(l *pipeline.Layout) { l.Time.SpanS = 3600 }, `time.span_s: 3600 cannot be with covers day; 86400 is right`},
		{"no span", func(l *pipeline.Layout) { l.Time.Covers, l.Time.SpanS, l.Time.Format = "beginning", 0, "YYYY-MM-DD hh" }, `time.span_s: 0 is not 1 to 31622400, the seconds that a row covers`},
		{"no hour", func(l *pipeline.Layout) { l.Time.Covers, l.Time.SpanS = "ending", 3600 }, `time.format: format "YYYY-MM-DD" has no time of the day, which covers ending needs; add hh:mm, or cover day`},
		{"unknown covers", func(l *pipeline.Layout) { l.Time.Covers = "hour" }, `time.covers: "hour" is none of instant, day, ending, beginning`},
		{"no station", func(l *pipeline.Layout) { l.Station.Column = "" }, `station: none of column, file_name, preamble and constant is set; exactly one says which station a row is of`},
		{"two stations", func(l *pipeline.Layout) { l.Station.Constant = "north" }, `station: column and constant are set; exactly one says which station a row is of`},
		{"expression", func(l *pipeline.Layout) { l.Station.Column, l.Station.FileName = "", "(" }, "station.file_name: error parsing regexp: missing closing ): `(`"},
		{"expression without group", func(l *pipeline.Layout) { l.Station.Column, l.Station.FileName = "", `\d+` }, `station.file_name: "\\d+" has no group; put the part of the name that is the station in parentheses`},
		{"offset of a station", func(l *pipeline.Layout) {
			l.Station.Clocks = map[string]pipeline.StationClock{"north": {UTCOffsetS: -90000}}
		}, `station.clocks: utc_offset_s -90000 of "north" is not -50400 to 50400`},
		{"day of a station", func(l *pipeline.Layout) {
			l.Station.Clocks = map[string]pipeline.StationClock{"north": {DayStartsS: 86400}}
		}, `station.clocks: day_starts_s 86400 of "north" is not within a day (86400)`},
		{"no values", func(l *pipeline.Layout) { l.Values = nil }, `values: there are 0 columns; 1 to 1000 give the readings`},
		{"variable", func(l *pipeline.Layout) { l.Values[1].Variable = "tmin" }, `values[1].variable: "tmin" is no variable; known are air_temp, air_temp_mean, air_temp_max, air_temp_min, and the same of surface_temp`},
		{"instant of a day", func(l *pipeline.Layout) { l.Values[1].Variable = "air_temp" }, `values[1].variable: air_temp is a value at an instant, and time.covers is day; air_temp_mean, air_temp_max or air_temp_min is right`},
		{"unit", func(l *pipeline.Layout) { l.Values[0].Unit = "C" }, `values[0].unit: "C" is no unit; known are degC, degF, K, tenths degC, tenths degF`},
		{"level", func(l *pipeline.Layout) { l.Values[0].LevelM = math.Inf(1) }, `values[0].level_m: +Inf is no height in m`},
		{"one series twice", func(l *pipeline.Layout) { l.Values[1].Variable = "air_temp_max" }, `values[1].sensor: values[0] has the same sensor, variable and level; readings of one would replace those of the other`},
		{"one column twice", func(l *pipeline.Layout) { l.Values[1].Column = "max" }, `values[1].column: values[0] reads column "max" already`},
		{"no column", func(l *pipeline.Layout) { l.Values[1].Column = "" }, `values[1].column: there is no column; name it as the header does, or by its number from 1`},
		{"mark of the empty flag", func(l *pipeline.Layout) { l.Values[0].Flag.Marks[" "] = pipeline.QualityGood }, `values[0].flag.marks: there is a mark for the empty flag; it is set by empty`},
		{"flag with blanks", func(l *pipeline.Layout) { l.Values[0].Flag.Marks["E "] = pipeline.QualityGood }, `values[0].flag.marks: "E " has blanks around it, which cells are read without; leave them out`},
		{"mark", func(l *pipeline.Layout) { l.Values[0].Flag.Marks["E"] = 8 }, `values[0].flag.marks: 8 of "E" is no quality mark; 0 to 7 are`},
		{"mark of no flag", func(l *pipeline.Layout) { l.Values[0].Flag.Empty = 31 }, `values[0].flag.empty: 31 is no quality mark; 0 to 7 are`},
		{"span of instants", func(l *pipeline.Layout) {
			*l = *hourly()
			l.Time.SpanS = 60
		}, `time.span_s: 60 cannot be with covers instant; 0 is right`},
		{"mean of an instant", func(l *pipeline.Layout) {
			*l = *hourly()
			l.Values[0].Variable = "air_temp_mean"
		}, `values[0].variable: air_temp_mean is of a span, and time.covers is instant; air_temp is right, or day, ending or beginning`},
		{"names without a names line", func(l *pipeline.Layout) {
			*l = *hourly()
			l.NamesLine = 0
		}, `time.columns[0]: "time" is a name, and names_line is 0: there are no names; give the column's number from 1
			values[0].column: "temp" is a name, and names_line is 0: there are no names; give the column's number from 1`},
		{"number too large", func(l *pipeline.Layout) {
			*l = *hourly()
			l.NamesLine, l.Time.Columns, l.Values[0].Column = 0, []string{"1"}, "99999"
		}, `values[0].column: column 99999 is past 10000`},
		{"all at once", func(l *pipeline.Layout) {
			l.Delimiter, l.Time.Format, l.Values[0].Unit = "", "", ""
		}, `delimiter: "" is no delimiter; one ASCII character such as "," or ";" is right, or space for any run of blanks
			time.format: format "": there is no year; add YYYY
			values[0].unit: "" is no unit; known are degC, degF, K, tenths degC, tenths degF`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			l := daily()
			tt.layout(l)
			plan, err := csvfeed.Compile(l)
			if err == nil || plan != nil {
				t.Fatalf("got %v, %v", plan, err)
			}
			diff(t, err.Error(), tt.want)
		})
	}
}

func TestSeries(t *testing.T) {
	l := daily()
	plan, err := csvfeed.Compile(l)
	if err != nil {
		t.Fatal(err)
	}
	want := []pipeline.Series{{Variable: pipeline.AirTempMax, LevelM: 2, SpanS: 86400}, {Variable: pipeline.AirTempMin, LevelM: 2, SpanS: 86400}}
	got := plan.Series()
	if len(got) != 2 || got[0] != want[0] || got[1] != want[1] {
		t.Errorf("got %v, want %v", got, want)
	}
}

// TestPlanStandsByItself: a layout that changes does not change its plan.
func TestPlanStandsByItself(t *testing.T) {
	l := daily()
	l.Values[0].When, l.Values[1].Or, l.Time.Or = map[string][]string{"flag": {"E"}}, []string{"low"}, [][]string{{"day"}}
	plan, err := csvfeed.Compile(l)
	if err != nil {
		t.Fatal(err)
	}
	text := names + "N1,2031-07-20,1,E,2\n"
	s := &written{series: plan.Series()}
	if _, err := plan.Decode(t.Context(), strings.NewReader(text), "", s); err != nil {
		t.Fatal(err)
	}
	clear(l.Station.Map)
	clear(l.Station.Clocks)
	clear(l.Values[0].Flag.Marks)
	l.Time.Columns[0], l.Values[0].Column, l.Values[0].Missing[0] = "x", "x", "1"
	l.Values[0].When["flag"][0], l.Values[1].Or[0], l.Time.Or[0][0] = "x", "x", "x"
	again := &written{series: plan.Series()}
	if _, err := plan.Decode(t.Context(), strings.NewReader(text), "", again); err != nil {
		t.Fatal(err)
	}
	diff(t, again.String(), s.String())
}
