package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

// daily writes a file of days: names, then a row for each day, temperatures by a
// year's course around mean with amplitude, in the unit of the numbers.
func daily(names, layout string, from time.Time, days int, mean, amplitude float64) string {
	var b strings.Builder
	b.WriteString(names + "\n")
	for i := range days {
		d := from.AddDate(0, 0, i)
		v := mean + amplitude*math.Cos(2*math.Pi*float64(d.YearDay()-205)/365.25)
		fmt.Fprintf(&b, "%s,%.1f,%.1f\n", d.Format(layout), v+4+float64(i%3), v-4-float64(i%4))
	}
	return b.String()
}

func question(p *Proposal, about About) *Question {
	for i := range p.Questions {
		if p.Questions[i].About == about {
			return &p.Questions[i]
		}
	}
	return nil
}

func on(y, m, d int) time.Time { return time.Date(y, time.Month(m), d, 0, 0, 0, 0, time.UTC) }

func TestOrderOfDayAndMonth(t *testing.T) {
	tests := []struct {
		name, layout string
		from         time.Time
		days         int
		want         string
		options      []string // nil: not asked
	}{
		{name: "proven, day first", layout: "02/01/2006", from: on(2031, 3, 1), days: 20, want: "DD/MM/YYYY"},
		{name: "proven, month first", layout: "1/2/2006", from: on(2031, 3, 1), days: 20, want: "M/D/YYYY"},
		{name: "twelve days of a month", layout: "02/01/2006", from: on(2031, 3, 1), days: 12, want: "DD/MM/YYYY", options: []string{"DD/MM/YYYY", "MM/DD/YYYY"}},
		{name: "twelve days, month first", layout: "01.02.2006", from: on(2031, 3, 1), days: 12, want: "MM.DD.YYYY", options: []string{"MM.DD.YYYY", "DD.MM.YYYY"}},
		{name: "one row", layout: "02/01/2006", from: on(2031, 3, 4), days: 1, want: "DD/MM/YYYY", options: []string{"DD/MM/YYYY", "MM/DD/YYYY"}},
		{name: "no marks between", layout: "02012006", from: on(2031, 3, 1), days: 12, want: "DDMMYYYY", options: []string{"DDMMYYYY", "MMDDYYYY"}},
		{name: "year first is the order of the standard", layout: "2006-01-02", from: on(2031, 3, 1), days: 12, want: "YYYY-MM-DD"},
		{name: "short years", layout: "02.01.06", from: on(2011, 3, 1), days: 12, want: "DD.MM.YY", options: []string{"DD.MM.YY", "YY.MM.DD", "MM.DD.YY"}},
		{name: "short years, a year of days", layout: "06-01-02", from: on(2011, 1, 1), days: 365, want: "YY-MM-DD"},
		{name: "year, then day", layout: "2006-02-01", from: on(2031, 3, 1), days: 40, want: "YYYY-DD-MM"},
		{name: "year, then day, not proven", layout: "2006/02/01", from: on(2031, 3, 1), days: 12, want: "YYYY/DD/MM", options: []string{"YYYY/DD/MM", "YYYY/MM/DD"}},
		{name: "no leading zeros, none of them seen", layout: "2006-1-2", from: on(2031, 1, 10), days: 12, want: "YYYY-M-D"},
		{name: "day of the year", layout: "2006-002", from: on(2031, 3, 1), days: 30, want: "YYYY-DDD"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, "f.csv", daily("date,tmax_degC,tmin_degC", tt.layout, tt.from, tt.days, -4, 18))
			if got := p.Layout.Time.Format; got != tt.want {
				t.Errorf("format %q, want %q", got, tt.want)
			}
			q := question(p, DayOrder)
			switch {
			case q == nil && tt.options != nil:
				t.Error("nothing was asked")
			case q != nil && tt.options == nil:
				t.Errorf("asked needlessly: %s", q.Text)
			case q != nil && (!slices.Equal(slices.Sorted(slices.Values(q.Options)), slices.Sorted(slices.Values(tt.options))) || q.Chosen != tt.want):
				t.Errorf("options %q, chosen %q; want %q", q.Options, q.Chosen, tt.options)
			}
			if p.Read != tt.days {
				t.Errorf("%d of %d rows read", p.Read, tt.days)
			}
		})
	}
}

