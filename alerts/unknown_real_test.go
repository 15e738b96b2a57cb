package alerts

import (
	"testing"

	"thawledger/pipeline"
)

// Gaps open a season to doubt, and what arrives for them closes it.
func TestGaps(t *testing.T) {
	before := []index{at("2031-06-01", 50), at("2031-06-02", 80)}
	gap := between("2031-06-03", 82, 105)
	passed, doubt := at("2031-06-03", 100), between("2031-06-04", 100, 150)
	for _, tc := range []struct {
		name      string
		steps     [][]index // what there is of the season after what has been before
		standings []string  // after each
		heard     []string  // after all
	}{
		{
			"what was missing is past the design value", [][]index{{gap}, {at("2031-06-03", 102)}},
			[]string{"(unknown,within,t,82,105,,,)", "(exceeded,exceeded,f,102,102,102,2031-06-03,2031-06-03)"},
			[]string{"apron within -> unknown, gap", "apron unknown -> exceeded, gap closed"},
		},
		{
			"what was missing is within", [][]index{{gap}, {at("2031-06-03", 85)}},
			[]string{"(unknown,within,t,82,105,,,)", "(within,within,f,85,85,85,,)"},
			[]string{"apron within -> unknown, gap", "apron unknown -> within, gap closed"},
		},
		{
			"passed without doubt while the gap is open", [][]index{{gap}, {gap, between("2031-06-04", 100, 123)}},
			[]string{"(unknown,within,t,82,105,,,)", "(exceeded,exceeded,f,100,123,,2031-06-04,2031-06-04)"},
			[]string{"apron within -> unknown, gap", "apron unknown -> exceeded, gap closed"},
		},
		{
			"a gap after the design value was passed is no doubt",
			[][]index{{passed}, {passed, doubt}, {passed, doubt, between("2031-06-05", 110, 160)}},
			[]string{"(exceeded,exceeded,f,100,100,100,2031-06-03,2031-06-03)", "(exceeded,exceeded,f,100,150,,2031-06-03,2031-06-03)",
				"(exceeded,exceeded,f,110,160,,2031-06-03,2031-06-03)"},
			[]string{"apron within -> exceeded, progress"},
		},
		{
			"a gap too small to hide a crossing", [][]index{{between("2031-06-03", 82, 99.9)}},
			[]string{"(within,within,f,82,99.9,,,)"}, nil,
		},
		{
			"a gap that may just reach it", [][]index{{between("2031-06-03", 82, 100)}},
			[]string{"(unknown,within,t,82,100,,,)"}, []string{"apron within -> unknown, gap"},
		},
		{
			"near stays known behind the doubt", [][]index{{at("2031-06-03", 91)}, {at("2031-06-03", 91), between("2031-06-04", 91, 101)}},
			[]string{"(near,near,f,91,91,91,2031-06-03,)", "(unknown,near,t,91,101,,2031-06-03,)"},
			[]string{"apron within -> near, progress", "apron near -> unknown, gap"},
		},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, "2031-08-01")
			w.state(t, strip(surface("apron", thaw(100))))
			w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, before...)
			w.pass(t)
			for i, days := range tc.steps {
				w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, append(before[:2:2], days...)...)
				w.pass(t)
				same(t, "standing", w.Rows(t, `select state, level, straddles, index_low_c_days, index_high_c_days, index_c_days,
					near_on, exceeded_on from thaw.standings`), tc.standings[i:i+1])
			}
			same(t, "told", w.heard(), tc.heard)
		})
	}
}

// Doubt alone opens no exceedance, and ends none.
func TestDoubtAndExceedances(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-02", 80), between("2031-06-03", 82, 105))
	w.pass(t)
	same(t, "exceedances while unknown", w.Rows(t, exceedanceSQL), nil)
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-02", 80), between("2031-06-03", 82, 105), between("2031-06-04", 92, 115))
	w.pass(t)
	same(t, "exceedances while near or past", w.Rows(t, exceedanceSQL), []string{"(1,,100,2031-06-04,2031-06-04,,,)"})
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-02", 80), at("2031-06-03", 102), at("2031-06-04", 112))
	w.pass(t)
	same(t, "exceedances when it is known", w.Rows(t, exceedanceSQL), []string{"(1,112,100,2031-06-04,2031-06-03,2031-06-03,,)"})
	if a := w.told[len(w.told)-1]; a.To != pipeline.Exceeded || a.Exceedance != 1 || a.ExceededOn != "2031-06-03" || *a.IndexCDays != 112 {
		t.Errorf("told %+v", a)
	}
	if a := w.told[0]; a.To != pipeline.Unknown || a.IndexCDays != nil || a.LowCDays != 82 || a.HighCDays != 105 || a.Exceedance != 0 {
		t.Errorf("told %+v", a)
	}
}

