package settings

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

const formsFile = `stations: [{id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: hourly}]
layouts:
  l: {%SHAPE, time: {%TIME}, station: {%STATION}, values: [%VALUES]}
feeds: [{name: f, folder: f, layout: l}]
`

func forms(shape, times, station, values string) string {
	or := func(text, otherwise string) string {
		if text == "" {
			return otherwise
		}
		return text
	}
	return strings.NewReplacer("%SHAPE", or(shape, `delimiter: ",", names_line: 1`), "%TIME", or(times, `columns: [t], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`),
		"%STATION", or(station, "constant: TARN"), "%VALUES", or(values, `{column: temp, variable: air_temp, unit: degC}`)).Replace(formsFile)
}

// What a layout can say is read as meant, and shown so that it is read again as
// the same.
func TestForms(t *testing.T) {
	tests := []struct {
		name, text string
		want       func(*pipeline.Layout)
	}{
		{"as before", forms("", "", "", ""), func(*pipeline.Layout) {}},
		{"what is the same as nothing", forms(`delimiter: ",", names_line: 1, decimal: ".", widths: [], units_line: 0, data_line: 0`, `columns: [[t]], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`, "", `{column: [temp], variable: air_temp, unit: degC, scale: 1, offset: 0}`), func(*pipeline.Layout) {}},
		{"shape", forms(`delimiter: ";", decimal: ",", quote: none, preamble_ends: '^DATA "now"', names_line: 1, units_line: 2, data_line: 4`, "", "", ""), func(l *pipeline.Layout) {
			l.Delimiter, l.Decimal, l.Quote, l.PreambleEnds, l.UnitsLine, l.DataLine = ";", ",", "none", `^DATA "now"`, 2, 4
		}},
		{"widths", forms(`widths: [4, 5]`, `columns: [1], format: epoch, covers: instant`, "column: 2", `{column: 3, variable: air_temp, unit: degC}`), func(l *pipeline.Layout) {
			l.Delimiter, l.Widths, l.NamesLine, l.Time.Columns, l.Time.Format, l.Time.Zone = "", []int{4, 5}, 0, []string{"1"}, "epoch", "Z"
			l.Station.Constant, l.Station.Column, l.Values[0].Column = "", "2", "3"
		}},
		{"other names", forms("", `columns: [day, [hour, "1"]], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`, `column: [id, STN]`, `{column: [TAVG, TEMP MEAN, no], variable: air_temp, unit: degC, flag: {column: [f, F], marks: {E: estimated}}}`), func(l *pipeline.Layout) {
			l.Time.Columns, l.Time.Or = []string{"day", "hour"}, [][]string{nil, {"1"}}
			l.Station.Constant, l.Station.Column, l.Station.Or = "", "id", []string{"STN"}
			l.Values[0].Column, l.Values[0].Or = "TAVG", []string{"TEMP MEAN", "no"}
			l.Values[0].Flag = &pipeline.FlagColumn{Column: "f", Or: []string{"F"}, Empty: pipeline.QualityNotChecked, Marks: map[string]pipeline.Quality{"E": pipeline.QualityEstimated}}
		}},
		{"station from the preamble", forms(`delimiter: ",", names_line: 3`, "", `preamble: 'Id: (\w+)', map: {"1": TARN}`, ""), func(l *pipeline.Layout) {
			l.NamesLine, l.Station.Constant, l.Station.Preamble, l.Station.Map = 3, "", `Id: (\w+)`, map[string]string{"1": "TARN"}
		}},
		{"long form", forms("", "", "", `{column: v, when: {what: TA, unit: [C, ""], "1": "2"}, variable: air_temp, unit: degC}, {column: v, when: {what: TB}, variable: air_temp, unit: degC}`), func(l *pipeline.Layout) {
			l.Values[0].Column, l.Values[0].When = "v", map[string][]string{"what": {"TA"}, "unit": {"C", ""}, "1": {"2"}}
			l.Values = append(l.Values, l.Values[0])
			l.Values[1].When = map[string][]string{"what": {"TB"}}
		}},
		{"units and scale", forms(`delimiter: ",", names_line: 1, units_line: 2`, "", "", `{column: temp, variable: air_temp, unit: degF, unit_text: " Deg ", scale: 0.1, offset: -1e-3}`), func(l *pipeline.Layout) {
			l.UnitsLine, l.Values[0].Unit, l.Values[0].UnitText, l.Values[0].Scale, l.Values[0].Offset = 2, pipeline.DegF, " Deg ", 0.1, -1e-3
		}},
		{"named zone", forms("", `columns: [t], format: "YYYY-MM-DD hh:mm", zone: America/Edmonton, ambiguous: later, skipped: set_aside, covers: ending, span: 1h`, "", `{column: temp, variable: air_temp_mean, unit: degC}`), func(l *pipeline.Layout) {
			l.Time.Zone, l.Time.Ambiguous, l.Time.Skipped, l.Time.Covers, l.Time.SpanS = "America/Edmonton", pipeline.AmbiguousLater, pipeline.SkippedSetAside, pipeline.CoversEnding, 3600
			l.Values[0].Variable = "air_temp_mean"
		}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s, _, err := Parse("s", []byte(tt.text), "")
			if err != nil {
				t.Fatal(err)
			}
			want := pipeline.Layout{
				Name: "l", Delimiter: ",", NamesLine: 1, MaxSetAside: 0.2,
				Time:    pipeline.TimeColumns{Columns: []string{"t"}, Format: "YYYY-MM-DD hh:mm", Zone: "station", Covers: pipeline.CoversInstant},
				Station: pipeline.StationColumn{Constant: "TARN", Clocks: map[string]pipeline.StationClock{"TARN": {UTCOffsetS: -8 * 3600}}},
				Values:  []pipeline.ValueColumn{{Column: "temp", Variable: "air_temp", Unit: pipeline.DegC, Sensor: "air", LevelM: 1.5}},
			}
			tt.want(&want)
			if diff := cmp.Diff(want, s.Feeds[0].Layout); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
			again, _, err := Parse("s", []byte(s.Text()), "")
			if err != nil {
				t.Fatalf("not read again: %v\n%s", err, s.Text())
			}
			if diff := cmp.Diff(s.Layouts, again.Layouts) + cmp.Diff(s.Feeds, again.Feeds); again.Hash != s.Hash || diff != "" {
				t.Errorf("shown and read again (-first +second):\n%s\n%s", diff, s.Text())
			}
		})
	}
}

