package alerts

import (
	"fmt"
	"testing"

	"thawledger/pipeline"
)

// 1 degC.d = 1.8 degF.d = 24 K.h: a kelvin is a degree Celsius and 1.8 degrees
// Fahrenheit as an interval (BIPM SI Brochure, 9th edition, 2019, section 2.3.1;
// NIST SP 811, appendix B), a day has 24 hours.
func TestEqualDesignValues(t *testing.T) {
	for _, tc := range []struct {
		name                string
		cDays, fDays, hours float64
		days                []index
		want                string // of each
	}{
		{"a degree-day short", 1000, 1800, 24000, []index{at("2031-06-01", 899), at("2031-06-02", 999)}, "(near,2031-06-02,)"},
		{"reached to the last figure", 1000, 1800, 24000, []index{at("2031-06-01", 900), at("2031-06-02", 1000)}, "(exceeded,2031-06-01,2031-06-02)"},
		{"a small one", 35, 63, 840, []index{at("2031-06-01", 31.5), at("2031-06-02", 35)}, "(exceeded,2031-06-01,2031-06-02)"},
		{"a large one", 2755, 4959, 66120, []index{at("2031-06-01", 2479), at("2031-06-02", 2755)}, "(exceeded,2031-06-02,2031-06-02)"},
		{"in doubt", 1000, 1800, 24000, []index{between("2031-06-01", 800, 1000)}, "(unknown,,)"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, "2031-08-01")
			c, f, k := thaw(tc.cDays), thaw(tc.fDays), thaw(tc.hours)
			f.Unit, k.Unit = pipeline.DegFDays, pipeline.KelvinHours
			w.state(t, strip(surface("celsius", c), surface("fahrenheit", f), surface("kelvin", k)))
			w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, tc.days...)
			w.pass(t)
			same(t, "standings", w.Rows(t, `select state, near_on, exceeded_on from thaw.standings`), []string{tc.want, tc.want, tc.want})
			all := w.Rows(t, `select distinct on (design_c_days) design_c_days from thaw.standings`)
			same(t, "design values in degC.d", all, []string{fmt.Sprintf("(%g)", tc.cDays)})
		})
	}
}

// Indices of different definitions are never compared.
func TestDefinitions(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	curve, sum, open := thaw(1000), thaw(1000), thaw(1000)
	sum.Definition, open.Definition = pipeline.Sum, pipeline.NotStated
	onGround := open
	onGround.Of, onGround.Index = pipeline.OfSurface, 500
	ground := surface("ground", onGround)
	ground.Factors = []pipeline.NFactor{{Kind: pipeline.Thaw, From: date("1990-01-01"), Value: 0.5}}
	w.state(t, strip(surface("curve", curve), surface("sum", sum), surface("open", open), ground))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false,
		index{date("2031-06-01"), 880, 880, 1000, 1000}, index{date("2031-06-02"), 950, 1010, 1100, 1160})
	w.pass(t)
	same(t, "standings", w.Rows(t, `select surface, state, index_low_c_days, index_high_c_days, near_on, exceeded_on, sum_beside_c_days
		from thaw.standings order by surface`), []string{
		"(curve,unknown,950,1010,2031-06-02,,)",
		"(ground,unknown,475,505,2031-06-02,,550)",
		"(open,unknown,950,1010,2031-06-02,,1100)",
		"(sum,exceeded,1100,1160,2031-06-01,2031-06-01,)",
	})
}

// ground returns a surface whose design value limits the surface index.
func ground(d pipeline.DesignValue, factors ...pipeline.NFactor) pipeline.Surface {
	d.Of = pipeline.OfSurface
	s := surface("apron", d)
	s.Factors = factors
	return s
}

func factor(kind pipeline.Kind, from string, value float64) pipeline.NFactor {
	return pipeline.NFactor{Kind: kind, From: date(from), Value: value, Source: "trial field"}
}

// Past seasons are judged by the design value and the n-factor then in force.
func TestDatedDesignValues(t *testing.T) {
	for _, tc := range []struct {
		name    string
		surface pipeline.Surface
		want    []string
	}{
		{"one of old", surface("apron", thaw(100)),
			[]string{"(2027,120,100,,exceeded)", "(2028,120,100,,exceeded)", "(2029,120,100,,exceeded)", "(2030,120,100,,exceeded)"}},
		{"from a season's first day", surface("apron", thaw(100), from("2029-01-15", thaw(150))),
			[]string{"(2027,120,100,,exceeded)", "(2028,120,100,,exceeded)", "(2029,120,150,,within)", "(2030,120,150,,within)"}},
		{"from a day within a season it holds for the next", surface("apron", thaw(100), from("2029-01-16", thaw(150))),
			[]string{"(2027,120,100,,exceeded)", "(2028,120,100,,exceeded)", "(2029,120,100,,exceeded)", "(2030,120,150,,within)"}},
		{"three in turn", surface("apron", from("2028-01-01", thaw(130)), from("2030-01-01", thaw(110)), from("2029-01-01", thaw(150))),
			[]string{"(2028,120,130,,near)", "(2029,120,150,,within)", "(2030,120,110,,exceeded)"}},
		{"an n-factor from the start on, and another later", ground(thaw(100), factor(pipeline.Thaw, "2028-01-01", 0.5),
			factor(pipeline.Thaw, "2030-01-15", 1.5)),
			[]string{"(2028,60,100,0.5,within)", "(2029,60,100,0.5,within)", "(2030,180,100,1.5,exceeded)"}},
		{"an n-factor of the other kind is not for it", ground(thaw(100), factor(pipeline.Freeze, "2000-01-01", 2), factor(pipeline.Thaw, "2030-01-01", 1)),
			[]string{"(2030,120,100,1,exceeded)"}},
		{"a later one of another definition stands beside it", surface("apron", thaw(100), from("2029-01-01", sumOf(200))),
			[]string{"(2027,120,100,,exceeded)", "(2028,120,100,,exceeded)", "(2029,120,100,,exceeded)", "(2029,120,200,,within)",
				"(2030,120,100,,exceeded)", "(2030,120,200,,within)"}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			w := newWorld(t, "2031-08-01")
			w.state(t, strip(tc.surface))
			for _, year := range []string{"2027", "2028", "2029", "2030"} {
				w.set(t, "FELL", pipeline.Thaw, year+"-01-15", true, at(year+"-06-20", 120))
			}
			w.pass(t)
			sql := `select season, index_c_days, design_c_days, n_factor, state from thaw.standings order by season, design_c_days`
			same(t, "standings", w.Rows(t, sql), tc.want)
			// Stated bit by bit it comes to the same.
			w.state(t, strip(surface("apron", thaw(90), from("2028-06-01", thaw(300)))))
			w.pass(t)
			w.state(t, strip(tc.surface))
			w.pass(t)
			same(t, "standings after other settings", w.Rows(t, sql), tc.want)
		})
	}
}