// Columns for day and month that could also be the day of the year.
func TestDayOrDayOfTheYear(t *testing.T) {
	january := "Year,Month,Day,Temp_C\n"
	for d := 1; d <= 28; d++ {
		january += fmt.Sprintf("2031,1,%d,%d\n", d, -20-d%5)
	}
	p := mustLook(t, "f.csv", january)
	if q := question(p, DayOrder); q == nil || len(q.Options) != 2 {
		t.Errorf("January alone does not tell the day from the day of the year; asked %+v", q)
	}
	p = mustLook(t, "f.csv", january+"2031,2,1,-20\n2031,2,2,-21\n2031,2,3,-25\n2031,2,4,-24\n")
	if q := question(p, DayOrder); q != nil || p.Layout.Time.Format != "YYYY M D" {
		t.Errorf("February tells it; format %q, asked %+v", p.Layout.Time.Format, q)
	}
	// Three days of March: by the day of the year they would be of January.
	march := strings.ReplaceAll(strings.Join(strings.SplitAfter(january, "\n")[:4], ""), ",1,", ",3,")
	p = mustLook(t, "f.csv", march)
	if q := question(p, DayOrder); q != nil || p.Layout.Time.Format != "YYYY M D" {
		t.Errorf("the month tells it; format %q, asked %+v", p.Layout.Time.Format, q)
	}
	// Without names the month is not taken for the day of the year.
	p = mustLook(t, "f.csv", strings.SplitN(january+"2031,2,1,-20\n2031,2,2,-21\n2031,2,3,-25\n", "\n", 2)[1])
	if q := question(p, DayOrder); q != nil || p.Layout.Time.Format != "YYYY M D" {
		t.Errorf("without names: format %q, asked %+v", p.Layout.Time.Format, q)
	}
}

// Times in several columns, to the last of them.
func TestTimesInSeveralColumns(t *testing.T) {
	tests := []struct{ name, header, format, columns, want string }{
		{name: "date and time", header: "Date,Time", format: "2006-01-02,15:04", columns: "Date Time", want: "YYYY-MM-DD hh:mm"},
		{name: "no marks", header: "utc_date,utc_time", format: "20060102,1504", columns: "utc_date utc_time", want: "YYYYMMDD hhmm"},
		{name: "to the hour", header: "Year,Month,Day,Hour", format: "2006,1,2,15", columns: "Year Month Day Hour", want: "YYYY M D hh"},
		{name: "to the minute", header: "YR,MO,DY,HR,MIN", format: "2006,1,2,15,04", columns: "YR MO DY HR MIN", want: "YYYY M D hh mm"},
		{name: "day of the year", header: "Year,DOY,Time", format: "2006,002,15:04", columns: "Year DOY Time", want: "YYYY DDD hh:mm"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			text := tt.header + ",temp_c\n"
			for i := range 60 {
				text += fmt.Sprintf("%s,%d\n", on(2031, 3, 13).Add(time.Duration(i)*time.Hour).Format(tt.format), i%17-3)
			}
			p := mustLook(t, "f.csv", text)
			if got := strings.Join(p.Layout.Time.Columns, " "); got != tt.columns || p.Layout.Time.Format != tt.want || p.Read != 60 {
				t.Errorf("%s by %q, %d read, want %s by %q", got, p.Layout.Time.Format, p.Read, tt.columns, tt.want)
			}
		})
	}
	// Minutes without a leading 0 are read by no layout: the rows that become one are told of.
	text := "Year,Month,Day,Hour,Minute,temp_c\n"
	for i := range 60 {
		at := on(2031, 3, 13).Add(time.Duration(i) * 15 * time.Minute)
		text += fmt.Sprintf("%s,%d,%d\n", at.Format("2006,1,2,15"), at.Minute(), i%17-3)
	}
	if p := mustLook(t, "f.csv", text); !strings.Contains(strings.Join(p.Notes, "\n"), "45 of 60 rows have the time of another") {
		t.Errorf("notes %q", p.Notes)
	}
}

