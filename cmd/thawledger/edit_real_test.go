package main

import (
	"bytes"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// Edits change the days that they speak of, show who and why, and leave no trace
// once undone.
func TestEdits(t *testing.T) {
	t.Parallel()
	// two days by the clock of the station, UTC; three hours of each
	file := hours(0, 1, 2, 3) + "2025-07-11 00:00,10.0\n2025-07-11 01:00,10.0\n2025-07-11 02:00,40.0\n"
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), map[string]string{"feed/a.csv": file})
	p.run(t, "run", "--until-idle")
	tables := `select * from thaw.fingerprint_tables() where part in ('readings', 'daily_values', 'air_index_daily', 'air_index_season')`
	before := p.rows(t, tables)
	means := `select to_char(day, 'DD'), mean_c, quality from thaw.daily_values where day >= '2025-07-09' and origin = 1 order by day`
	for _, step := range []struct {
		args string
		want []string
	}{
		// the mean of 10 and 10; of 1, 2, 3
		{"exclude TARN --from 2025-07-11T02:00Z --to 2025-07-11T03:00Z --reason sun", []string{"(10,2,0)", "(11,10,0)"}},
		{"offset TARN --from 2025-07-10 --to 2025-07-10 --add 0.5 --reason drift", []string{"(10,2.5,5)", "(11,10,0)"}},
		// an hour back: 00:00 of the 11th becomes 23:00 of the 10th, (1.5 + 2.5 + 3.5 + 10)/4
		{"shift TARN --from 2025-07-11T00:00Z --to 2025-07-11T01:00Z --add -1h --reason clock", []string{"(10,4.375,5)", "(11,10,0)"}},
	} {
		p.run(t, append([]string{"edit"}, strings.Fields(step.args)...)...)
		p.run(t, "run", "--until-idle")
		if diff := cmp.Diff(step.want, p.rows(t, means)); diff != "" {
			t.Errorf("%s (-want +got):\n%s", step.args, diff)
		}
	}
	if got := p.run(t, "edit", "list"); !strings.Contains(got, "shift -1h0m0s") || !strings.Contains(got, "drift") {
		t.Errorf("list:\n%s", got)
	}
	for n := range 3 {
		p.run(t, "edit", "undo", fmt.Sprint(n+1), "--reason", "a trial", "--author", "A. Ledgerwood")
	}
	p.run(t, "run", "--until-idle")
	if diff := cmp.Diff(before, p.rows(t, tables)); diff != "" {
		t.Errorf("undone (-before +after):\n%s", diff)
	}
	if got := p.run(t, "edit", "list", "TARN"); strings.Count(got, "by A. Ledgerwood: a trial") != 3 {
		t.Errorf("list:\n%s", got)
	}
}

// A day's value that was typed wrongly is replaced; a day without one gets one.
func TestEditReplaces(t *testing.T) {
	blocks := readme(t)
	p := newPlace(t, blocks["yaml"][0], map[string]string{"arrivals/tarn_2025.csv": blocks["csv"][0]})
	p.run(t, "run", "--until-idle")
	p.run(t, "edit", "replace", "TARN", "--day", "2025-06-02", "--variable", "air_temp_max", "--value", "10.2", "--reason", "a letter for a digit")
	p.run(t, "edit", "replace", "TARN", "--day", "2025-06-08", "--variable", "air_temp_max", "--value", "9", "--reason", "field book")
	p.run(t, "edit", "replace", "TARN", "--day", "2025-06-08", "--variable", "air_temp_min", "--value", "1", "--reason", "field book")
	p.run(t, "run", "--until-idle")
	got := p.rows(t, `select to_char(day, 'MM-DD'), mean_c, origin, quality from thaw.daily_values where day in ('2025-06-02', '2025-06-08') order by day`)
	// (10.2 + 2.8)/2 and (9 + 1)/2
	if diff := cmp.Diff([]string{"(06-02,6.5,1,5)", "(06-08,5,1,5)"}, got); diff != "" {
		t.Error(diff)
	}
}

func TestEditRefuses(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	p.settle(t, fmt.Sprintf(hourlySettings, "Z", ""))
	for _, c := range []struct{ args, says string }{
		{"exclude TARN --from 2025-07-11 --to 2025-07-12", "--reason is missing"},
		{"exclude TRAN --from 2025-07-11 --to 2025-07-12 --reason x", `no station "TRAN"`},
		{"exclude TARN --from 2025-07-12 --to 2025-07-11 --reason x", "not after --from"},
		{"exclude TARN --from yesterday --to 2025-07-11 --reason x", `--from: "yesterday"`},
		{"exclude TARN --from 2025-07-11 --to 2025-07-12 --add 1 --reason x", "--add: it goes with"},
		{"offset TARN --from 2025-07-11 --to 2025-07-12 --reason x", "--add: it goes with"},
		{"offset TARN --from 2025-07-11 --to 2025-07-12 --add NaN --reason x", "no temperature"},
		{"shift TARN --from 2025-07-11 --to 2025-07-12 --add 1 --reason x", "no duration"},
		{"replace TARN --day 2025-07-11 --variable air_temp --value 1 --reason x", "air_temp_max"},
		{"undo x --reason y", "not the number"},
	} {
		var out bytes.Buffer
		status := (program{out: &out, err: &out}).main(t.Context(), append(append([]string{"edit"}, strings.Fields(c.args)...), "--settings", p.settings))
		if status != 1 || !strings.Contains(out.String(), c.says) {
			t.Errorf("%s: status %d, %s; want %q", c.args, status, out.String(), c.says)
		}
	}
}
