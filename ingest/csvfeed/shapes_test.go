package csvfeed_test

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"

	"thawledger/pipeline"
)

// TestShapes reads small invented files in the shapes that agencies send.
func TestShapes(t *testing.T) {
	const good, doubtful, wrong, estimated, missing = pipeline.QualityGood, pipeline.QualityDoubtful, pipeline.QualityWrong, pipeline.QualityEstimated, pipeline.QualityMissing
	flag := func(column string) *pipeline.FlagColumn {
		return &pipeline.FlagColumn{Column: column, Empty: good, Marks: map[string]pipeline.Quality{"E": estimated, "M": missing}}
	}
	day := func(format string, columns ...string) pipeline.TimeColumns {
		return pipeline.TimeColumns{Columns: columns, Format: format, Zone: "station", Covers: pipeline.CoversDay, SpanS: 86400}
	}
	tests := []struct {
		file   string
		layout pipeline.Layout
		want   string
	}{
		{
			file: "quoted_flags.csv", // byte order mark, CRLF, all quoted, a flag after each value
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5, Time: day("YYYY-MM-DD", "Date/Time"),
				Station: pipeline.StationColumn{Column: "Climate ID", Map: map[string]string{"9900001": "first_spit"}, Clocks: map[string]pipeline.StationClock{"first_spit": {UTCOffsetS: -8 * 3600}}},
				Values: []pipeline.ValueColumn{
					{Column: "Max Temp (°C)", Variable: "air_temp_max", Unit: pipeline.DegC, Flag: flag("Max Temp Flag")},
					{Column: "Min Temp (°C)", Variable: "air_temp_min", Unit: pipeline.DegC, Flag: flag("Min Temp Flag")},
					{Column: "Mean Temp (°C)", Variable: "air_temp_mean", Unit: pipeline.DegC, Flag: flag("Mean Temp Flag")},
				},
			},
			want: `1 first_spit air_temp_max 2031-06-01T08:00:00 4.5 good
				1 first_spit air_temp_min 2031-06-01T08:00:00 -1.2 good
				1 first_spit air_temp_mean 2031-06-01T08:00:00 1.7 good
				2 first_spit air_temp_min 2031-06-02T08:00:00 -0.8 good
				3 first_spit air_temp_max 2031-06-03T08:00:00 6.1 estimated
				3 first_spit air_temp_min 2031-06-03T08:00:00 0 good
				3 first_spit air_temp_mean 2031-06-03T08:00:00 3.1 estimated
				! line 6 row 5 column 0 "" wrong_width: has 9 of 31 columns
				6 first_spit air_temp_max 2031-06-06T08:00:00 7.4 good
				6 first_spit air_temp_min 2031-06-06T08:00:00 2.2 good
				6 first_spit air_temp_mean 2031-06-06T08:00:00 4.8 good
				lines 7 = 1 header + 0 blank + 0 comments + 6 rows; rows 4 read, 1 without value, 1 set aside; cells 10 read, 5 missing, 3 set aside`,
		},
		{
			file: "day_of_year_degf.csv", // Day is the day of the year, degF with nothing saying so
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5, Time: day("YYYY DDD", "Year", "Day"),
				Station: pipeline.StationColumn{Constant: "hill", Clocks: map[string]pipeline.StationClock{"hill": {UTCOffsetS: -9 * 3600}}},
				Values:  []pipeline.ValueColumn{{Column: "Average", Variable: "air_temp_mean", Unit: pipeline.DegF}},
			},
			want: `1 hill air_temp_mean 2031-01-01T09:00:00 -25 not_checked
				2 hill air_temp_mean 2031-03-01T09:00:00 -15 not_checked
				3 hill air_temp_mean 2031-06-01T09:00:00 10.2778 not_checked
				! line 5 row 4 column 0 "" bad_time: column 3 "Year", column 1 "Day": "2031 366" is no time of the form YYYY DDD: day of the year 366 is not 1 to 365, the days of 2031
				5 hill air_temp_mean 2032-12-31T09:00:00 -30 not_checked
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 4 read, 0 without value, 1 set aside; cells 4 read, 0 missing, 1 set aside`,
		},
		{
			file: "month_day_degf.csv", // M/D/YYYY, a comma in a quoted name
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5, Time: day("M/D/YYYY", "DATE"),
				Station: pipeline.StationColumn{Column: "STATION", Map: map[string]string{"XX990002": "cove"}, Clocks: map[string]pipeline.StationClock{"cove": {UTCOffsetS: -9 * 3600}}},
				Values: []pipeline.ValueColumn{
					{Column: "TMAX", Variable: "air_temp_max", Unit: pipeline.DegF}, {Column: "TMIN", Variable: "air_temp_min", Unit: pipeline.DegF},
				},
			},
			want: `1 cove air_temp_max 2031-01-01T09:00:00 0 not_checked
				1 cove air_temp_min 2031-01-01T09:00:00 -10 not_checked
				2 cove air_temp_max 2031-01-02T09:00:00 5 not_checked
				2 cove air_temp_min 2031-01-02T09:00:00 -20 not_checked
				3 cove air_temp_min 2031-12-31T09:00:00 -5 not_checked
				! line 5 row 4 column 0 "" bad_time: column 6 "DATE": "13/1/2031" is no time of the form M/D/YYYY: month 13 is not 1 to 12
				! line 6 row 5 column 9 "TMAX" out_of_bounds: 500 degF is 260 degC, outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value
				5 cove air_temp_min 2032-02-29T09:00:00 10 not_checked
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 4 read, 0 without value, 1 set aside; cells 6 read, 1 missing, 3 set aside`,
		},
		{
			file: "white_space.txt", // no names, yyyymmdd, -9999.0 for missing
			layout: pipeline.Layout{
				Delimiter: "space", MaxSetAside: 0.5, Time: day("YYYYMMDD", "2"),
				Station: pipeline.StationColumn{Column: "1", Map: map[string]string{"99003": "bay"}, Clocks: map[string]pipeline.StationClock{"bay": {UTCOffsetS: -9 * 3600}}},
				Values: []pipeline.ValueColumn{
					{Column: "6", Variable: "air_temp_max", Unit: pipeline.DegC, Missing: []string{"-9999.0"}},
					{Column: "7", Variable: "air_temp_min", Unit: pipeline.DegC, Missing: []string{"-9999.0"}},
				},
			},
			want: `1 bay air_temp_max 2031-01-01T09:00:00 6.3 not_checked
				1 bay air_temp_min 2031-01-01T09:00:00 -2.4 not_checked
				2 bay air_temp_min 2031-01-02T09:00:00 -2.8 not_checked
				3 bay air_temp_max 2031-01-03T09:00:00 -1.4 not_checked
				3 bay air_temp_min 2031-01-03T09:00:00 -4.5 not_checked
				lines 3 = 0 header + 0 blank + 0 comments + 3 rows; rows 3 read, 0 without value, 0 set aside; cells 5 read, 1 missing, 0 set aside`,
		},
		{
			file: "quality_code.csv", // UTC, a quality code beside each value, the station in the file's name
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5,
				Time:    pipeline.TimeColumns{Columns: []string{"t"}, Format: "YYYY-MM-DDThh:mmZ", Zone: "Z", Covers: pipeline.CoversInstant},
				Station: pipeline.StationColumn{FileName: `^(quality)_`, Map: map[string]string{"quality": "port"}, Clocks: map[string]pipeline.StationClock{"port": {UTCOffsetS: -9 * 3600}}},
				Values: []pipeline.ValueColumn{{Column: "air_temperature", Variable: "air_temp", Unit: pipeline.DegC, Flag: &pipeline.FlagColumn{
					Column: "air_temperature_quality", Empty: missing, Marks: map[string]pipeline.Quality{"1": good, "2": doubtful, "3": wrong, "9": missing}}}},
			},
			want: `1 port air_temp 2031-06-04T19:00:00 15.1 good
				3 port air_temp 2031-06-04T20:00:00 13.8 wrong
				4 port air_temp 2031-06-04T21:00:00 12.9 doubtful
				! line 6 row 5 column 4 "air_temperature" unknown_flag: flag "A" in column 5 "air_temperature_quality" has no mark; those that have are "1", "2", "3", "9"
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 3 read, 1 without value, 1 set aside; cells 3 read, 1 missing, 1 set aside`,
		},
		{
			file: "five_minutes.csv", // local standard time, NaN for missing
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5,
				Time:    pipeline.TimeColumns{Columns: []string{"ds"}, Format: "YYYY-MM-DD hh:mm:ss", Zone: "station", Covers: pipeline.CoversInstant},
				Station: pipeline.StationColumn{Constant: "valley", Clocks: map[string]pipeline.StationClock{"valley": {UTCOffsetS: -8 * 3600}}},
				Values:  []pipeline.ValueColumn{{Column: "y", Variable: "air_temp", Unit: pipeline.DegC, Missing: []string{"NaN"}}},
			},
			want: `1 valley air_temp 2031-05-02T07:50:00 7.8 not_checked
				3 valley air_temp 2031-05-02T08:00:00 -0.5 not_checked
				lines 4 = 1 header + 0 blank + 0 comments + 3 rows; rows 2 read, 1 without value, 0 set aside; cells 2 read, 1 missing, 0 set aside`,
		},
		{
			file: "four_line_header.dat", // station, names, units and kinds of value in four lines
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 2, UnitsLine: 3, DataLine: 5, MaxSetAside: 0.5,
				Time:    pipeline.TimeColumns{Columns: []string{"end of hour"}, Format: "YYYY-MM-DD hh:mm:ss.f", Zone: "station", Covers: pipeline.CoversEnding, SpanS: 3600},
				Station: pipeline.StationColumn{Preamble: `^"LOG","(\w+)"`, Map: map[string]string{"N7": "pass"}, Clocks: map[string]pipeline.StationClock{"pass": {UTCOffsetS: -9 * 3600}}},
				Values:  []pipeline.ValueColumn{{Column: "air mean", Or: []string{"air mean 2m"}, Variable: "air_temp_mean", Unit: pipeline.DegC, UnitText: "Deg C", Missing: []string{"NAN"}}},
			},
			want: `1 pass air_temp_mean 2031-05-02T09:00:00 -3.25 not_checked
				3 pass air_temp_mean 2031-05-03T08:00:00 -1.75 not_checked
				lines 7 = 4 header + 0 blank + 0 comments + 3 rows; rows 2 read, 1 without value, 0 set aside; cells 2 read, 1 missing, 0 set aside`,
		},
		{
			file: "long_form.txt", // a row for each parameter, decimal comma, names of months
			layout: pipeline.Layout{
				Delimiter: ";", Decimal: ",", PreambleEnds: "^START$", NamesLine: 1, MaxSetAside: 0.5,
				Time:    pipeline.TimeColumns{Columns: []string{"when"}, Format: "DD-MMM-YYYY hh:mm", Zone: "Z", Covers: pipeline.CoversEnding, SpanS: 3600},
				Station: pipeline.StationColumn{Column: "site", Map: map[string]string{"101": "fell", "102": "tarn"}, Clocks: map[string]pipeline.StationClock{"fell": {}, "tarn": {}}},
				Values: []pipeline.ValueColumn{
					{Column: "value", When: map[string][]string{"parameter": {"TA_1.5"}}, Variable: "air_temp_mean", Unit: pipeline.DegC, LevelM: 1.5, Flag: &pipeline.FlagColumn{Column: "mark", Marks: map[string]pipeline.Quality{"s": doubtful}}},
					{Column: "value", When: map[string][]string{"parameter": {"TG_0.5"}}, Variable: "air_temp_mean", Unit: pipeline.DegC, LevelM: -0.5},
				},
			},
			want: `1 fell air_temp_mean 2031-03-01T12:00:00 -12.4 good
				3 tarn air_temp_mean 2031-03-01T12:00:00 -11.9 doubtful
				4 tarn air_temp_mean 2031-03-01T12:00:00 -4.25 not_checked
				! line 11 row 7 column 0 "" unknown_station: station "103" in column 1 "site" is not among the feed's: "101", "102", "fell", "tarn"
				lines 11 = 4 header + 0 blank + 0 comments + 7 rows; rows 3 read, 3 without value, 1 set aside; cells 3 read, 0 missing, 1 set aside`,
		},
		{
			file: "fixed_width.txt", // year, day of the year, hours and minutes; tenths without a point
			layout: pipeline.Layout{
				Widths: []int{2, 5, 4, 5, 5, 2}, MaxSetAside: 0.5,
				Time:    pipeline.TimeColumns{Columns: []string{"2", "3", "4"}, Format: "YYYY DDD hmm", Zone: "-09:00", Covers: pipeline.CoversInstant},
				Station: pipeline.StationColumn{Column: "1", Map: map[string]string{"12": "spit"}, Clocks: map[string]pipeline.StationClock{"spit": {}}},
				Values: []pipeline.ValueColumn{{Column: "5", Variable: "air_temp", Unit: pipeline.DegC, Scale: 0.1, Missing: []string{"9999"},
					Flag: &pipeline.FlagColumn{Column: "6", Marks: map[string]pipeline.Quality{"0": good, "1": doubtful}, Empty: pipeline.QualityNotChecked}}},
			},
			want: `1 spit air_temp 2031-04-30T09:30:00 -10.5 good
				2 spit air_temp 2031-04-30T10:30:00 -9.8 doubtful
				4 spit air_temp 2031-05-01T09:00:00 -7.2 not_checked
				lines 4 = 0 header + 0 blank + 0 comments + 4 rows; rows 3 read, 1 without value, 0 set aside; cells 3 read, 1 missing, 0 set aside`,
		},
		{
			file: "local_time.csv", // the clock on the wall, with AM and PM
			layout: pipeline.Layout{
				Delimiter: ",", NamesLine: 1, MaxSetAside: 0.5,
				Time: pipeline.TimeColumns{Columns: []string{"Local time"}, Format: "M/D/YYYY h:mm AM", Zone: "America/Anchorage",
					Ambiguous: pipeline.AmbiguousEarlier, Skipped: pipeline.SkippedSetAside, Covers: pipeline.CoversInstant},
				Station: pipeline.StationColumn{Constant: "cove", Clocks: map[string]pipeline.StationClock{"cove": {UTCOffsetS: -9 * 3600}}},
				Values:  []pipeline.ValueColumn{{Column: "Temp", Variable: "air_temp", Unit: pipeline.DegF}},
			},
			want: `1 cove air_temp 2030-11-03T08:30:00 -1.11111 not_checked
				2 cove air_temp 2030-11-03T09:30:00 -1.66667 changed
				3 cove air_temp 2030-11-03T11:30:00 -2.22222 not_checked
				! line 5 row 4 column 0 "" bad_time: column 1 "Local time": the clocks of America/Anchorage never showed 2030-03-10 02:30:00
				5 cove air_temp 2030-07-04T20:00:00 20 not_checked
				lines 6 = 1 header + 0 blank + 0 comments + 5 rows; rows 4 read, 0 without value, 1 set aside; cells 4 read, 0 missing, 1 set aside`,
		},
	}
	for _, tt := range tests {
		t.Run(tt.file, func(t *testing.T) {
			text, err := os.ReadFile(filepath.Join("testdata", tt.file))
			if err != nil {
				t.Fatal(err)
			}
			if tt.file == "quoted_flags.csv" && !(bytes.HasPrefix(text, []byte("\ufeff")) && bytes.HasSuffix(text, []byte("\"\r\n"))) {
				t.Fatal("the file has lost its byte order mark or its line ends")
			}
			diff(t, decode(t, &tt.layout, tt.file, bytes.NewReader(text)), tt.want)
		})
	}
}