// A season that ends in doubt stays so until the days arrive; then it is history.
func TestSeasonOverInDoubt(t *testing.T) {
	w := newWorld(t, "2032-02-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", true, between("2031-06-03", 82, 105))
	w.pass(t)
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", true, at("2031-06-03", 101))
	w.pass(t)
	same(t, "changes", w.Rows(t, `select from_state, to_state, why, announce from thaw.standing_changes order by change_id`),
		[]string{`(,unknown,"first judgement",f)`, `(unknown,exceeded,"gap closed",f)`})
	same(t, "exceedance", w.Rows(t, exceedanceSQL), []string{`(1,101,100,2032-01-14,2031-06-03,2031-06-03,"season over",2032-01-14)`})
}

// What must freeze enough: open until its end, told only if it falls short.
func TestNotBelow(t *testing.T) {
	type step struct {
		today string
		over  bool
		days  []index
		want  string
	}
	early := step{"2031-12-01", false, []index{at("2031-11-30", 40)}, "(unknown,within,2031-11-30,f)"}
	short := []index{at("2031-11-30", 40), at("2032-04-30", 99)}
	for _, tc := range []struct {
		name       string
		steps      []step
		heard      []string
		exceedance []string
	}{
		{
			"reached while open",
			[]step{early, {"2032-05-01", false, []index{at("2031-11-30", 40), at("2032-04-01", 100)}, "(within,within,2032-04-01,f)"}},
			nil, nil,
		},
		{
			"far past it", []step{early, {"2032-05-01", false, []index{at("2032-04-01", 900)}, "(within,within,2032-04-01,f)"}},
			nil, nil,
		},
		{
			"falls short, known on the last day of telling",
			[]step{early, {"2032-08-28", true, short, "(fell_short,within,2032-07-14,f)"}}, // 14 July + 45 days
			[]string{"apron unknown -> fell_short, progress"},
			[]string{`(99,2032-07-14,,t,"season over",2032-07-14)`},
		},
		{
			"falls short, known a day later",
			[]step{early, {"2032-08-29", true, short, "(fell_short,within,2032-07-14,f)"}}, nil,
			[]string{`(99,2032-07-14,,t,"season over",2032-07-14)`},
		},
		{
			"not over by its record though the year is gone",
			[]step{early, {"2032-08-01", false, short, "(unknown,within,2032-04-30,f)"}}, nil, nil,
		},
		{
			"first judged when it was over",
			[]step{{"2032-07-20", true, short, "(fell_short,within,2032-07-14,f)"}}, nil,
			[]string{`(99,2032-07-14,,t,"season over",2032-07-14)`},
		},
		{
			"over with a gap, which then closes",
			[]step{early, {"2032-07-20", true, []index{between("2032-04-30", 99, 130)}, "(unknown,within,2032-07-14,t)"},
				{"2032-08-01", true, short, "(fell_short,within,2032-07-14,f)"}},
			[]string{"apron unknown -> fell_short, gap closed"},
			[]string{`(99,2032-07-14,,t,"season over",2032-07-14)`},
		},
		{
			"fell short, then a correction reaches it",
			[]step{early, {"2032-07-20", true, short, "(fell_short,within,2032-07-14,f)"},
				{"2032-08-01", true, []index{at("2032-04-30", 101)}, "(within,within,2032-07-14,f)"}},
			[]string{"apron unknown -> fell_short, progress", "apron fell_short -> within, correction"},
			[]string{`(99,2032-07-14,,t,withdrawn,2032-07-14)`},
		},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, "2031-12-01")
			w.state(t, strip(surface("apron", freeze(100))))
			for _, s := range tc.steps {
				w.today = date(s.today)
				w.set(t, "FELL", pipeline.Freeze, "2031-07-15", s.over, s.days...)
				w.pass(t)
				same(t, "standing on "+s.today, w.Rows(t, `select state, level, day, straddles from thaw.standings`), []string{s.want})
			}
			same(t, "told", w.heard(), tc.heard)
			same(t, "exceedance", w.Rows(t, `select index_c_days, through_day, exceeded_on, fell_short, closed_as, closed_on
				from thaw.exceedances`), tc.exceedance)
			same(t, "never", w.Rows(t, `select * from thaw.standing_changes where to_state in ('exceeded', 'near')`), nil)
		})
	}
}

// Until its end is known, the current standing of what must freeze enough is
// that of the last season.
func TestNotBelowCurrentStanding(t *testing.T) {
	w := newWorld(t, "2031-12-01")
	w.state(t, strip(surface("apron", freeze(100))))
	w.set(t, "FELL", pipeline.Freeze, "2030-07-15", true, at("2031-03-01", 80))
	w.set(t, "FELL", pipeline.Freeze, "2031-07-15", false, at("2031-11-30", 40))
	w.pass(t)
	now := `select season, state from thaw.standing_now`
	same(t, "now", w.Rows(t, now), []string{"(2030-31,fell_short)"})
	w.set(t, "FELL", pipeline.Freeze, "2031-07-15", false, at("2031-11-30", 40), at("2032-03-01", 104))
	w.pass(t)
	same(t, "now", w.Rows(t, now), []string{"(2031-32,within)"})
}
