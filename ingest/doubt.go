package ingest

import (
	"context"
	"fmt"
	"maps"
	"slices"
	"time"

	"thawledger/ingest/plausible"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// climateKept is how long a station's climate is taken to be what it was: a few
// more days do not change it.
const climateKept = 10 * time.Minute

type knownClimate struct {
	*plausible.Climate
	at time.Time
}

func (s *Service) climate(ctx context.Context, station string) (*plausible.Climate, error) {
	if c, ok := s.climates[station]; ok && s.Now().Sub(c.at).Abs() < climateKept {
		return c.Climate, nil
	}
	sums, err := s.DB.Climate(ctx, station)
	if err != nil {
		return nil, err
	}
	stats := make([]plausible.DateStats, len(sums))
	for i, d := range sums {
		stats[i] = plausible.DateStats(d)
	}
	c := knownClimate{plausible.NewClimate(stats), s.Now()}
	s.climates[station] = c
	return c.Climate, nil
}

// doubts holds a batch's readings against the climates of its stations.
type doubts struct {
	service *Service
	clocks  map[string]pipeline.StationClock
	checks  map[string]*plausible.Check
	off     bool
}

func (s *Service) newDoubts(b *store.Batch) *doubts {
	return &doubts{service: s, clocks: b.Layout.Station.Clocks, checks: map[string]*plausible.Check{}, off: b.TakenByHand}
}

func (d *doubts) add(ctx context.Context, p *pipeline.Part) error {
	if d.off {
		return nil
	}
	check := d.checks[p.Station]
	if check == nil {
		c, err := d.service.climate(ctx, p.Station)
		if err != nil {
			return err
		}
		check = plausible.NewCheck(c)
		d.checks[p.Station] = check
	}
	clock := d.clocks[p.Station]
	st := pipeline.Station{UTCOffset: time.Duration(clock.UTCOffsetS) * time.Second, DayStarts: time.Duration(clock.DayStartsS) * time.Second}
	for _, r := range p.Readings {
		check.Add(st.DayAt(r.Start()), r.ValueC)
	}
	return nil
}

// verdict says what is doubtful about the batch; "" if nothing is.
func (d *doubts) verdict() string {
	for _, station := range slices.Sorted(maps.Keys(d.checks)) {
		if v := d.checks[station].Verdict(); v != "" {
			return fmt.Sprintf("what it has of station %s %s", station, v)
		}
	}
	return ""
}
