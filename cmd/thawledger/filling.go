package main

import (
	"context"
	"fmt"
	"slices"

	"thawledger/indices/filling"
	"thawledger/pipeline"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

const fillingSynopsis = `filling show --station S --neighbour N [--settings FILE]: how days of a station would be filled from a
neighbour, month by month, and how far off that was on days that were observed
thawledger filling test --station S [--neighbour N ...] [--kind thaw|freeze] [--least-r 0.9] [--seed 1] [--repeats 200]
[--settings FILE]: remove observed days, fill them by each rung, and see whether the index was off as stated`

// filling is the command `filling`. It reads the database and changes nothing.
func (p program) filling(ctx context.Context, args []string) error {
	if len(args) > 0 {
		switch args[0] {
		case "show":
			return p.fillingShow(ctx, args[1:])
		case "test":
			return p.fillingTest(ctx, args[1:])
		}
	}
	f := p.flags("filling", fillingSynopsis)
	f.Usage()
	return errUsage
}

// network is a station and its neighbours, with their observed daily means.
type network struct {
	station    *pipeline.Station
	target     []filling.Point
	neighbours []filling.Neighbour
}

// options are the usual limits, and the line that the station's settings allow.
func (n *network) options(leastR float64) filling.Options {
	o := filling.Usual()
	o.LineDays, o.LeastR = min(n.station.FillDays, filling.MostLine), leastR
	return o
}

// networkOf reads the means of a station and of its neighbours.
func (p program) networkOf(ctx context.Context, set *settings.Settings, station string, neighbours []string) (*network, error) {
	st, err := stationNamed(set, station)
	if err != nil {
		return nil, err
	}
	for i, name := range neighbours {
		if _, err := stationNamed(set, name); err != nil {
			return nil, err
		}
		if name == station || slices.Contains(neighbours[:i], name) {
			return nil, fmt.Errorf("neighbour %s is the station itself, or stands twice", name)
		}
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return nil, err
	}
	defer done()
	out := &network{station: st}
	if out.target, err = pointsOf(ctx, db, station); err != nil {
		return nil, err
	}
	for _, name := range neighbours {
		points, err := pointsOf(ctx, db, name)
		if err != nil {
			return nil, err
		}
		out.neighbours = append(out.neighbours, filling.Neighbour{Station: name, Points: points})
	}
	return out, nil
}

func pointsOf(ctx context.Context, db *store.DB, station string) ([]filling.Point, error) {
	means, err := db.DailyMeans(ctx, station)
	if err != nil {
		return nil, err
	}
	out := make([]filling.Point, 0, len(means))
	for _, m := range means {
		if m.Origin == pipeline.Observed {
			out = append(out, filling.Point{Day: m.Day, MeanC: m.MeanC})
		}
	}
	if len(out) == 0 {
		return nil, fmt.Errorf("%s has no observed daily mean", station)
	}
	return out, nil
}
