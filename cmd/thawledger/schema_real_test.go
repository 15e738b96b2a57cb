package main

import (
	"bytes"
	"fmt"
	"strings"
	"testing"
)

// The schema can be brought up before anything else runs, and is then shown.
func TestSchemaApply(t *testing.T) {
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), nil)
	var out bytes.Buffer
	if status := (program{out: &out, err: &out}).main(t.Context(), []string{"schema", "--settings", p.settings}); status != 1 || !strings.Contains(out.String(), "thawledger schema apply") {
		t.Errorf("without a database: status %d, %s", status, out.String())
	}
	for _, args := range [][]string{{"schema", "apply"}, {"schema"}} {
		if got := p.run(t, args...); !strings.Contains(got, "0001_stations_and_sites") || strings.Contains(got, "not applied") || !strings.Contains(got, " UTC  ") {
			t.Errorf("%v:\n%s", args, got)
		}
	}
	p.write(t, "feed/a.csv", hours(0, 1))
	if got := p.run(t, "run", "--until-idle"); !strings.Contains(got, "fingerprint") {
		t.Errorf("run after it:\n%s", got)
	}
}

// A folder that is not there ends a run until idle soon, with its name.
func TestFolderThatIsNotThere(t *testing.T) {
	p := newPlace(t, fmt.Sprintf(hourlySettings, "Z", ""), nil)
	var out, log bytes.Buffer
	status := (program{out: &out, err: &log}).main(t.Context(), []string{"run", "--until-idle", "--settings", p.settings})
	if said := log.String(); status != 1 || !strings.Contains(said, "feeds cannot be read: look at feed tarn: open folder") || strings.Count(said, "\n") > 60 {
		t.Errorf("status %d\n%s", status, said)
	}
}
