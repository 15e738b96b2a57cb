package alerts

import (
	"fmt"
	"math/rand/v2"
	"slices"
	"testing"

	"thawledger/pipeline"
)

const (
	standingSQL   = `select state, level, day, index_c_days, near_on, exceeded_on, confirmed_on from thaw.standings order by season_start, surface`
	exceedanceSQL = `select exceedance_id, index_c_days, design_c_days, through_day, near_on, exceeded_on, closed_as, closed_on
		from thaw.exceedances order by exceedance_id`
	changeSQL = `select change_id, exceedance_id, from_state, to_state, why, day, index_c_days, exceeded_on, announce
		from thaw.standing_changes order by change_id`
)

// A summer that passes the design value, told as it goes.
func TestDayByDay(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	summer := []index{at("2031-06-01", 50), at("2031-06-02", 90), at("2031-06-03", 99.5), at("2031-06-04", 100), at("2031-06-05", 120)}
	for i, want := range []struct {
		standing, exceedance string
		heard                []string
	}{
		{"(within,within,2031-06-01,50,,,)", "", nil},
		{"(near,near,2031-06-02,90,2031-06-02,,)", "(1,90,100,2031-06-02,2031-06-02,,,)", []string{"apron within -> near, progress"}},
		{"(near,near,2031-06-03,99.5,2031-06-02,,)", "(1,99.5,100,2031-06-03,2031-06-02,,,)", nil},
		{"(exceeded,exceeded,2031-06-04,100,2031-06-02,2031-06-04,2031-06-04)", "(1,100,100,2031-06-04,2031-06-02,2031-06-04,,)",
			[]string{"apron near -> exceeded, progress"}},
		{"(exceeded,exceeded,2031-06-05,120,2031-06-02,2031-06-04,2031-06-04)", "(1,120,100,2031-06-05,2031-06-02,2031-06-04,,)", nil},
	} {
		w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, summer[:i+1]...)
		w.pass(t)
		same(t, "standing", w.Rows(t, standingSQL), []string{want.standing})
		var exceedances []string
		if want.exceedance != "" {
			exceedances = []string{want.exceedance}
		}
		same(t, "exceedance", w.Rows(t, exceedanceSQL), exceedances)
		same(t, "told", w.heard(), want.heard)
	}
	same(t, "changes", w.Rows(t, changeSQL), []string{
		`(1,,,within,"first judgement",2031-06-01,50,,f)`,
		`(2,1,within,near,progress,2031-06-02,90,,t)`,
		`(3,1,near,exceeded,progress,2031-06-04,100,2031-06-04,t)`,
	})
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", true, summer...)
	w.pass(t)
	same(t, "exceedance at the season's end", w.Rows(t, exceedanceSQL),
		[]string{`(1,120,100,2032-01-14,2031-06-02,2031-06-04,"season over",2032-01-14)`})
	same(t, "told at the season's end", w.heard(), nil)
}

