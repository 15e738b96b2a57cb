package settings

import (
	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// day reads a date; otherwise is what stands for one that is not given, nil if it
// must be.
func (o *object) day(key string, otherwise *pipeline.Day) pipeline.Day {
	text, n := o.scalar(key)
	if n == nil {
		if otherwise == nil {
			o.missing(key, "write a date such as 1985-06-01")
			return 0
		}
		return *otherwise
	}
	d, err := pipeline.ParseDay(text)
	if err != nil {
		o.r.fault(n, o.at(key), "write a date such as 1985-06-01", "%q is none", text)
	}
	return d
}

// facts reads a station's history: each with on, or with from and to.
func (r *reader) facts(o *object) (out []pipeline.Fact) {
	o.list("history", func(n *yaml.Node, path string) {
		f := r.object(n, path, n)
		fact := pipeline.Fact{What: oneOf(f, "what", "", pipeline.FactKinds...), Note: f.textOr("note", "")}
		if f.has("on") {
			fact.From = f.day("on", nil)
			fact.To = fact.From
			f.known = append(f.known, "from", "to")
			if f.has("from") || f.has("to") {
				r.fault(n, path, "write on, or from and to", "it is dated twice")
			}
		} else {
			f.known = append(f.known, "on")
			fact.From = f.day("from", nil)
			fact.To = f.day("to", nil)
		}
		f.done()
		if fact.To < fact.From && !f.bad {
			r.fault(n, path, "exchange them", "it ends on %s, before it begins on %s", fact.To, fact.From)
		}
		out = append(out, fact)
	})
	return out
}

// members reads what a record is joined from.
func (r *reader) members(o *object) (out []pipeline.Member) {
	if !o.has("joined") {
		o.known = append(o.known, "joined")
		return nil
	}
	o.list("joined", func(n *yaml.Node, path string) {
		f := r.object(n, path, n)
		zero := 0.0
		m := pipeline.Member{Station: f.text("station", "name the station that it takes daily values from"),
			ErrorC: f.number("error_c", &zero, 0, 50), Source: f.textOr("source", "")}
		if f.has("until") {
			d := f.day("until", nil)
			m.Until = &d
		} else {
			f.known = append(f.known, "until")
		}
		m.AdjustC = r.monthly(f, "adjust_c")
		f.done()
		if m.AdjustC != [12]float64{} && m.Source == "" {
			r.fault(n, path+".source", "say where the adjustment is from", "it is missing")
		}
		out = append(out, m)
	})
	return out
}

// monthly reads one number for all months, or twelve.
func (r *reader) monthly(o *object, key string) (out [12]float64) {
	n := o.get(key)
	switch {
	case n == nil:
		o.fallBack(key)
	case n.Kind == yaml.ScalarNode:
		c := o.number(key, nil, -20, 20)
		for i := range out {
			out[i] = c
		}
	case n.Kind != yaml.SequenceNode || len(n.Content) != 12:
		r.fault(n, o.at(key), "write one number, or twelve from January to December", "%s will not do", shown(n))
	default:
		for i, c := range n.Content {
			one := &object{r: r, node: n, path: o.path, keys: map[string]*yaml.Node{key: c}, vals: map[string]*yaml.Node{key: c}}
			out[i] = one.number(key, nil, -20, 20)
		}
	}
	return out
}

// joinedRecords checks joined records once all stations are known.
func (r *reader) joinedRecords(s *Settings, stations map[string]*pipeline.Station, nodes map[string]*yaml.Node) {
	for i := range s.Stations {
		st := &s.Stations[i]
		at := nodes[st.ID]
		for k, m := range st.Joined {
			of := stations[m.Station]
			switch {
			case of == nil:
				r.fault(at, "", "name a station of the settings", "record %s is joined from station %q, which there is not", st.ID, m.Station)
				continue
			case len(of.Joined) > 0:
				r.fault(at, "", "name stations with readings of their own", "record %s is joined from %s, which is joined itself", st.ID, m.Station)
			case of.UTCOffset != st.UTCOffset || of.DayStarts != st.DayStarts:
				r.fault(at, "", "give both the same utc_offset and day_starts", "the days of record %s are not those of its member %s", st.ID, m.Station)
			}
			if of.Measures != st.Measures {
				r.fault(at, "", "join stations that measure the same, and write measures as they do", "record %s measures the %s, its member %s the %s",
					st.ID, st.Measures, m.Station, of.Measures)
			}
			last := k == len(st.Joined)-1
			switch {
			case last && m.Until != nil:
				r.fault(at, "", "leave until out of the last member", "record %s ends with its last member %s", st.ID, m.Station)
			case !last && m.Until == nil:
				r.fault(at, "", "write until: and its last day", "member %s of record %s has no end, and another follows", m.Station, st.ID)
			case k > 0 && !last && m.Until != nil && st.Joined[k-1].Until != nil && *m.Until <= *st.Joined[k-1].Until:
				r.fault(at, "", "put members in order of time", "member %s of record %s ends before it begins", m.Station, st.ID)
			}
			if last {
				st.Mean = of.Mean
			}
		}
	}
}
