package settings

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"os"
	"regexp"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// anID is what stations, sites, surfaces and feeds may be called: it goes into
// subjects of the bus and names of folders.
var anID = regexp.MustCompile(`^[A-Za-z0-9_-]{1,40}$`)

func (o *object) id(key string) string {
	id := o.text(key, "write a short name of letters, digits, - and _")
	if id != "" && !anID.MatchString(id) {
		o.r.fault(o.vals[key], o.at(key), "use up to 40 letters, digits, - and _", "%q will not do", id)
	}
	return id
}

// readStations returns the stations by id.
func (r *reader) readStations(s *Settings, o *object, within func(string) string) map[string]*pipeline.Station {
	seen := map[string]*yaml.Node{}
	add := func(n *yaml.Node, path string, st pipeline.Station) {
		if st.ID == "" {
			return
		}
		if first, ok := seen[st.ID]; ok {
			r.fault(n, path, "give each station an id of its own", "station %s stands in line %d already", st.ID, first.Line)
			return
		}
		seen[st.ID] = n
		s.Stations = append(s.Stations, st)
	}
	if n := o.vals["stations"]; n != nil && n.Kind == yaml.MappingNode {
		t := r.object(o.get("stations"), "stations", n)
		path := within(t.text("table", "write table: and the name of a CSV file, or a list of stations"))
		t.done()
		if path != "" {
			r.stationTable(path, t.vals["table"], add)
		}
	} else if o.list("stations", func(n *yaml.Node, path string) { add(n, path, r.station(r.object(n, path, n))) }) == nil {
		o.missing("stations", "list at least one station")
	}
	out := map[string]*pipeline.Station{}
	for i := range s.Stations {
		out[s.Stations[i].ID] = &s.Stations[i]
	}
	r.joinedRecords(s, out, seen)
	r.neighboursOf(s, out, seen)
	return out
}

// station reads one station; its daily_mean may be a mapping or only the rule.
func (r *reader) station(o *object) pipeline.Station {
	zero, base, fill := 0.0, 0.0, 2.0
	st := pipeline.Station{
		ID: o.id("id"), Name: o.textOr("name", ""),
		LatitudeD: o.number("latitude", nil, -90, 90), LongitudeD: o.number("longitude", nil, -180, 180),
		ElevationM: o.number("elevation_m", &zero, -500, 9000),
		UTCOffset:  o.offset("utc_offset"), DayStarts: o.clock("day_starts"),
	}
	if st.Name == "" {
		st.Name = st.ID
	}
	st.Joined = r.members(o)
	mean := o
	if len(st.Joined) > 0 {
		st.Mean = pipeline.MeanMaxMin // of no effect; its members have their own
		o.known = append(o.known, "daily_mean")
		if o.has("daily_mean") {
			r.fault(o.keys["daily_mean"], o.at("daily_mean"), "leave it out", "a joined record takes daily values from others, which have rules of their own")
		}
	} else if v := o.vals["daily_mean"]; v != nil && v.Kind == yaml.MappingNode {
		mean = r.object(o.get("daily_mean"), o.at("daily_mean"), o.node)
		st.Mean = oneOf(mean, "rule", "", pipeline.MeanRules...)
	} else {
		st.Mean = oneOf(o, "daily_mean", "", pipeline.MeanRules...)
	}
	hours, hole := 20.0, 3.0
	st.MinHours, st.MaxHole = mean.whole("min_hours", &hours, 1, 24), mean.whole("longest_hole", &hole, 0, 23)
	if mean != o {
		mean.done()
	}
	st.BaseC, st.FillDays = o.number("base_c", &base, -20, 20), o.whole("fill_days", &fill, 0, 10)
	thaw, freeze := pipeline.MonthDay{Month: time.January, Day: 15}, pipeline.MonthDay{Month: time.July, Day: 15}
	if st.LatitudeD < 0 {
		thaw, freeze = freeze, thaw
	}
	st.ThawYear, st.FreezeYear = o.monthDay("thaw_year", thaw), o.monthDay("freeze_year", freeze)
	st.Facts = r.facts(o)
	r.stationFills(o, &st)
	o.done()
	return st
}

var offsetForm = regexp.MustCompile(`^(Z|[+-]([01][0-9]):([0-5][0-9]))$`)

// parseOffset reads Z, +03:00 or -09:00.
func parseOffset(text string) (time.Duration, bool) {
	if !offsetForm.MatchString(text) {
		return 0, false
	}
	if text == "Z" {
		return 0, true
	}
	var h, m int
	fmt.Sscanf(text[1:], "%d:%d", &h, &m) //nolint:errcheck // the form was matched
	d := time.Duration(h)*time.Hour + time.Duration(m)*time.Minute
	if text[0] == '-' {
		d = -d
	}
	return d, d >= -14*time.Hour && d <= 14*time.Hour
}

func (o *object) offset(key string) time.Duration {
	const right = `write standard time minus UTC, in quotes, such as "-08:00"`
	text := o.text(key, right)
	d, ok := parseOffset(text)
	if text != "" && !ok {
		o.r.fault(o.vals[key], o.at(key), right, "%q is no offset", text)
	}
	return d
}

func (o *object) clock(key string) time.Duration {
	text, n := o.scalar(key)
	if n == nil {
		o.fallBack(key)
		return 0
	}
	t, err := time.Parse("15:04", text)
	if err != nil {
		o.r.fault(n, o.at(key), `write a time of day, in quotes, such as "06:00"`, "%q is none", text)
		return 0
	}
	return time.Duration(t.Hour())*time.Hour + time.Duration(t.Minute())*time.Minute
}

func (o *object) monthDay(key string, otherwise pipeline.MonthDay) pipeline.MonthDay {
	text, n := o.scalar(key)
	if n == nil {
		o.fallBack(key)
		return otherwise
	}
	t, err := time.Parse("01-02", text)
	if err != nil {
		o.r.fault(n, o.at(key), "write month and day, such as 01-15", "%q is none", text)
		return otherwise
	}
	return pipeline.MonthDay{Month: t.Month(), Day: t.Day()}
}

// stationTable reads stations from a CSV file whose columns are named as the
// keys of a station; empty cells take the default. Faults have its own place.
func (r *reader) stationTable(path string, at *yaml.Node, add func(*yaml.Node, string, pipeline.Station)) {
	f, err := os.Open(path)
	if err != nil {
		r.fault(at, "stations.table", "", "%v", err)
		return
	}
	defer f.Close()
	outer := r.file
	r.file = path
	defer func() { r.file = outer }()
	c := csv.NewReader(f)
	names, err := c.Read()
	if err != nil {
		r.fault(&yaml.Node{Line: 1, Column: 1}, "", "", "the table has no line of column names: %v", err)
		return
	}
	for {
		record, err := c.Read()
		if errors.Is(err, io.EOF) {
			return
		}
		line, _ := c.FieldPos(0)
		row := &yaml.Node{Kind: yaml.MappingNode, Line: line, Column: 1}
		if err != nil {
			if p, ok := errors.AsType[*csv.ParseError](err); ok {
				row.Line, row.Column, err = p.Line, p.Column, p.Err
			}
			r.fault(row, "", "", "the row cannot be read: %v", err)
			return
		}
		for i, cell := range record {
			line, column := c.FieldPos(i)
			if cell == "" {
				continue
			}
			row.Content = append(row.Content, &yaml.Node{Kind: yaml.ScalarNode, Value: names[i], Line: line, Column: column},
				&yaml.Node{Kind: yaml.ScalarNode, Value: cell, Line: line, Column: column})
		}
		add(row, "", r.station(r.object(row, "", row)))
	}
}
