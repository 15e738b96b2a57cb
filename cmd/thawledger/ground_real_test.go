package main

import (
	"bytes"
	"fmt"
	"regexp"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

// groundStation is the settings of an invented place whose ground is uniform; %s is
// the layers.
const groundStation = `
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
  - {name: tarn, folder: arrivals, settle: 0s, layout: daily}
sites:
  - id: strip
    station: TARN
    surfaces:
      - id: runway
        n_factors: [{kind: thaw, value: 1.2, source: invented}, {kind: freeze, value: 0.8, source: invented}]
        ground: [%s]
        design_values: [{kind: thaw, definition: curve, of: surface, direction: not_above, depth_m: 1.5, source: drawing 7}]
      - id: apron
        n_factors: [{kind: thaw, value: 1.2, source: invented}]
        design_values: [{kind: thaw, definition: curve, of: surface, direction: not_above, index: 900, unit: degC.d, source: drawing 7}]
`

const uniformGround = `{k_thawed_w_mk: 1, k_frozen_w_mk: 2, c_thawed_j_m3k: 2.8e6, c_frozen_j_m3k: 2e6, latent_j_m3: 1e8, source: boring 3}`

// groundWeather is 10 degC on the hundred days from 1 June on, and -15 degC else.
func groundWeather(from, to pipeline.Day) string {
	var b strings.Builder
	b.WriteString("date,tmax,tmin\n")
	for d := from; d <= to; d++ {
		year, _, _ := d.Date()
		low := -20
		if june := pipeline.DayOf(year, time.June, 1); d >= june && d < june+100 {
			low = 5
		}
		fmt.Fprintf(&b, "%s,%d,%d\n", d, low+10, low)
	}
	return b.String()
}

// TestGround has figures that can be worked by hand: 40 days of thaw at 10 degC, n
// 1.2, are 480 degC.d, and the depth sqrt(2 86400 480/1e8) = 0.91 m; 1.5 m take
// 1302.1 degC.d. Eleven complete years (three with a 29 February) have 1000 degC.d
// of thaw and 3975 + 45/11 of frost in the air.
func TestGround(t *testing.T) {
	p := newPlace(t, fmt.Sprintf(groundStation, uniformGround), map[string]string{
		"arrivals/a.csv": groundWeather(pipeline.DayOf(2014, time.January, 1), pipeline.DayOf(2026, time.July, 10)),
	})
	p.run(t, "run", "--until-idle")
	got := p.run(t, "ground")
	for _, want := range []string{
		"strip / runway: runway, on station TARN",
		`0\.00 down +stated +1\.00, 2\.00 +2\.80, 2\.00 +100\.0 +boring 3`,
		`thaw 2026 \(open, through 2026-07-10\), surface index n 1\.2 times curve index of the air`,
		`index +480\.0 +0\.91 +0\.\d\d \(mean of the year -8\.2 degC, season 40 days, alpha 0\.68, lambda 0\.\d\d\)`,
		`design depth 1\.5 m: reached by a surface index of 1302\.1 degC\.d, of which 36\.9 % gone`,
		// 3975 0.8 = 3180 of the 1200/2 that freeze sqrt(2 86400 1200/1e8) = 1.44 m
		`freeze-back, freeze 2025-26 \(open, through 2026-07-10\): 530\.0 % of what freezes thaw 2025 again`,
		`needed 600\.0 degC\.d; surface freezing index so far 3180\.0 degC\.d; thaw 2025 had reached 1\.44 m`,
		`means of 11 complete years from 2014 to 2024, sum indices: frost number of the air 0\.666`,
		`surface: frost number 0\.620, mean annual temperature -5\.43 degC`,
		`TTOP -7\.08 degC \(permafrost\), with conductivities 1\.00 thawed, 2\.00 frozen down to 1\.44 m`,
		// Neumann's exact depth after 40 days of 12 degC over ground that is at the
		// surface's -12 degC, or at the mean of -7.08: 0.634 and 0.716 m
		`by a model of heat conduction: 0\.(6[3-9]|7[01]) m \(settled after \d+ mean years, then the year before as it was`,
		regexp.QuoteMeta(pipeline.Caution) + "\n$",
	} {
		if !regexp.MustCompile(want).MatchString(got) {
			t.Errorf("no %q in\n%s", want, got)
		}
	}
	if strings.Contains(got, "apron") {
		t.Errorf("a surface without ground is shown:\n%s", got)
	}
	// the depth is judged as the index that reaches it
	if rows := p.rows(t, `select round(design_c_days::numeric, 1), source like 'drawing 7 [1.5 m of thaw,%' from thaw.design_values where surface = 'runway'`); len(rows) != 1 || rows[0] != "(1302.1,t)" {
		t.Errorf("design value %v", rows)
	}
	if got := p.run(t, "standing"); !strings.Contains(got, "at most 1302") {
		t.Errorf("standing:\n%s", got)
	}
	var out, log bytes.Buffer
	if status := (program{out: &out, err: &log}).main(t.Context(), []string{"ground", "--surface", "apron", "--settings", p.settings}); status != 1 || !strings.Contains(log.String(), "has its ground") {
		t.Errorf("of a surface without ground: status %d, %s", status, log.String())
	}
}

// A young record and a gap: what cannot be said is said to be so, and nothing is
// made up.
func TestGroundOfYoungRecord(t *testing.T) {
	settings := strings.Replace(fmt.Sprintf(groundStation, uniformGround), "value: 1.2,", "value: 1.2, low: 1.1, high: 1.4,", 1)
	p := newPlace(t, settings, map[string]string{
		"arrivals/a.csv": groundWeather(pipeline.DayOf(2024, time.January, 1), pipeline.DayOf(2026, time.June, 4)),
		"arrivals/b.csv": groundWeather(pipeline.DayOf(2026, time.June, 14), pipeline.DayOf(2026, time.July, 10)),
	})
	p.run(t, "run", "--until-idle")
	got := p.run(t, "ground", "--site", "strip")
	for _, want := range []string{
		// the n-factor's range, and 9 days of which each was from -15 to 10 degC: 1.1
		// times the 27 days after them, 1.4 times all 40
		`surface index n 1\.2 \(1\.1 to 1\.4\) times curve index of the air, 9 days missing`,
		`low +297\.0 .*\n +middle .*\n +high +560\.0 +0\.98 `,
		`by a model of heat conduction: none: days are missing from 2026-01-15 to 2026-07-10`,
		`want 10 complete years, and there are 1; of single years, only as an index, not as a measure of permafrost:`,
		// sqrt(3975)/(sqrt(3975) + sqrt(1000)), and with 0.8 and 1.2, by hand
		`2024 +1000\.0 +3975\.0 +0\.666 +0\.619`,
	} {
		if !regexp.MustCompile(want).MatchString(got) {
			t.Errorf("no %q in\n%s", want, got)
		}
	}
}

// What only the arithmetic of the ground can refuse is a fault of the settings, with
// its place.
func TestGroundThatCannotBe(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	for ground, says := range map[string]string{
		`{texture: fine, dry_density_kg_m3: 1500, water_pct_dry: 4, method: kersten, source: s}`:                                        `settings.yaml:20:18: sites[0].surfaces[0].ground[0]: water content in % of the dry mass, for Kersten's formula for fine soil, is 4; it has to be 7 or more`,
		`{thickness_m: 1, k_thawed_w_mk: 1, k_frozen_w_mk: 2, c_thawed_j_m3k: 2.8e6, c_frozen_j_m3k: 2e6, latent_j_m3: 1e8, source: s}`: `design_values[0].depth_m: a depth of 1.5 m: it is below the last layer of the profile`,
		`{thickness_m: 2, k_thawed_w_mk: 1, k_frozen_w_mk: 2, c_thawed_j_m3k: 2.8e6, c_frozen_j_m3k: 2e6, latent_j_m3: 0, source: s}`:   `thaw is past 1.5 m at once: the ground above is dry`,
	} {
		p.settings = p.write(t, "settings.yaml", fmt.Sprintf(groundStation, ground))
		var out, log bytes.Buffer
		if status := (program{out: &out, err: &log}).main(t.Context(), []string{"settings", "check", "--settings", p.settings}); status != 1 || !strings.Contains(log.String(), says) {
			t.Errorf("status %d, %s; want %q", status, log.String(), says)
		}
	}
}