func from(day string, d pipeline.DesignValue) pipeline.DesignValue {
	d.From = date(day)
	return d
}

func sumOf(cDays float64) pipeline.DesignValue {
	d := thaw(cDays)
	d.Definition = pipeline.Sum
	return d
}

// A design value that another replaces takes its standings along; what it was
// exceeded by stays on record.
func TestReplacedDesignValue(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 110))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	w.pass(t)
	w.heard()
	w.state(t, strip(surface("apron", thaw(115))))
	w.pass(t)
	same(t, "standings", w.Rows(t, `select design_c_days, season, state from thaw.standings order by season`),
		[]string{"(115,2030,near)", "(115,2031,exceeded)"})
	sql := `select design_c_days, season_start, index_c_days, closed_as, closed_on from thaw.exceedances order by exceedance_id`
	same(t, "exceedances", w.Rows(t, sql), []string{
		`(100,2030-01-15,110,"design value replaced",2031-01-14)`, `(100,2031-01-15,120,"design value replaced",2031-06-20)`,
		`(115,2030-01-15,110,"season over",2031-01-14)`, "(115,2031-01-15,120,,)"})
	same(t, "told", w.heard(), nil) // it stands as it stood
	before := w.everything(t)
	w.state(t, strip(surface("apron", thaw(115)))) // the same once more
	same(t, "lines in changes", w.Rows(t, `select * from thaw.changes`), nil)
	w.pass(t)
	same(t, "tables", w.everything(t), before)
}

// Sites that the settings name no longer are judged no more.
// Who was told that a surface is exceeded hears that by a higher value it is not.
func TestReplacedDesignValueIsTold(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	w.pass(t)
	w.heard()
	w.state(t, strip(surface("apron", thaw(500))))
	w.pass(t)
	same(t, "told", w.heard(), []string{"apron exceeded -> within, design value replaced"})
	w.state(t, strip(surface("apron", thaw(125))))
	w.pass(t)
	same(t, "told", w.heard(), []string{"apron within -> near, design value replaced"})
}

func TestDesignValueTakenOut(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	pad := pipeline.Site{ID: "pad", Station: "FELL", Surfaces: []pipeline.Surface{surface("berm", thaw(100))}}
	w.state(t, strip(surface("apron", thaw(100))), pad)
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	w.pass(t)
	w.state(t, pad)
	w.pass(t)
	same(t, "standings", w.Rows(t, `select site from thaw.standings`), []string{"(pad)"})
	same(t, "exceedances", w.Rows(t, `select site, closed_as from thaw.exceedances order by site`),
		[]string{"(pad,)", `(strip,"design value replaced")`})
}

// Another n-factor is a reason to judge all seasons again.
func TestReplacedNFactor(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(ground(thaw(100), factor(pipeline.Thaw, "1990-01-01", 1))))
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 110))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	w.pass(t)
	w.heard()
	w.state(t, strip(ground(thaw(100), factor(pipeline.Thaw, "1990-01-01", 0.75))))
	w.pass(t)
	same(t, "standings", w.Rows(t, `select season, n_factor, index_c_days, state from thaw.standings order by season`),
		[]string{"(2030,0.75,82.5,within)", "(2031,0.75,90,near)"})
	same(t, "exceedances", w.Rows(t, `select season_start, n_factor, index_c_days, exceeded_on, closed_as from thaw.exceedances order by season_start`),
		[]string{"(2030-01-15,1,110,2030-06-20,withdrawn)", "(2031-01-15,0.75,90,,)"})
	same(t, "told", w.heard(), []string{"apron exceeded -> near, correction"})
}

// A site that moves to another station is judged by that station alone.
func TestSiteChangesStation(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2030-01-15", true, at("2030-06-20", 110))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 120))
	w.set(t, "TARN", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 70))
	w.pass(t)
	w.heard()
	moved := strip(surface("apron", thaw(100)))
	moved.Station = "TARN"
	w.state(t, moved)
	w.pass(t)
	same(t, "standings", w.Rows(t, `select season, index_c_days, state from thaw.standings`), []string{"(2031,70,within)"})
	same(t, "told", w.heard(), []string{"apron exceeded -> within, correction"})
	same(t, "exceedances", w.Rows(t, `select season_start, closed_as from thaw.exceedances order by 1`),
		[]string{"(2030-01-15,withdrawn)", "(2031-01-15,withdrawn)"})
}
