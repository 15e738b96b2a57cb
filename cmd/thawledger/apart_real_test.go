package main

import (
	"bytes"
	"context"
	"fmt"
	"net"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"thawledger/pipeline/localpg"
)

const apartSettings = `
data: %s
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
  - {name: tarn, folder: %s, settle: 0s, layout: daily}
sites: []
`

// TestStagesApart runs ingest in one process and everything else in another,
// which share a database and a bus.
func TestStagesApart(t *testing.T) {
	free, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	address := free.Addr().String()
	free.Close()
	hub := newPlace(t, fmt.Sprintf(apartSettings, "data", "nothing")+"\nbus: {listen: \""+address+"\"}\n", nil)
	if err := os.Mkdir(filepath.Join(hub.dir, "nothing"), 0o755); err != nil {
		t.Fatal(err)
	}
	daemon := hub.start(t, "run")
	url := localpg.DSN(hub.postgresql(), "postgres")
	outpost := filepath.Join(hub.dir, "outpost.yaml")
	hub.write(t, "outpost.yaml", fmt.Sprintf(apartSettings, "outpost", "arrivals")+
		fmt.Sprintf("\nstore: {url: %q}\nbus: {url: \"nats://%s\", replicas: 1}\n", url, address))
	hub.write(t, "arrivals/a.csv", "date,tmax,tmin\n2025-05-28,6.0,-1.0\n2025-05-29,7.0,1.0\n")

	ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
	defer cancel()
	var out, log bytes.Buffer
	for { // until the hub is up
		out.Reset()
		log.Reset()
		if (program{out: &out, err: &log}).main(ctx, []string{"run", "--only", "ingest", "--until-idle", "--settings", outpost}) == 0 {
			break
		}
		if ctx.Err() != nil {
			t.Fatalf("%s%s\nhub:\n%s", out.String(), log.String(), daemon.said())
		}
	}
	if !strings.Contains(out.String(), "adds up") {
		t.Errorf("ledger:\n%s", out.String())
	}
	if err := daemon.cmd.Process.Signal(syscall.SIGTERM); err != nil {
		t.Fatal(err)
	}
	<-daemon.ended
	if daemon.err != nil || !strings.Contains(daemon.said(), `"msg":"stopped"`) {
		t.Errorf("hub ended with %v\n%s", daemon.err, daemon.said())
	}
	// (6 - 1)/2 + (7 + 1)/2 = 6.5, by hand
	if got := hub.rows(t, `select thaw_sum_low_c_days, thaw_curve_low_c_days from thaw.air_index_daily where day = '2025-05-29'`); len(got) != 1 || got[0] != "(6.5,6.5)" {
		t.Errorf("indices %v; want 6.5 by both definitions", got)
	}
}

// A stage alone is of no use without a database and a bus that others share.
func TestOnlyIsRefused(t *testing.T) {
	p := &place{dir: publicFolder(t)}
	p.settings = p.write(t, "settings.yaml", fmt.Sprintf(apartSettings, "data", "arrivals"))
	for only, says := range map[string]string{"ingest": "store.url", "ingest,thaw": `no stage "thaw"`} {
		var out, log bytes.Buffer
		if status := (program{out: &out, err: &log}).main(t.Context(), []string{"run", "--only", only, "--settings", p.settings}); status != 1 || !strings.Contains(log.String(), says) {
			t.Errorf("--only %s: status %d, %s; want %q", only, status, log.String(), says)
		}
	}
	if _, err := os.Stat(filepath.Join(p.dir, "data")); !os.IsNotExist(err) {
		t.Error("something was started")
	}
}
