package alerts

import (
	"context"
	"encoding/json"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/nats-io/nats.go"

	"thawledger/pipeline"
	"thawledger/pipeline/bus"
)

// A nudge on the real bus has what has changed judged, and a subscriber hears of
// it with all its figures. Names of fields and the subject are the contract with
// subscribers.
func TestOverTheBus(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	ctx, cancel := context.WithTimeout(t.Context(), patience)
	defer cancel()
	b, err := bus.Open(ctx, bus.Config{Embedded: &bus.Embedded{Dir: t.TempDir(), Listen: "127.0.0.1:0"}})
	if err != nil {
		t.Fatal(err)
	}
	defer func() {
		if err := b.Close(context.WithoutCancel(ctx)); err != nil {
			t.Error(err)
		}
	}()
	subscriber, err := nats.Connect(b.URL())
	if err != nil {
		t.Fatal(err)
	}
	defer subscriber.Close()
	heard, err := subscriber.SubscribeSync("thawledger.standing.>")
	if err != nil {
		t.Fatal(err)
	}
	if err := subscriber.Flush(); err != nil {
		t.Fatal(err)
	}
	d := thaw(180)
	d.Unit = pipeline.DegFDays
	w.state(t, pipeline.Site{ID: "north strip", Station: "FELL", Surfaces: []pipeline.Surface{surface("apron", d)}})
	w.service.Bus, w.service.Poll = b, time.Hour
	running := run(t, w.service)
	defer running.stop(t)
	eventually(t, "the settings' line in changes is worked off", func() bool { return len(w.Rows(t, `select * from thaw.changes`)) == 0 })

	const caution = "Screening figures: local codes and a licensed engineer decide."
	next := func(want map[string]any) {
		t.Helper()
		if err := b.Nudge(); err != nil {
			t.Fatal(err)
		}
		m, err := heard.NextMsgWithContext(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if m.Subject != "thawledger.standing.north%20strip.apron" {
			t.Errorf("subject %s", m.Subject)
		}
		var got map[string]any
		if err := json.Unmarshal(m.Data, &got); err != nil {
			t.Fatal(err)
		}
		at, _ := got["recorded_at"].(string)
		if _, err := time.Parse("2006-01-02T15:04:05.000000Z", at); err != nil {
			t.Error(err)
		}
		delete(got, "recorded_at")
		if diff := cmp.Diff(want, got); diff != "" {
			t.Error(diff)
		}
	}
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-19", 80), between("2031-06-20", 85, 104.5))
	next(map[string]any{
		"version": 1.0, "site": "north strip", "surface": "apron", "kind": "thaw", "season_start": "2031-01-15", "day": "2031-06-20",
		"to": "unknown", "why": "first judgement", "index_low_c_days": 85.0, "index_high_c_days": 104.5, "design_c_days": 100.0, "caution": caution,
	})
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-19", 80), at("2031-06-20", 101.25), at("2031-06-21", 103.5))
	next(map[string]any{
		"version": 1.0, "site": "north strip", "surface": "apron", "kind": "thaw", "season_start": "2031-01-15", "day": "2031-06-21",
		"from": "unknown", "to": "exceeded", "why": "gap closed", "index_c_days": 103.5, "index_low_c_days": 103.5, "index_high_c_days": 103.5,
		"design_c_days": 100.0, "exceeded_on": "2031-06-20", "exceedance": 1.0, "caution": caution,
	})
	if left, _, _ := heard.Pending(); left != 0 {
		t.Errorf("%d further messages", left)
	}
}
