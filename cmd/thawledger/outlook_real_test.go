package main

import (
	"fmt"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

// outlookSettings have surfaces with design values of every sort on one station.
const outlookSettings = `
data: data
stations:
  - {id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {constant: TARN}
    values: [{column: tmax, variable: air_temp_max, unit: degC}, {column: tmin, variable: air_temp_min, unit: degC}]
feeds:
  - {name: tarn, folder: feed, settle: 0s, layout: daily}
sites:
  - id: strip
    station: TARN
    surfaces:
      - id: apron
        design_values:
          - {kind: freeze, definition: sum, of: air, direction: not_below, index: 8400, unit: K.h, source: invented}
      - id: gravel
        design_values:
          - {kind: thaw, definition: curve, of: air, direction: not_above, index: 50, unit: degC.d, source: invented}
      - id: runway
        n_factors: [{kind: thaw, value: 2, source: invented}]
        design_values:
          - {kind: thaw, definition: not_stated, of: surface, direction: not_above, index: 180, unit: degF.d, source: invented}
`

// filledDay has no value in everyThirdYear, and is filled on a straight line from
// the days beside it: an outlook as of it ends a day before.
const filledDay = "2020-05-21"

// everyThirdYear is a record from 15 January 1990 on in which every day is at -1
// degC but for 1 to 20 June, at 1, 2 and 3 degC in turn: indices of 20, 40 and 60.
func everyThirdYear(last string) string {
	var b strings.Builder
	b.WriteString("date,tmax,tmin\n")
	for d := time.Date(1990, 1, 15, 0, 0, 0, 0, time.UTC); d.Format(time.DateOnly) <= last; d = d.AddDate(0, 0, 1) {
		if d.Format(time.DateOnly) == filledDay {
			continue
		}
		c := -1
		if d.Month() == time.June && d.Day() <= 20 {
			c = 1 + (d.Year()-1990)%3
		}
		fmt.Fprintf(&b, "%s,%d,%d\n", d.Format(time.DateOnly), c+2, c-2)
	}
	return b.String()
}

// From a file to the outlooks of three design values, by hand: of thirty past
// years ten each come to 20, 40 and 60. So 50 is passed by ten, with a chance of
// 10.5/31, on 17 June (of 3 degC a day); 180 degF.d of the surface are 50 degC.d
// of the air. Every freeze year has 20 days of thaw, so that 2019-20 comes to 346
// degC.d by the sum, 8304 K.h, and falls short of 8400.
func TestOutlookFromFileToTable(t *testing.T) {
	t.Parallel()
	p := newPlace(t, outlookSettings, map[string]string{"feed/a.csv": everyThirdYear("2020-07-05")})
	p.run(t, "run", "--until-idle") // makes outlooks too
	// those of thirteen leads, raw and moved, from earlier and from other years, of two indices
	scored := `select count(*), max(made_at) from thaw.outlook_scores`
	scoredBefore := p.rows(t, scored)
	table := `select d.surface, o.definition, o.season, o.through_day, round(o.threshold_c_days::numeric, 6), o.n_factor, o.index_low_c_days,
		round((31 * o.probability)::numeric, 6), o.pass_day_10, o.pass_day_90, o.end_10_c_days, o.end_50_c_days, o.end_90_c_days, o.members, o.lead_month,
		o.passed, o.announced_allowed, (select count(*) from thaw.outlook_scores)
		from thaw.outlooks o join thaw.design_values d using (design_value_id) order by o.through_day, d.surface`

	shown := p.run(t, "outlook", "--as-of", filledDay)
	want := []string{
		"(apron,sum,2019-20,2020-05-20,350.000000,,311,0.500000,,,346,346,346,30,2,f,t,104)",
		"(gravel,curve,2020,2020-05-20,50.000000,,0,10.500000,2020-06-17,2020-06-17,20,40,60,30,8,f,f,104)",
		"(runway,curve,2020,2020-05-20,50.000000,2,0,10.500000,2020-06-17,2020-06-17,20,40,60,30,8,f,f,104)",
		"(apron,sum,2019-20,2020-07-05,350.000000,,337,0.500000,,,346,346,346,30,0,f,t,104)",
		"(gravel,curve,2020,2020-07-05,50.000000,,20,0.500000,,,20,20,20,30,6,f,t,104)",
		"(runway,curve,2020,2020-07-05,50.000000,2,20,0.500000,,,20,20,20,30,6,f,t,104)",
	}
	if diff := cmp.Diff(want, p.rows(t, table)); diff != "" {
		t.Errorf("(-want +got):\n%s\n%s", diff, shown)
	}
	if got := p.rows(t, scored); cmp.Diff(scoredBefore, got) != "" {
		t.Errorf("a record cut short has been scored: %s, before %s", got, scoredBefore)
	}
	for _, s := range []string{"passes 34 %", "falls short 98.4 %", "(surface 100)", "20, 40, 60", "no skill at this lead", "Screening figures"} {
		if !strings.Contains(shown, s) {
			t.Errorf("%q is not in\n%s", s, shown)
		}
	}

	// 2020 is a year of 20. In July that is known, and so it was in past Julys.
	shown = p.run(t, "outlook", "--station", "TARN")
	if got := p.rows(t, table); cmp.Diff(want, got) != "" {
		t.Errorf("made again (-want +got):\n%s\n%s", cmp.Diff(want, got), shown)
	}
	if !strings.Contains(shown, "passes 1.6 %") || !strings.Contains(shown, "1.00 (1.00 to 1.00)  yes") {
		t.Errorf("a surface that falls short is not expected to:\n%s", shown)
	}
	scores := p.rows(t, `select definition, years_from, which, min(lead_month), max(lead_month), max(years_used), bool_or(used) from thaw.outlook_scores
		group by 1, 2, 3 order by 1, 2, 3`)
	if len(scores) != 8 || scores[0] != "(curve,earlier,moved,0,12,20,f)" || scores[1] != "(curve,earlier,raw,0,12,20,t)" || scores[3] != "(curve,others,raw,0,12,30,f)" {
		t.Errorf("scores %v", scores)
	}

	told := p.run(t, "outlook", "hindcast", "--station", "TARN")
	for _, s := range []string{"30 seasons with a known index", "used: raw", "reliability", "Screening figures"} {
		if !strings.Contains(told, s) {
			t.Errorf("%q is not in\n%s", s, told)
		}
	}
}

// What cannot be made is said, and why.
func TestOutlookOfAShortRecord(t *testing.T) {
	p := newPlace(t, outlookSettings, map[string]string{"feed/a.csv": everyThirdYear("1996-05-05")})
	p.run(t, "run", "--until-idle")
	if got := p.run(t, "outlook"); !strings.Contains(got, "TARN: no thaw outlook of 1996: too few complete years: 6 of the 20 needed from 1996-05-06 on") {
		t.Errorf("%s", got)
	}
}