func TestUnits(t *testing.T) {
	f := func(c float64) float64 { return c*1.8 + 32 }
	year := on(2031, 1, 1)
	tests := []struct {
		name, file string
		want       pipeline.TempUnit
		ask        bool
		text       string // in the question
	}{
		{name: "degC in the name", file: daily("date,Tmax (degC),Tmin (degC)", "2006-01-02", year, 365, -4, 18), want: pipeline.DegC},
		{name: "C in the name", file: daily("date,max_temp_c,min_temp_c", "2006-01-02", year, 365, -4, 18), want: pipeline.DegC},
		{name: "F in the name", file: daily("date,tmaxF,tminF", "2006-01-02", year, 365, f(-4), 18*1.8), want: pipeline.DegF},
		{name: "F in the name, and no weather for it", file: daily("date,tmaxF,tminF", "2006-01-02", year, 365, -4, 18), want: pipeline.DegF, ask: true, text: "and yet"},
		{name: "C in the name, and too hot for it", file: daily("date,tmax C,tmin C", "2006-01-02", year, 365, f(-4), 18*1.8), want: pipeline.DegC, ask: true, text: "and yet"},
		{name: "two units in the name", file: daily("date,tmax C or F,tmin C or F", "2006-01-02", year, 365, -4, 18), want: pipeline.DegC, ask: true, text: "does not say"},
		{name: "nothing said, degC by the year", file: daily("date,tmax,tmin", "2006-01-02", year, 365, -4, 18), want: pipeline.DegC, ask: true, text: "degC is likely"},
		{name: "nothing said, degF by the year", file: daily("date,tmax,tmin", "2006-01-02", year, 365, f(-4), 18*1.8), want: pipeline.DegF, ask: true, text: "degF is likely"},
		{name: "kelvin", file: daily("date,tmax,tmin", "2006-01-02", year, 365, -4+273.15, 18), want: pipeline.Kelvin, ask: true, text: "K is likely"},
		// A cool fortnight: 10 to 25 is a mild spell in degC and a cold one in degF.
		{name: "not to be told", file: daily("date,tmax,tmin", "2006-01-02", on(2031, 4, 1), 14, 18, 2), want: pipeline.DegC, ask: true, text: "nothing but their source tells"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			p := mustLook(t, "f.csv", tt.file)
			for _, v := range p.Layout.Values {
				if v.Unit != tt.want {
					t.Errorf("%s is %s, want %s", v.Column, v.Unit, tt.want)
				}
			}
			q := question(p, Unit)
			if (q != nil) != tt.ask {
				t.Fatalf("asked: %+v", q)
			}
			if q != nil && (!strings.Contains(q.Text, tt.text) || len(q.Options) != len(pipeline.TempUnits)) {
				t.Errorf("asked %q", q.Text)
			}
		})
	}
}

// Tenths are whole numbers.
func TestTenths(t *testing.T) {
	text := "date,tmax,tmin\n"
	for i := range 365 {
		v := -40 + int(180*math.Cos(2*math.Pi*float64(i-205)/365))
		text += fmt.Sprintf("%s,%d,%d\n", on(2031, 1, 1).AddDate(0, 0, i).Format("20060102"), v+40, v-50)
	}
	p := mustLook(t, "f.csv", text)
	if u := p.Layout.Values[0].Unit; u != pipeline.TenthsDegC || question(p, Unit) == nil {
		t.Errorf("unit %s, asked %v", u, question(p, Unit))
	}
}

func TestZones(t *testing.T) {
	tests := []struct {
		name, header, format, want string
		ask                        bool
	}{
		{name: "not said", header: "time,temp_c", format: "2006-01-02 15:04", want: "station", ask: true},
		{name: "Z in the text", header: "time,temp_c", format: "2006-01-02T15:04Z", want: "+00:00"},
		{name: "offset in the text", header: "time,temp_c", format: "2006-01-02T15:04:05-09:00", want: "-09:00"},
		{name: "in the name", header: "Date Time (UTC),temp_c", format: "2006-01-02 15:04", want: "+00:00"},
		{name: "offset in the name", header: `"Date Time, GMT-09:00",temp_c`, format: "01/02/2006 15:04", want: "-09:00"},
		{name: "joined in the name", header: "timeUTC,temp_c", format: "2006-01-02 15:04", want: "+00:00"},
		{name: "in a remark", header: "# logger clock is UTC-8\ntime,temp_c", format: "2006-01-02 15:04", want: "-08:00", ask: true},
		{name: "a word that only holds it", header: "# Outcome of brutcup\ntime,temp_c", format: "2006-01-02 15:04", want: "station", ask: true},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			text := tt.header + "\n"
			for i := range 48 {
				text += fmt.Sprintf("%s,%d\n", on(2031, 5, 13).Add(time.Duration(i)*time.Hour).Format(tt.format), i%17-3)
			}
			p := mustLook(t, "f.csv", text)
			if got := p.Layout.Time.Zone; got != tt.want {
				t.Errorf("zone %q, want %q", got, tt.want)
			}
			if q := question(p, Zone); (q != nil) != tt.ask {
				t.Errorf("asked %+v", q)
			}
			if p.Read != 48 {
				t.Errorf("%d rows read: %s", p.Read, p.FirstSetAside)
			}
		})
	}
}

// Days with a steady time of the day are read as days; whether they end then is asked.
func TestDaysWithATime(t *testing.T) {
	text := daily("time,tmax_c,tmin_c", "2006-01-02 07:00", on(2031, 5, 1), 30, 5, 10)
	p := mustLook(t, "f.csv", text)
	if p.Layout.Time.Format != "YYYY-MM-DD 07:00" || p.Layout.Time.Covers != pipeline.CoversDay || p.Read != 30 {
		t.Errorf("time %+v, %d read", p.Layout.Time, p.Read)
	}
	if q := question(p, Covers); q == nil || !strings.Contains(q.Text, "07:00") {
		t.Errorf("asked %+v", q)
	}
}
