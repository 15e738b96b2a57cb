package ingest

import (
	"maps"
	"slices"

	"thawledger/pipeline"
)

// parts gathers readings into parts of one station each. The same readings in
// the same order give the same parts: a part is closed when it is full, and at
// the end what is open is closed in the order of the stations' names.
type parts struct {
	batch  int64
	feed   string
	series []pipeline.Series // of the layout's value columns; a reading's Series is its column
	done   func(*pipeline.Part) error

	open   map[string]*pipeline.Part
	number int32
}

func newParts(batch int64, feed string, series []pipeline.Series, done func(*pipeline.Part) error) *parts {
	return &parts{batch: batch, feed: feed, series: series, done: done, open: map[string]*pipeline.Part{}}
}

// add takes a reading. The part given to done is valid until done returns.
func (p *parts) add(station string, r pipeline.Reading) error {
	part := p.open[station]
	if part == nil {
		part = &pipeline.Part{Batch: p.batch, Attempt: 1, Feed: p.feed, Station: station, Series: p.series,
			Readings: make([]pipeline.Reading, 0, pipeline.PartReadings)}
		p.open[station] = part
	}
	part.Readings = append(part.Readings, r)
	if len(part.Readings) < pipeline.PartReadings {
		return nil
	}
	return p.close(part)
}

func (p *parts) close(part *pipeline.Part) error {
	p.number++
	part.Number = p.number
	err := p.done(part)
	part.Readings = part.Readings[:0]
	return err
}

// end closes what is open.
func (p *parts) end() error {
	for _, station := range slices.Sorted(maps.Keys(p.open)) {
		if part := p.open[station]; len(part.Readings) > 0 {
			if err := p.close(part); err != nil {
				return err
			}
		}
	}
	return nil
}
