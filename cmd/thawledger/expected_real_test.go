package main

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"
)

// warmAndColdYears is an invented record from 1985 to the end of July 2026: a
// yearly wave, each year as a whole warmer or colder than the wave by up to 2
// degC, the last one by 2.
func warmAndColdYears() string {
	var b strings.Builder
	b.WriteString("date,tmax,tmin\n")
	for d := time.Date(1985, 1, 15, 0, 0, 0, 0, time.UTC); d.Before(time.Date(2026, 8, 1, 0, 0, 0, 0, time.UTC)); d = d.AddDate(0, 0, 1) {
		year := d.AddDate(0, 0, -14).Year()
		warmer := float64(year*7%9)/2 - 2
		if year == 2026 {
			warmer = 2
		}
		c := -6 + 18*math.Cos(float64(d.YearDay()-200)/58.09) + warmer
		fmt.Fprintf(&b, "%s,%.1f,%.1f\n", d.Format(time.DateOnly), c+2, c-2)
	}
	return b.String()
}

// The daemon makes outlooks of its own accord, and the judge goes by one that has
// shown skill: the year stands at 880 degC.d by the end of July, 400 short,
// and past years have added some 250 to 550 from then on.
func TestExpectedFromFileToStanding(t *testing.T) {
	t.Parallel()
	settings := strings.Replace(outlookSettings, "index: 50,", "index: 1270,", 1)
	p := newPlace(t, settings, map[string]string{"feed/a.csv": warmAndColdYears()})
	p.run(t, "run", "--until-idle")
	got := p.rows(t, `select state, level, expected, expected_on = outlook_through, outlook_through, probability_low > 0.5, pass_day_50 between '2026-08-10' and '2026-10-01',
		(select count(*) from thaw.exceedances e where e.surface = s.surface and e.season_start = s.season_start and expected_on is not null)
		from thaw.standings s where surface = 'gravel' and season = '2026'`)
	if len(got) != 1 || got[0] != "(expected,within,t,t,2026-07-31,t,t,1)" {
		t.Errorf("standing: %v", got)
	}
	if got := p.rows(t, `select why, from_state, to_state from thaw.standing_changes where surface = 'gravel' and season_start = '2026-01-15' order by change_id`); fmt.Sprint(got) != `[("first judgement",,within) (outlook,within,expected)]` {
		t.Errorf("changes: %v", got)
	}
	shown := p.run(t, "standing", "strip")
	if !strings.Contains(shown, "expected") || !strings.Contains(shown, "2026-0") {
		t.Errorf("shown:\n%s", shown)
	}
	before := p.rows(t, `select thaw.fingerprint(), (select max(change_id) from thaw.standing_changes)`)
	p.run(t, "run", "--until-idle")
	if again := p.rows(t, `select thaw.fingerprint(), (select max(change_id) from thaw.standing_changes)`); fmt.Sprint(again) != fmt.Sprint(before) {
		t.Errorf("judged again: %v; want %v", again, before)
	}

	// The summer so far was wrong: what it let expect no longer holds.
	p.run(t, "edit", "exclude", "TARN", "--from", "2026-03-20", "--to", "2026-07-31", "--reason", "sensor in the sun")
	p.run(t, "run", "--until-idle")
	now := `select state, expected, day, outlook_through, probability_low < 0.5 from thaw.standings where surface = 'gravel' and season = '2026'`
	if got := p.rows(t, now); got[0] != "(within,f,2026-03-19,2026-03-19,t)" {
		t.Errorf("without the summer: %v", got)
	}
	// Too few past years are left for any outlook.
	p.run(t, "edit", "exclude", "TARN", "--from", "1985-01-01", "--to", "2012-07-31", "--reason", "another place")
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, now); got[0] != "(within,f,2026-03-19,,)" {
		t.Errorf("without past years: %v", got)
	}
}
