package propose

import (
	"bytes"
	"context"
	"fmt"
	"time"

	"thawledger/ingest/csvfeed"
	"thawledger/pipeline"
)

// firstReadings is how many readings a proposal shows.
const firstReadings = 5

// verify reads the sample by the proposed layout, as the daemon would.
func (p *Proposal) verify(s *sample) error {
	l := p.Layout
	l.MaxSetAside = 1
	l.Station.Clocks = map[string]pipeline.StationClock{}
	for _, id := range p.ids {
		l.Station.Clocks[id] = pipeline.StationClock{}
	}
	plan, err := csvfeed.Compile(&l)
	if err != nil {
		return err
	}
	k := &keeper{p: p}
	counts, err := plan.Decode(context.Background(), bytes.NewReader(s.bytes), p.file, k)
	if err != nil {
		return err
	}
	p.Rows, p.Read = int(counts.Rows), int(counts.RowsRead)
	p.WithoutValue, p.SetAside = int(counts.RowsWithoutValue), int(counts.RowsSetAside)
	if float64(p.SetAside) > defaultShare*float64(p.Rows) {
		p.note("%d of %d rows would be set aside, and a file held back for it: %s", p.SetAside, p.Rows, p.FirstSetAside)
	}
	return nil
}

// keeper is a csvfeed.Sink that keeps what a proposal shows.
type keeper struct{ p *Proposal }

func (k *keeper) Reading(station string, column int, r pipeline.Reading) error {
	v := k.p.Layout.Values[column]
	if len(k.p.First) < firstReadings {
		k.p.First = append(k.p.First, Reading{Station: station, Column: v.Column, Variable: v.Variable, Start: r.Start(), ValueC: r.ValueC, Quality: r.Quality})
	}
	k.p.points = append(k.p.points, Point{Time: time.Unix(r.StartS, 0).UTC(), C: r.ValueC})
	return nil
}

func (k *keeper) SetAside(row pipeline.SetAside) error {
	if k.p.FirstSetAside == "" {
		k.p.FirstSetAside = fmt.Sprintf("row %d: %s", row.Row, row.Text)
	}
	return nil
}
