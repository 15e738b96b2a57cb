package main

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// hourlySettings are those of one station with a file of instants; zone and
// what else the feed says are to be filled in.
const hourlySettings = `
data: data
stations:
  - {id: TARN, latitude: 69, longitude: -121, utc_offset: "+00:00", daily_mean: {rule: hourly, min_hours: 1, longest_hole: 23}}
layouts:
  instants:
    delimiter: ","
    names_line: 1
    time: {columns: [time], format: "YYYY-MM-DD hh:mm", zone: "%s", covers: instant}
    station: {constant: TARN}
    values: [{column: t, variable: air_temp, unit: degC}]
feeds:
  - {name: tarn, folder: feed, settle: 0s, layout: instants%s}
sites: []
`

// hours writes a file of hourly values on 10 July 2025 from an hour on.
func hours(from int, values ...float64) string {
	var b strings.Builder
	b.WriteString("time,t\n")
	for i, c := range values {
		fmt.Fprintf(&b, "2025-07-10 %02d:00,%.1f\n", from+i, c)
	}
	return b.String()
}

const readingsByHour = `select to_char(start_utc, 'DD HH24'), value_c, name from thaw.readings join thaw.batches using (batch_id) order by start_utc`

// A reread with a corrected zone leaves no reading of the old zone behind, the
// history shows both, and the tables are those of a load by the right layout.
func TestRereadWithAnotherZone(t *testing.T) {
	t.Parallel()
	files := map[string]string{"feed/a.csv": hours(0, 1, 2, 3, 4, 5, 6), "feed/b.csv": hours(6, 7, 8, 9)}
	right := newPlace(t, fmt.Sprintf(hourlySettings, "+03:00", ""), files)
	right.run(t, "run", "--until-idle")
	p := newPlace(t, fmt.Sprintf(hourlySettings, "-05:00", ""), files)
	p.run(t, "run", "--until-idle")
	if got := p.run(t, "feed", "reread", "tarn"); !strings.Contains(got, "reads no batch otherwise") {
		t.Errorf("by the same layout: %s", got)
	}
	p.settle(t, fmt.Sprintf(hourlySettings, "+03:00", ""))
	if got := p.run(t, "feed", "reread", "tarn"); strings.Count(got, "will be read again") != 2 {
		t.Errorf("reread: %s", got)
	}
	p.run(t, "run", "--until-idle")
	same := `select * from thaw.fingerprint_tables() where part in ('readings', 'daily_values', 'air_index_daily', 'air_index_season')`
	if diff := cmp.Diff(right.rows(t, same), p.rows(t, same)); diff != "" {
		t.Errorf("(-read rightly +read again):\n%s\n%v", diff, p.rows(t, readingsByHour))
	}
	// 00:00 at -05:00 is 05:00 UTC; its value 1 gave way to what +03:00 puts there, 00:00 - 3 h is 21:00 the day before
	if got := p.rows(t, `select count(*), count(*) filter (where replaced_by_row = 0), min(to_char(start_utc, 'DD HH24')) from thaw.readings_replaced`); got[0] != `(9,8,"10 05")` {
		t.Errorf("history %v; want nine values, eight of them withdrawn", got)
	}
	if got := p.run(t, "ledger"); !strings.Contains(got, "adds up") || !strings.Contains(got, "reread") {
		t.Errorf("ledger:\n%s", got)
	}
}

// What had lost against a batch, or was repeated by it, counts again where the
// batch, read again, has nothing.
func TestRereadGivesBack(t *testing.T) {
	t.Parallel()
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), map[string]string{"feed/a.csv": hours(0, 1, 1, 1, 1)})
	p.run(t, "run", "--until-idle")
	p.write(t, "feed/b.csv", hours(2, 1, 9, 9)) // at 02:00 the same, at 03:00 another value
	p.run(t, "run", "--until-idle")
	p.settle(t, fmt.Sprintf(hourlySettings, "-12:00", ""))
	p.run(t, "feed", "reread", "tarn", "2")
	p.run(t, "run", "--until-idle")
	want := []string{`("10 00",1,a.csv)`, `("10 01",1,a.csv)`, `("10 02",1,a.csv)`, `("10 03",1,a.csv)`,
		`("10 14",1,b.csv)`, `("10 15",9,b.csv)`, `("10 16",9,b.csv)`}
	if diff := cmp.Diff(want, p.rows(t, readingsByHour)); diff != "" {
		t.Error(diff)
	}
}

// A file that replaces its span withdraws what it does not repeat, whichever of
// two files comes first, and nothing outside its span.
func TestReplacesSpan(t *testing.T) {
	t.Parallel()
	older, newer := hours(0, 1, 2, 3, 4, 5, 6), "time,t\n2025-07-10 01:00,9\n2025-07-10 04:00,9\n"
	want := []string{`("10 00",1,a.csv)`, `("10 01",9,b.csv)`, `("10 04",9,b.csv)`, `("10 05",6,a.csv)`}
	settings := fmt.Sprintf(hourlySettings, "Z", ", replaces_span: true")
	for _, first := range []string{"a.csv", "b.csv"} {
		t.Run(first+" first", func(t *testing.T) {
			p := newPlace(t, settings, nil)
			files := []string{"a.csv", "b.csv"}
			if first == "b.csv" {
				slices.Reverse(files)
			}
			for _, name := range files {
				text := map[string]string{"a.csv": older, "b.csv": newer}[name]
				p.dated(t, "feed/"+name, text, map[string]int{"a.csv": 1, "b.csv": 2}[name])
				p.run(t, "run", "--until-idle")
			}
			if diff := cmp.Diff(want, p.rows(t, readingsByHour)); diff != "" {
				t.Error(diff)
			}
			if got := p.rows(t, `select to_char(start_utc, 'DD HH24'), value_c from thaw.readings_replaced order by 1`); len(got) != 4 {
				t.Errorf("history %v; want the four that lost", got)
			}
		})
	}
}

// A return to earlier bytes waits, and counts once it is asked for.
func TestWaitingBatchIsTaken(t *testing.T) {
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), nil)
	for day, text := range []string{hours(0, 1), hours(0, 2), hours(0, 1)} {
		p.dated(t, "feed/a.csv", text, day+1)
		p.run(t, "run", "--until-idle")
	}
	value := `select value_c from thaw.readings`
	if got := p.rows(t, value); got[0] != "(2)" {
		t.Errorf("before it is asked for: %v", got)
	}
	p.run(t, "feed", "take", "3")
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, value); got[0] != "(1)" {
		t.Errorf("after: %v", got)
	}
}