// Every stored figure follows from the indices, the n-factor and the design
// value; SQL works them out a second time.
func TestTraceable(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	d := thaw(100)
	d.Of = pipeline.OfSurface
	apron := surface("apron", d)
	apron.Factors = []pipeline.NFactor{{Kind: pipeline.Thaw, From: date("1990-01-01"), Value: 1.25, Source: "trial field"}}
	w.state(t, strip(apron))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 40), at("2031-06-02", 71), at("2031-06-03", 73),
		at("2031-06-04", 79), at("2031-06-05", 80), between("2031-06-06", 80, 84), between("2031-06-07", 90, 94.5))
	w.pass(t)
	again := w.Rows(t, `with x as (
			select d.design_value_id, d.design_c_days, d.near_share, n.n_factor, i.thaw_season as season_start, i.day,
			       n.n_factor * i.thaw_curve_low_c_days as low, n.n_factor * i.thaw_curve_high_c_days as high
			from thaw.design_values d join thaw.n_factors n using (site, surface, kind) join thaw.sites s using (site)
			join thaw.air_index_daily i using (station))
		select design_value_id, season_start, max(day) as through_day, max(low) as low, max(high) as high, design_c_days, n_factor,
		       min(day) filter (where low >= near_share * design_c_days) as near_on, min(day) filter (where low >= design_c_days) as exceeded_on
		from x group by design_value_id, season_start, design_c_days, n_factor`)
	same(t, "worked out again", again, []string{"(1,2031-01-15,2031-06-07,112.5,118.125,100,1.25,2031-06-03,2031-06-05)"})
	same(t, "standing", w.Rows(t, `select design_value_id, season_start, day, index_low_c_days, index_high_c_days, design_c_days, n_factor,
		near_on, exceeded_on from thaw.standings`), again)
	same(t, "exceedance", w.Rows(t, `select design_value_id, season_start, through_day, index_low_c_days, index_high_c_days, design_c_days,
		n_factor, near_on, exceeded_on from thaw.exceedances`), again)
	same(t, "change", w.Rows(t, `select c.to_state, c.exceedance_id = e.exceedance_id, c.index_low_c_days, c.index_high_c_days, c.design_c_days,
		c.exceeded_on, c.index_c_days from thaw.standing_changes c join thaw.exceedances e using (design_value_id)`),
		[]string{"(exceeded,t,112.5,118.125,100,2031-06-05,)"})
	for _, table := range []string{"standings", "exceedances"} {
		same(t, "days in "+table, w.Rows(t, `select days_interpolated, days_missing from thaw.`+table), []string{"(1,2)"})
	}
}

// A correction takes an exceedance back: it stays on record, and is cited.
func TestWithdrawal(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	for i, step := range []struct {
		cDays      float64
		exceedance []string
		heard      []string
		cites      int64
	}{
		{105, []string{"(1,105,100,2031-06-02,2031-06-02,2031-06-02,,)"}, []string{"apron -> exceeded, first judgement"}, 1},
		{95, []string{"(1,95,100,2031-06-02,2031-06-02,,,)"}, []string{"apron exceeded -> near, correction"}, 1},
		{101, []string{"(1,101,100,2031-06-02,2031-06-02,2031-06-02,,)"}, []string{"apron near -> exceeded, correction"}, 1},
		{80, []string{"(1,101,100,2031-06-02,2031-06-02,2031-06-02,withdrawn,2031-06-02)"}, []string{"apron exceeded -> within, correction"}, 1},
		{103, []string{"(1,101,100,2031-06-02,2031-06-02,2031-06-02,withdrawn,2031-06-02)", "(2,103,100,2031-06-02,2031-06-02,2031-06-02,,)"},
			[]string{"apron within -> exceeded, correction"}, 2},
	} {
		w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 60), at("2031-06-02", step.cDays))
		w.pass(t)
		same(t, fmt.Sprint("exceedances ", i), w.Rows(t, exceedanceSQL), step.exceedance)
		if n := len(w.told); n != 1 || w.told[0].Exceedance != step.cites {
			t.Errorf("step %d: told %+v, want exceedance %d", i, w.told, step.cites)
		}
		same(t, fmt.Sprint("told ", i), w.heard(), step.heard)
	}
	same(t, "changes", w.Rows(t, `select exceedance_id, from_state, to_state, why from thaw.standing_changes order by change_id`), []string{
		`(1,,exceeded,"first judgement")`, "(1,exceeded,near,correction)", "(1,near,exceeded,correction)",
		"(1,exceeded,within,correction)", "(2,within,exceeded,correction)"})
}

// A correction takes a season below although the season has gone on since.
func TestWithdrawalWhileTheSeasonGoesOn(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 60), at("2031-06-02", 105))
	w.pass(t)
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 60), at("2031-06-02", 70), at("2031-06-03", 80))
	w.pass(t)
	same(t, "told", w.heard(), []string{"apron -> exceeded, first judgement", "apron exceeded -> within, correction"})
	same(t, "exceedances", w.Rows(t, exceedanceSQL), []string{"(1,105,100,2031-06-02,2031-06-02,2031-06-02,withdrawn,2031-06-03)"})
}

