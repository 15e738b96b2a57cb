package propose

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

func TestWords(t *testing.T) {
	tests := []struct{ name, want string }{
		{"Max Temp (°C)", "max temp °c"},
		{"TMAX", "t max"},
		{"airtempmaxc", "air temp max c"},
		{"AirTC_Mean", "air t c mean"},
		{"T_DAILY_MEAN", "t daily mean"},
		{"SUR_TEMP_DAILY_MAX", "sur temp daily max"},
		{"dewpoint", "dewpoint"},
		{"Station Name", "station name"},
		{"TSUN", "tsun"},
		{"fm", "fm"},
		{"", ""},
	}
	for _, tt := range tests {
		if got := strings.Join(wordsOf(tt.name), " "); got != tt.want {
			t.Errorf("%q: words %q, want %q", tt.name, got, tt.want)
		}
	}
}

// hourly writes hourly rows below names; the cells of a row come from cell.
func hourly(names string, rows int, cell func(row int, name string) string) string {
	list := strings.Split(names, ",")
	text := names + "\n"
	for i := range rows {
		cells := []string{fmt.Sprintf("2031-05-%02d %02d:00", 13+i/24, i%24)}
		for _, n := range list[1:] {
			cells = append(cells, cell(i, n))
		}
		text += strings.Join(cells, ",") + "\n"
	}
	return text
}

func number(row int, _ string) string { return fmt.Sprint((row*7)%23 - 8) }

func TestWhichColumns(t *testing.T) {
	tests := []struct {
		name, names string
		want        []string
		ask         bool // what the columns are
	}{
		{name: "the temperature among others", names: "time,RH,AirTemp_C,DewPoint_C,WindChill_C,SoilTemp_C", want: []string{"AirTemp_C air_temp"}},
		{name: "two temperatures", names: "time,Temp2m_C,Temp10m_C", want: []string{"Temp2m_C air_temp"}, ask: true},
		{name: "an average is of a span", names: "time,AirTemp_C_Avg", want: []string{"AirTemp_C_Avg air_temp_mean"}},
		{name: "a unit only", names: "time,upper (degC),RH", want: []string{"upper (degC) air_temp"}, ask: true},
		{name: "values only", names: "time,a", want: []string{"a air_temp"}, ask: true},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, "f.csv", hourly(tt.names, 60, number))
			var got []string
			for _, v := range p.Layout.Values {
				got = append(got, v.Column+" "+v.Variable)
			}
			if diff := cmp.Diff(tt.want, got); diff != "" {
				t.Errorf("columns (-want +got):\n%s", diff)
			}
			if q := question(p, Variable); (q != nil) != tt.ask {
				t.Errorf("asked %+v", q)
			}
			if p.Read != 60 {
				t.Errorf("%d read: %s", p.Read, p.FirstSetAside)
			}
		})
	}
}

func TestMissing(t *testing.T) {
	tests := []struct {
		name, cell string
		every      int
		missing    []string
		ask        bool
		aside      int
	}{
		{name: "NaN", cell: "NaN", every: 10, missing: []string{"NaN"}},
		{name: "dashes", cell: "---", every: 10, missing: []string{"---"}},
		{name: "-9999.0", cell: "-9999.0", every: 10, missing: []string{"-9999.0"}, ask: true},
		{name: "once 999.9", cell: "999.9", every: 50, missing: []string{"999.9"}, ask: true},
		{name: "-99.9, near to cold", cell: "-99.9", every: 10, missing: []string{"-99.9"}, ask: true},
		{name: "a number of the logger's own, often", cell: "-555", every: 10, missing: []string{"-555"}, ask: true},
		{name: "a slip, once", cell: "151", every: 50, aside: 1},
		{name: "a slip below, once", cell: "-151", every: 50, aside: 1},
		{name: "a text nobody knows", cell: "err7", every: 50, ask: true, aside: 1},
		{name: "cold that is no code", cell: "-19", every: 10},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, "f.csv", hourly("time,temp_c", 60, func(row int, _ string) string {
				if row%tt.every == tt.every-1 {
					return tt.cell
				}
				return number(row, "")
			}))
			if got := p.Layout.Values[0].Missing; !slices.Equal(got, tt.missing) {
				t.Errorf("missing %q, want %q", got, tt.missing)
			}
			if q := question(p, Missing); (q != nil) != tt.ask {
				t.Errorf("asked %+v", q)
			}
			if p.SetAside != tt.aside {
				t.Errorf("%d set aside, want %d: %s", p.SetAside, tt.aside, p.FirstSetAside)
			}
		})
	}
}

