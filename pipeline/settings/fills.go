package settings

import (
	"slices"
	"strings"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// stationFills reads what a station measures, against which base, and what its
// missing days are filled from.
func (r *reader) stationFills(o *object, st *pipeline.Station) {
	st.Measures = oneOf(o, "measures", pipeline.OfTheAir, pipeline.OfTheAir, pipeline.OfTheSurface)
	if o.vals["neighbours"] != nil && o.vals["neighbours"].Kind == yaml.ScalarNode && !empty(o.vals["neighbours"]) {
		st.Neighbours = strings.Fields(o.text("neighbours", "name stations")) // a cell of a table
	} else {
		st.Neighbours = o.texts("neighbours")
	}
	st.ClimateFills = o.yes("climatology_fills")
	o.list("base_by_date", func(n *yaml.Node, path string) {
		b := r.object(n, path, n)
		if !b.has("from") {
			b.missing("from", "write month and day, such as 02-01")
		}
		base := pipeline.BaseFrom{From: b.monthDay("from", pipeline.MonthDay{Month: 1, Day: 1}), BaseC: b.number("base_c", nil, -20, 20)}
		b.done()
		if k := len(st.Bases); k > 0 && !b.bad && base.From.In(2001) <= st.Bases[k-1].From.In(2001) {
			r.fault(n, path, "put dates in order, each once", "%s does not come after %s", base.From, st.Bases[k-1].From)
		}
		st.Bases = append(st.Bases, base)
	})
}

// neighboursOf checks neighbours once all stations are known.
func (r *reader) neighboursOf(s *Settings, stations map[string]*pipeline.Station, nodes map[string]*yaml.Node) {
	for i := range s.Stations {
		st := &s.Stations[i]
		at := nodes[st.ID]
		for k, name := range st.Neighbours {
			of := stations[name]
			switch {
			case of == nil:
				r.fault(at, "", "name a station of the settings", "station %s has neighbour %q, which there is not", st.ID, name)
			case of == st:
				r.fault(at, "", "name another station", "station %s is its own neighbour", st.ID)
			case slices.Contains(st.Neighbours[:k], name):
				r.fault(at, "", "name it once", "station %s has neighbour %s twice", st.ID, name)
			case len(of.Joined) > 0 || len(st.Joined) > 0:
				r.fault(at, "", "give the members neighbours", "joined records are not filled, nor filled from: %s and %s", st.ID, name)
			case of.Measures != st.Measures:
				r.fault(at, "", "name a station that measures the same", "station %s measures the %s, its neighbour %s the %s", st.ID, st.Measures, name, of.Measures)
			case of.UTCOffset != st.UTCOffset || of.DayStarts != st.DayStarts:
				r.warn(at, "", "the days of station %s are not those of its neighbour %s: daily means of different days are compared", st.ID, name)
			}
		}
	}
}

// measuredBy reads the station that measures a surface.
func (r *reader) measuredBy(o *object, stations map[string]*pipeline.Station) string {
	name := o.textOr("measured_by", "")
	if name == "" || stations == nil {
		return name
	}
	switch of := stations[name]; {
	case of == nil:
		r.fault(o.vals["measured_by"], o.at("measured_by"), "name a station of the settings", "there is no station %q", name)
	case of.Measures != pipeline.OfTheSurface:
		r.fault(o.vals["measured_by"], o.at("measured_by"), "write measures: surface at the station", "station %s measures the air", name)
	}
	return name
}

// nRange reads the range of an n-factor; both ends or neither.
func (r *reader) nRange(o *object, f *pipeline.NFactor) {
	f.Low, f.High = o.number("low", &f.Value, 0.01, 5), o.number("high", &f.Value, 0.01, 5)
	if o.has("low") != o.has("high") {
		r.fault(o.node, o.path, "write low and high, or neither", "the range of the n-factor has one end")
	}
	if !(f.Low <= f.Value && f.Value <= f.High) {
		r.fault(o.node, o.path, "write low <= value <= high", "the range %g to %g does not hold the value %g", f.Low, f.High, f.Value)
	}
}