// everything is all that judging writes, clock times left out where judging
// again may set them.
func (w *world) everything(t *testing.T) []string {
	t.Helper()
	return slices.Concat(
		w.Rows(t, `select * from thaw.fingerprint_tables()`),
		w.Rows(t, `select (to_jsonb(e) - 'changed_at')::text from thaw.exceedances e order by exceedance_id`),
		w.Rows(t, `select c::text from thaw.standing_changes c order by change_id`),
	)
}

func TestJudgingAgainChangesNothing(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	reached := freeze(90)
	w.state(t, strip(surface("apron", thaw(100)), surface("deep", thaw(130))), pipeline.Site{ID: "pad", Station: "TARN",
		Surfaces: []pipeline.Surface{surface("berm", reached)}})
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-01", 60), at("2030-06-02", 107))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 60), between("2031-06-02", 105, 131))
	w.set(t, "TARN", pipeline.Freeze, "2029-07-15", true, at("2029-12-01", 60))
	w.set(t, "TARN", pipeline.Freeze, "2030-07-15", false, at("2030-12-01", 60))
	w.pass(t)
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-01", 60), at("2030-06-02", 80))
	w.pass(t)
	same(t, "states", w.Rows(t, `select surface, season, state from thaw.standings order by site, surface, season`), []string{
		"(berm,2029-30,fell_short)", "(berm,2030-31,unknown)", "(apron,2030,within)", "(apron,2031,exceeded)", "(deep,2030,within)", "(deep,2031,unknown)"})
	before := w.everything(t)
	w.heard()
	w.exec(t, `insert into thaw.changes (station, from_day) values ('FELL', '2031-06-02'), ('FELL', '0001-01-01'), ('TARN', '0001-01-01')`)
	w.pass(t)
	same(t, "tables", w.everything(t), before)
	same(t, "told", w.heard(), nil)
	same(t, "lines left in changes", w.Rows(t, `select * from thaw.changes`), nil)
}

// However a record came about, day by day and with corrections, standings and
// exceedances in force are those of one judgement of the whole.
func TestWayThereLeavesNoTrace(t *testing.T) {
	for seed := range uint64(4) {
		t.Run(fmt.Sprint("seed ", seed), func(t *testing.T) {
			random := rand.New(rand.NewPCG(seed, 1))
			sites := []pipeline.Site{strip(surface("apron", thaw(100)), surface("deep", thaw(250)))}
			slow, quick := newWorld(t, "2031-08-01"), newWorld(t, "2031-08-01")
			slow.state(t, sites...)
			quick.state(t, sites...)
			starts := []string{"2029-01-15", "2030-01-15", "2031-01-15"}
			type held struct {
				over bool
				days []index
			}
			last := map[string]held{}
			for range 12 {
				start := starts[random.IntN(len(starts))]
				h := held{over: random.IntN(2) == 0}
				first, low, doubt := date(start)+100, 0.0, 0.0
				for n := range 1 + random.IntN(8) {
					low += float64(random.IntN(60))
					if random.IntN(4) == 0 {
						doubt += float64(random.IntN(40))
					}
					h.days = append(h.days, between((first+pipeline.Day(n)).String(), low, low+doubt))
				}
				last[start] = h
				slow.set(t, "FELL", pipeline.Thaw, start, h.over, h.days...)
				slow.pass(t)
			}
			for start, h := range last {
				quick.set(t, "FELL", pipeline.Thaw, start, h.over, h.days...)
			}
			quick.pass(t)
			sql := `select * from thaw.fingerprint_tables() where part in ('standings', 'exceedances')`
			same(t, "tables", slow.Rows(t, sql), quick.Rows(t, sql))
			same(t, "standings", slow.Rows(t, standingSQL), quick.Rows(t, standingSQL))
		})
	}
}
