package settings

import (
	"maps"
	"path"
	"time"

	"github.com/robfig/cron/v3"
	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

func (r *reader) readFeeds(s *Settings, o *object, stations map[string]*pipeline.Station, within func(string) string) {
	seen := map[string]*yaml.Node{}
	fed := map[string]bool{}
	if o.list("feeds", func(n *yaml.Node, path string) {
		f := r.feed(r.object(n, path, n), s, stations, within)
		if first, ok := seen[f.Name]; ok && f.Name != "" {
			r.fault(n, path, "give each feed a name of its own", "feed %s stands in line %d already", f.Name, first.Line)
			return
		}
		seen[f.Name] = n
		s.Feeds = append(s.Feeds, f)
		for id := range f.Layout.Station.Clocks {
			fed[id] = true
		}
	}) == nil {
		o.missing("feeds", "list at least one feed")
		return
	}
	for _, st := range s.Stations {
		if !fed[st.ID] && len(st.Joined) == 0 && len(r.faults) == 0 {
			r.warn(o.vals["stations"], "stations", "no feed can name station %s", st.ID)
		}
	}
}

func (r *reader) feed(o *object, s *Settings, stations map[string]*pipeline.Station, within func(string) string) pipeline.Feed {
	zero := 0.0
	f := pipeline.Feed{
		Name: o.id("name"), Folder: within(o.textOr("folder", "")), Remote: r.remote(o, within), Push: r.push(o, within), Pattern: o.textOr("pattern", "*.csv"), Subfolders: o.yes("subfolders"),
		Settle: o.duration("settle", 10*time.Second), Schedule: o.textOr("every", "@every 5m"), Rank: o.whole("rank", &zero, -1000, 1000),
		ReplacesSpan: o.yes("replaces_span"), Grows: o.yes("grows"),
	}
	switch {
	case f.Folder == "" && f.Remote == nil && f.Push == nil:
		o.missing("folder", "name the folder that files arrive in, or give url or push")
	case f.Folder != "" && f.Remote != nil:
		r.fault(o.keys["url"], o.at("url"), "make two feeds of it", "a folder is given as well")
	}
	if _, err := path.Match(f.Pattern, ""); err != nil {
		r.fault(o.vals["pattern"], o.at("pattern"), "write a pattern such as *.csv", "%q is none", f.Pattern)
	}
	if _, err := cron.ParseStandard(f.Schedule); err != nil {
		r.fault(o.vals["every"], o.at("every"), `write "@every 5m", or minute, hour, day, month and weekday (UTC) such as "10 6 * * *"`, "%q is no schedule", f.Schedule)
	}
	name := o.text("layout", "name one of the layouts")
	if l := s.Layouts[name]; l != nil {
		f.Layout = *l
	} else if name != "" && o.has("layout") {
		r.fault(o.vals["layout"], o.at("layout"), known("layouts", maps.Keys(s.Layouts)), "there is no layout %q", name)
	}
	if o.has("station") {
		f.Layout.Station = r.stationColumn(r.object(o.get("station"), o.at("station"), o.node))
	} else {
		o.known = append(o.known, "station")
		if c := f.Layout.Station; c.Column+c.FileName+c.Preamble+c.Constant == "" && f.Layout.Name != "" {
			o.missing("station", "say here or in the layout which station a row is of")
		}
	}
	if f.Grows && f.Layout.Encoding != "" {
		r.fault(o.keys["grows"], o.at("grows"), "leave it out, or have the file written in UTF-8", "where a growing file ends is found in UTF-8 only, and its layout says %s", f.Layout.Encoding)
	}
	if f.Grows && f.ReplacesSpan {
		r.fault(o.keys["replaces_span"], o.at("replaces_span"), "leave one of them out", "what a file has grown by replaces nothing, and grows is given")
	}
	o.done()
	r.clocks(o, &f.Layout.Station, stations)
	return f
}

// clocks fills in what days and times of the feed's stations depend on. An id
// that the map does not name stands for itself.
func (r *reader) clocks(o *object, c *pipeline.StationColumn, stations map[string]*pipeline.Station) {
	clock := func(st *pipeline.Station) pipeline.StationClock {
		return pipeline.StationClock{UTCOffsetS: int32(st.UTCOffset / time.Second), DayStartsS: int32(st.DayStarts / time.Second)}
	}
	ids := maps.Keys(stations)
	c.Clocks = map[string]pipeline.StationClock{}
	at := o.node
	if o.has("station") {
		at = o.vals["station"]
	}
	for theirs, ours := range c.Map {
		if stations[ours] == nil && ours != "" {
			r.fault(at, o.at("station.map"), known("stations", ids), "%q stands for station %q, which there is not", theirs, ours)
		}
	}
	if c.Constant != "" && stations[c.Constant] != nil && len(stations[c.Constant].Joined) > 0 {
		r.fault(at, o.at("station.constant"), "name one of its members", "%s is a joined record and has no readings of its own", c.Constant)
		return
	}
	if c.Constant != "" {
		id := c.Constant
		if ours, ok := c.Map[id]; ok {
			id = ours
		}
		if st := stations[id]; st != nil {
			c.Clocks[id] = clock(st)
			return
		}
		r.fault(at, o.at("station.constant"), known("stations", ids), "there is no station %q", id)
		return
	}
	for id, st := range stations {
		if len(st.Joined) == 0 {
			c.Clocks[id] = clock(st)
		}
	}
}