func TestFormsRefused(t *testing.T) {
	const at = "s:3:"
	value := func(more string) string {
		return forms("", "", "", "{column: temp, variable: air_temp, unit: degC, "+more+"}")
	}
	times := func(more string) string {
		return forms("", `format: "YYYY-MM-DD hh:mm", covers: instant, `+more, "", "")
	}
	tests := []struct{ name, text, says string }{
		{"decimal mark", forms(`delimiter: ";", names_line: 1, decimal: "'"`, "", "", ""), `layouts.l.decimal: "'" will not do; write "," for a decimal comma`},
		{"decimal comma and delimiter", forms(`delimiter: ",", names_line: 1, decimal: ","`, "", "", ""), `layouts.l.decimal: a comma cannot be both`},
		{"quote", forms(`delimiter: ",", names_line: 1, quote: double`, "", "", ""), `layouts.l.quote: "double" is not known; write none`},
		{"no delimiter and no widths", forms(`names_line: 1`, "", "", ""), "layouts.l.delimiter: it is missing"},
		{"delimiter and widths", forms(`delimiter: ",", widths: [1, 2], names_line: 1`, "", "", ""), "layouts.l.delimiter: widths part the columns"},
		{"delimiter that is empty", forms(`delimiter: , names_line: 1`, "", "", ""), "layouts.l.delimiter: it is missing"},
		{"width", forms(`widths: [1, 0], names_line: 1`, "", "", ""), `layouts.l.widths[1]: "0" will not do; write a whole number from 1`},
		{"widths", forms(`widths: 5, names_line: 1`, "", "", ""), `layouts.l.widths: "5" is not a list`},
		{"preamble", forms(`delimiter: ",", names_line: 1, preamble_ends: "("`, "", "", ""), `layouts.l.preamble_ends: "(" will not do`},
		{"data line", forms(`delimiter: ",", names_line: 1, data_line: -1`, "", "", ""), `layouts.l.data_line: "-1" will not do`},
		{"station without a group", forms(`delimiter: ",", names_line: 2`, "", "preamble: TARN", ""), `layouts.l.station.preamble: "TARN" will not do; write a regular expression with a group`},
		{"two stations", forms("", "", "preamble: (x), constant: TARN", ""), "layouts.l.station: 2 of them are given; give exactly one of column, file_name, preamble and constant"},
		{"empty list of names", value("flag: {column: []}"), "layouts.l.values[0].flag.column: it is missing"},
		{"name that is a mapping", value("flag: {column: {a: b}}"), "layouts.l.values[0].flag.column: a mapping is not a single value"},
		{"column of the time that is an empty list", times("zone: station, columns: [a, []]"), "layouts.l.time.columns[1]: a list is no column"},
		{"column of the time in a list in a list", times("zone: station, columns: [[a, [b]]]"), "layouts.l.time.columns[0][1]: a list is not a single value"},
		{"other name without names", forms(`delimiter: ","`, `columns: [1], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`, "", "{column: [2, temp], variable: air_temp, unit: degC}"), `column "temp" is called by name`},
		{"other name of the time without names", forms(`delimiter: ","`, `columns: [[1, day]], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`, "", "{column: 2, variable: air_temp, unit: degC}"), `column "day" is called by name`},
		{"condition by name without names", forms(`delimiter: ","`, `columns: [1], format: "YYYY-MM-DD hh:mm", zone: station, covers: instant`, "", "{column: 2, when: {what: T}, variable: air_temp, unit: degC}"), `column "what" is called by name`},
		{"condition without a text", value("when: {what: }"), "layouts.l.values[0].when.what: it is missing; write a text"},
		{"condition without texts", value("when: {what: []}"), "layouts.l.values[0].when.what: it is missing; write a text"},
		{"no condition", value("when: {}"), "layouts.l.values[0].when: it is missing"},
		{"condition that is none", value("when: T"), `layouts.l.values[0].when: "T" is not a mapping`},
		{"condition of no column", value(`when: {"": T}`), `layouts.l.values[0].when: a column has no name`},
		{"scale", value("scale: 0"), "layouts.l.values[0].scale: 0 would leave nothing of it"},
		{"offset", value("offset: x"), `layouts.l.values[0].offset: "x" will not do`},
		{"zone", times("columns: [t], zone: MST"), `layouts.l.time.zone: "MST" will not do; write station`},
		{"zone without rules", times("columns: [t], zone: America/Edmonton"), "layouts.l.time.ambiguous: it is missing; write one of earlier, later, set_aside"},
		{"rule", times("columns: [t], zone: America/Edmonton, ambiguous: earlier, skipped: later"), `layouts.l.time.skipped: "later" is not known; write one of shift, set_aside`},
		{"rule without a zone", times("columns: [t], zone: station, skipped: shift"), "layouts.l.time.skipped: only a named zone has hours"},
		{"zone of a count", forms("", `columns: [t], format: epoch, zone: station, covers: instant`, "", ""), "layouts.l.time.zone: epoch counts from 1970 in UTC; write Z"},
		{"day in a zone", forms("", `columns: [t], format: YYYY-MM-DD, zone: America/Edmonton, ambiguous: earlier, skipped: shift, covers: day`, "", `{column: temp, variable: air_temp_mean, unit: degC}`), "layouts.l.time.zone: a day is the station's day; write station"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			_, _, err := Parse("s", []byte(tt.text), "")
			if err == nil || !strings.Contains(err.Error(), tt.says) || !strings.HasPrefix(err.Error(), at) {
				t.Errorf("%v; want %q", err, tt.says)
			}
		})
	}
}
