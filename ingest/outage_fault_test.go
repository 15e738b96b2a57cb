package ingest

import (
	"testing"
	"time"
)

// A bus that is away uses up no attempt: only what it confirmed and lost counts.
func TestOutageIsNoLoss(t *testing.T) {
	p := newPlace(t)
	p.RepublishAllowed = 2
	closeBus(t, p.Bus)
	p.put(t, "fell/a.csv", file(20, "2030-05-01"), time.Hour)
	if err := p.Look(t.Context()); err == nil {
		t.Fatal("published on a bus that is closed")
	}
	for range 5 {
		p.finish(t.Context())
	}
	p.again(func(c *Config) { c.Bus, c.RepublishAfter = openBus(t, p.busDir), time.Millisecond })
	p.finish(t.Context())
	p.lose(t, 1)
	eventually(t, "published again after one loss", func() bool { p.finish(t.Context()); return p.waiting(t) > 0 })
	if got := p.one(t, `select count(*) from thaw.batch_parts where stuck_at is not null`); got != "0" {
		t.Errorf("%s parts stuck", got)
	}
}
