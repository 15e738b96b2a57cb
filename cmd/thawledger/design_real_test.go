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

const designSettings = `
data: data
stations:
  - {id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}
  - {id: MERE, latitude: 69, longitude: -120, utc_offset: "-08:00", daily_mean: max_min}
layouts:
  daily:
    delimiter: ","
    names_line: 1
    time: {columns: [date], format: YYYY-MM-DD, zone: station, covers: day}
    station: {column: station}
    values: [{column: tmax, variable: air_temp_max, unit: degC}, {column: tmin, variable: air_temp_min, unit: degC}]
feeds:
  - {name: both, folder: feed, settle: 0s, layout: daily}
sites:
  - id: strip
    station: TARN
    surfaces:
      - id: runway
        n_factors: [{kind: thaw, value: 1.3, source: assumed}, {kind: freeze, value: 0.5, source: assumed}]
        design_values:
          - {kind: thaw, definition: not_stated, of: surface, direction: not_above, index: 4450, unit: degF.d, source: "drawing 7"}
          - {kind: freeze, definition: curve, of: surface, direction: not_below, index: 1050, unit: degC.d, source: "drawing 8"}
      - id: apron
`

// statedYet stands in for the value that is computed in the test.
const statedYet = `        design_values: [{kind: thaw, definition: curve, of: air, direction: not_above, index: 9999, unit: degC.d, source: "none yet"}]
`

// Example of 30 thawing indices, worked independently: the three warmest are 1957,
// 1941 and 1922, their mean is 1940.0. Rule: US Army TM 5-852-1. Here they are the
// summers of 1994 to 2023.
var designThirty = []float64{
	1812, 1755, 1900, 1688, 1734, 1922, 1850, 1795, 1766, 1701, 1880, 1843, 1779, 1811, 1690, 1745, 1798,
	1864, 1957, 1722, 1835, 1788, 1810, 1770, 1899, 1941, 1756, 1803, 1868, 1830,
}

// designRecord invents a station's days: summers of 150 days that rise and fall by
// equal steps and have those indices, winters of -10 degC; some days are left out.
// The summer of 2024 is like that of 1994 and breaks off.
func designRecord(station string, from, to pipeline.Day) string {
	var b strings.Builder
	for d := pipeline.DayOf(1994, time.January, 15); d < pipeline.DayOf(2024, time.July, 20); d++ {
		if from <= d && d <= to {
			continue
		}
		year, _, _ := d.Date()
		mean := -10.0
		if i := int(d - pipeline.DayOf(year, time.May, 10)); 0 <= i && i < 150 {
			mean = designThirty[(year-1994)%30] * float64(min(i+1, 150-i)) / (75 * 76)
		}
		fmt.Fprintf(&b, "%s,%s,%.6f,%.6f\n", d, station, mean+4, mean-4)
	}
	return b.String()
}

// fails runs a command that must fail, and returns what it said.
func (p *place) fails(t *testing.T, args ...string) string {
	t.Helper()
	var out, log bytes.Buffer
	if status := (program{out: &out, err: &log}).main(t.Context(), append(args, "--settings", p.settings)); status == 0 {
		t.Fatalf("%v: did not fail\n%s", args, out.String())
	}
	return out.String() + log.String()
}

func says(t *testing.T, what, text string, wants ...string) {
	t.Helper()
	blanks := regexp.MustCompile(`[ \t]+`)
	for _, want := range wants {
		if !strings.Contains(blanks.ReplaceAllString(text, " "), want) {
			t.Errorf("%s does not say %q:\n%s", what, want, text)
		}
	}
}

