package alerts

import (
	"fmt"
	"testing"

	"thawledger/pipeline"
)

// Thirty-one summers that all pass the design value come in one load: all are
// recorded, only the open one is told.
func TestLoadingHistory(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	for year := 2001; year <= 2031; year++ {
		w.set(t, "FELL", pipeline.Thaw, fmt.Sprintf("%d-01-15", year), year < 2031,
			at(fmt.Sprintf("%d-06-01", year), 80), at(fmt.Sprintf("%d-06-20", year), 120))
	}
	w.pass(t)
	if len(w.told) != 1 || w.told[0].SeasonStart != "2031-01-15" || w.told[0].To != pipeline.Exceeded {
		t.Errorf("told %+v", w.told)
	}
	same(t, "exceedances", w.Rows(t, `select closed_as, count(*), count(distinct season_start), count(*) filter (where exceeded_on = season_start + 156
		or exceeded_on = season_start + 157) from thaw.exceedances group by closed_as order by closed_as`),
		[]string{`("season over",30,30,30)`, "(,1,1,1)"}) // 20 June is 156 days after 15 January, 157 in leap years
	same(t, "changes", w.Rows(t, `select announce, announced_at is null, count(*) from thaw.standing_changes group by 1, 2 order by 1`),
		[]string{"(f,t,30)", "(t,f,1)"})
	same(t, "closed on", w.Rows(t, `select min(closed_on), max(closed_on) from thaw.exceedances`), []string{"(2002-01-14,2031-01-14)"})
}

// A season is told of while it is open, by its record and by the clock.
func TestWhatIsOpen(t *testing.T) {
	for _, tc := range []struct {
		name, today string
		over        bool
		told        int
	}{
		{"in summer", "2031-08-01", false, 1},
		{"the year's last day", "2032-01-14", false, 1},
		{"the next year's first day", "2032-01-15", false, 0},
		{"over by its record alone", "2032-01-14", true, 0},
		{"decades ago", "2061-08-01", false, 0},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, tc.today)
			w.state(t, strip(surface("apron", thaw(100))))
			w.set(t, "FELL", pipeline.Thaw, "2031-01-15", tc.over, at("2031-06-20", 120))
			w.pass(t)
			if got := w.heard(); len(got) != tc.told {
				t.Errorf("told %q, want %d", got, tc.told)
			}
			same(t, "recorded", w.Rows(t, `select to_state, announce from thaw.standing_changes`),
				[]string{fmt.Sprintf("(exceeded,%.1s)", fmt.Sprint(tc.told == 1))})
			same(t, "exceedance", w.Rows(t, `select exceeded_on from thaw.exceedances`), []string{"(2031-06-20)"})
		})
	}
}

// A correction in a season long over changes the record and is told to no one.
func TestCorrectionOfHistory(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 120))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 50))
	w.pass(t)
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 95))
	w.pass(t)
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 20))
	w.pass(t)
	same(t, "told", w.heard(), nil)
	same(t, "changes", w.Rows(t, `select season_start, from_state, to_state, why, announce from thaw.standing_changes order by change_id`), []string{
		`(2030-01-15,,exceeded,"first judgement",f)`, `(2031-01-15,,within,"first judgement",f)`,
		"(2030-01-15,exceeded,near,correction,f)", "(2030-01-15,near,within,correction,f)"})
	same(t, "exceedance", w.Rows(t, exceedanceSQL), []string{"(1,95,100,2031-01-14,2030-06-20,,withdrawn,2031-01-14)"})
}

// The end of a season is not a return to within, and a record that is cut back
// opens its exceedance again.
func TestSeasonReopens(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	closed := `select exceedance_id, closed_as, closed_on, closed_at is null from thaw.exceedances`
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 120))
	w.pass(t)
	same(t, "over", w.Rows(t, closed), []string{`(1,"season over",2031-01-14,f)`})
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", false, at("2030-06-20", 120))
	w.pass(t)
	same(t, "open again", w.Rows(t, closed), []string{"(1,,,t)"})
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 120))
	w.pass(t)
	same(t, "over again", w.Rows(t, closed), []string{`(1,"season over",2031-01-14,f)`})
	same(t, "changes", w.Rows(t, `select to_state from thaw.standing_changes`), []string{"(exceeded)"})
}

// Only seasons that a change may have touched are judged again; seasons that the
// record no longer has leave no standing.
func TestWhichSeasonsAreJudged(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	for _, year := range []string{"2029", "2030"} {
		w.set(t, "FELL", pipeline.Thaw, year+"-01-15", true, at(year+"-06-20", 120))
	}
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-01-20", 95))
	w.pass(t)
	judged := func(season string) string {
		t.Helper()
		return w.Rows(t, `select judged_at from thaw.standings where season_start = $1`, date(season).Time())[0]
	}
	a, b, c := judged("2029-01-15"), judged("2030-01-15"), judged("2031-01-15")
	w.exec(t, `insert into thaw.changes (station, from_day) values ('FELL', '2031-01-14')`) // the last day of 2030
	w.pass(t)
	if judged("2029-01-15") != a {
		t.Error("a season that was over before the change was judged again")
	}
	if judged("2030-01-15") == b || judged("2031-01-15") == c {
		t.Error("a season from the day of the change on was not judged again")
	}
	w.exec(t, `delete from thaw.air_index_season where season_start = '2031-01-15'`)
	w.exec(t, `delete from thaw.index_blocks where thaw_season = '2031-01-15'`)
	w.exec(t, `insert into thaw.changes (station, from_day) values ('FELL', '2031-01-14')`)
	w.pass(t)
	same(t, "standings", w.Rows(t, `select season from thaw.standings order by 1`), []string{"(2029)", "(2030)"})
	same(t, "exceedances", w.Rows(t, `select season_start, closed_as from thaw.exceedances order by 1`),
		[]string{`(2029-01-15,"season over")`, `(2030-01-15,"season over")`, "(2031-01-15,withdrawn)"})
}