func TestFlags(t *testing.T) {
	file := func(names string, flag func(row int) (value, flag string)) *Proposal {
		return mustLook(t, "f.csv", hourly(names, 60, func(row int, name string) string {
			v, f := flag(row)
			if name == "temp_c" {
				return v
			}
			return f
		}))
	}
	p := file("time,temp_c,temp_flag", func(row int) (string, string) {
		switch {
		case row%10 == 3:
			return "", "M"
		case row == 20:
			return "4.5", "E"
		case row == 30:
			return "4.5", "S"
		case row%2 == 0:
			return number(row, ""), "ok"
		}
		return number(row, ""), ""
	})
	want := &pipeline.FlagColumn{Column: "temp_flag", Empty: pipeline.QualityNotChecked,
		Marks: map[string]pipeline.Quality{"M": pipeline.QualityMissing, "E": pipeline.QualityEstimated, "ok": pipeline.QualityNotChecked}}
	if diff := cmp.Diff(want, p.Layout.Values[0].Flag); diff != "" {
		t.Errorf("flag (-want +got):\n%s", diff)
	}
	var asked string
	for _, q := range p.Questions {
		if q.About == Flag {
			asked += q.Text + "\n"
		}
	}
	for _, text := range []string{`"E"`, `"ok"`, `"S"`} {
		if !strings.Contains(asked, text) {
			t.Errorf("not asked of %s: %s", text, asked)
		}
	}
	if strings.Contains(asked, `"M"`) || p.SetAside != 1 {
		t.Errorf("asked %q, %d set aside", asked, p.SetAside)
	}
	// A column of many values is no flag, whatever its name.
	p = file("time,temp_c,temp_status", func(row int) (string, string) { return number(row, ""), fmt.Sprint(row) })
	if f := p.Layout.Values[0].Flag; f != nil {
		t.Errorf("flag %+v", f)
	}
}

// A line of names that has not as many columns as the rows is passed over.
func TestNamesOfAnotherWidth(t *testing.T) {
	rows := daily("", "2006-01-02", on(2031, 5, 1), 30, 0, 10)[1:]
	tests := []struct {
		name, text, comment string
		columns             []string
	}{
		{name: "a delimiter at the end of rows", text: "date,tmax_c,tmin_c\n" + strings.ReplaceAll(rows, "\n", ",\n"), comment: "date", columns: []string{"2", "3"}},
		{name: "names of several words", text: "Day of Max temp Min temp\n" + strings.ReplaceAll(rows, ",", " "), comment: "Day ", columns: []string{"2", "3"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, "f.csv", tt.text)
			if p.Layout.Comment != tt.comment || p.Layout.NamesLine != 0 || p.Read != 30 || p.SetAside != 0 {
				t.Errorf("comment %q, names line %d, %d read, %d set aside", p.Layout.Comment, p.Layout.NamesLine, p.Read, p.SetAside)
			}
			var got []string
			for _, v := range p.Layout.Values {
				got = append(got, v.Column)
			}
			if !slices.Equal(got, tt.columns) {
				t.Errorf("columns %q, want %q", got, tt.columns)
			}
			comesTrue(t, p)
		})
	}
}

func TestStationInName(t *testing.T) {
	tests := []struct{ file, id, expression string }{
		{"702754-99999.csv", "702754-99999", "^([0-9]+-[0-9]+)[.]csv$"},
		{"daily_YT_2100999_2031.csv", "2100999", "^[A-Za-z]+_[A-Za-z]+_([0-9]+)_[0-9]+[.]csv$"},
		{"tarn_2031.csv", "", ""},
		{"20310501.csv", "", ""},
		{"fell-2031-05.csv", "", ""},
		{"USX00026001.dly", "USX00026001", "^([A-Za-z]+[0-9]+)[.]dly$"},
		{"", "", ""},
	}
	for _, tt := range tests {
		if _, id, expression := idInName(tt.file); id != tt.id || expression != tt.expression {
			t.Errorf("%s: %q by %q, want %q by %q", tt.file, id, expression, tt.id, tt.expression)
		}
	}
}