// TestDesign computes a design value from a record with gaps, puts what is printed
// into the settings, and holds the record against it.
func TestDesign(t *testing.T) {
	t.Parallel()
	july := func(year, d int) pipeline.Day { return pipeline.DayOf(year, time.July, d) }
	files := map[string]string{
		"feed/tarn.csv": "date,station,tmax,tmin\n" + designRecord("TARN", july(2008, 20), july(2008, 25)), // a cool summer
		"feed/mere.csv": "date,station,tmax,tmin\n" + designRecord("MERE", july(2012, 20), july(2012, 31)), // the warmest
	}
	p := newPlace(t, designSettings+statedYet, files)
	p.run(t, "run", "--until-idle")

	compute := []string{"design", "compute", "--kind", "thaw", "--definition", "curve", "--author", "A. Person"}
	of := func(station string, more ...string) []string {
		return append(append(append([]string{}, compute...), "--station", station), more...)
	}
	three := p.run(t, of("TARN", "--by", "three-warmest")...)
	says(t, "three warmest", three, "design value: 1940.0 degC.d, mean of the three warmest of the latest 30 seasons",
		"seasons used: 2012 (1957.0), 2019 (1941.0), 1999 (1922.0)", "1994 to 2023, 30 seasons, of 29 the index is known",
		"1 season not over: never counts", "not among the warmest whatever their missing days were: 2008 (",
		"of some 20 to 25 years, and not of 100", "index: 1940.0", "GEV", "Gumbel", "normal", "Pearson III", pipeline.Caution)
	block := three[strings.Index(three, "        design_values:"):strings.Index(three, pipeline.Caution)]
	says(t, "block", block, "computed once from the record of station TARN", "period 1994 to 2023", "2012 (1957.0), 2019 (1941.0), 1999 (1922.0); by A. Person, 20")

	open := p.fails(t, of("MERE", "--by", "three-warmest")...)
	says(t, "a warm summer with a gap", open, "no design value: it is open between ", "possibly among the warmest: 2012 (", "--without")
	if strings.Contains(open, "index:") {
		t.Errorf("a block for a value that is open:\n%s", open)
	}
	// The latest 10 are 2014 to 2023; the warmest of them is 1941.
	says(t, "warmest of ten", p.run(t, of("MERE", "--by", "warmest-of-ten")...), "design value: 1941.0 degC.d", "2014 to 2023", "seasons used: 2019 (1941.0)")
	says(t, "return period", p.run(t, of("MERE", "--by", "return-period", "--years", "100", "--distribution", "gumbel", "--without", "2012")...),
		"return period 100 years by Gumbel, L-moments", "without 2012; by A. Person", "more than twice the record", "fits by L-moments to 29 seasons")
	for says, args := range map[string][]string{
		"--author is missing": {"design", "compute", "--station", "TARN", "--kind", "thaw", "--definition", "curve", "--by", "three-warmest"},
		"--years 0":           of("TARN", "--by", "return-period"),
		"--distribution":      of("TARN", "--by", "three-warmest", "--distribution", "gev"),
		"no such thaw season": of("TARN", "--by", "three-warmest", "--without", "1887"),
		"there is no station": of("NOWHERE", "--by", "three-warmest"),
	} {
		if got := p.fails(t, args...); !strings.Contains(got, says) {
			t.Errorf("%v: %s; want %q", args, got, says)
		}
	}

	p.settle(t, designSettings+block)
	says(t, "settings check", p.run(t, "settings", "check"), "no faults", "3 design values")
	p.run(t, "run", "--until-idle")
	apron := p.run(t, "design", "--site", "strip", "--surface", "apron", "--years", "10")
	says(t, "apron", apron, "strip / apron: thaw index of the air, curve", "at most 1940.0 degC.d", "29 seasons of TARN, 1994 to 2023",
		"1 left out: 2008 (6 days missing, 1663 to 1713)", "2024 is not over and does not count", "2 of 29 seasons reached or passed it: 2012 (1957), 2019 (1941)",
		"number 3 of 30", "Mann-Kendall p", "starts in 2024", "latest 30 years, 1994 to 2023, 29 seasons", "counted 2 passed: 8.3 %",
		"along the trend, 1994 to 2023, 29 seasons", "10 years of service are taken to remain", pipeline.Caution)
	if strings.Contains(apron, "runway") {
		t.Errorf("another surface:\n%s", apron)
	}
	// 4450 degF.d are 2472.2 degC.d; 1.3 times 1922, 1941 and 1957 are above it, 1.3 times 1900 is not.
	runway := p.run(t, "design", "--surface", "runway")
	says(t, "runway", runway, "at most 2472.2 degC.d (4450 degF.d as stated), from \"drawing 7\"", "surface index = 1.3 x air index in every season",
		"3 of 29 seasons reached or passed it: 1999 (2499), 2012 (2544), 2019 (2523)", "does not state the definition",
		"at least 1050.0 degC.d", "none of 30 seasons fell short of it", "30 seasons of TARN, 1994-95 to 2023-24; 1 of them with missing days", "30 years of service are taken to remain", "by the n-factor now in force (\"assumed\")")
	says(t, "unknown site", p.fails(t, "design", "--site", "nowhere"), "no design value is in force for site \"nowhere\"")
	says(t, "a record too short", p.fails(t, of("MERE", "--by", "three-warmest", "--without", "2012")...), "has 29 seasons that are over", "--by warmest-of-ten")
}
