package settings

import (
	"fmt"
	"iter"
	"maps"
	"slices"
	"strings"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// known names the words there are, for a message.
func known(what string, words iter.Seq[string]) string {
	list := slices.Sorted(words)
	if len(list) == 0 {
		return "there are no " + what
	}
	if len(list) > 12 {
		list = append(list[:12], "...")
	}
	return what + " are " + strings.Join(list, ", ")
}

func (r *reader) readSites(s *Settings, o *object, stations map[string]*pipeline.Station) {
	seen := map[string]*yaml.Node{}
	o.list("sites", func(n *yaml.Node, path string) {
		site := r.site(r.object(n, path, n), stations)
		if first, ok := seen[site.ID]; ok && site.ID != "" {
			r.fault(n, path, "give each site an id of its own", "site %s stands in line %d already", site.ID, first.Line)
			return
		}
		seen[site.ID] = n
		s.Sites = append(s.Sites, site)
		s.places.sites = append(s.places.sites, n)
	})
}

func (r *reader) site(o *object, stations map[string]*pipeline.Station) pipeline.Site {
	site := pipeline.Site{ID: o.id("id"), Name: o.textOr("name", ""), Station: o.text("station", "name the station that the site draws on")}
	if site.Name == "" {
		site.Name = site.ID
	}
	site.Tags, site.Instructions = r.tags(o), r.instructions(o)
	st := stations[site.Station]
	if st == nil && site.Station != "" && o.has("station") {
		r.fault(o.vals["station"], o.at("station"), known("stations", maps.Keys(stations)), "there is no station %q", site.Station)
	}
	seen := map[string]*yaml.Node{}
	if o.list("surfaces", func(n *yaml.Node, path string) {
		surface := r.surface(r.object(n, path, n), st, stations)
		if first, ok := seen[surface.ID]; ok && surface.ID != "" {
			r.fault(n, path, "give each surface of a site an id of its own", "surface %s stands in line %d already", surface.ID, first.Line)
			return
		}
		seen[surface.ID] = n
		site.Surfaces = append(site.Surfaces, surface)
	}) == nil && !o.has("surfaces") {
		o.missing("surfaces", "list at least one surface")
	}
	o.done()
	return site
}

func (r *reader) surface(o *object, st *pipeline.Station, stations map[string]*pipeline.Station) pipeline.Surface {
	s := pipeline.Surface{ID: o.id("id"), Name: o.textOr("name", "")}
	if s.Name == "" {
		s.Name = s.ID
	}
	factors := map[string]bool{}
	o.list("n_factors", func(n *yaml.Node, path string) {
		f := r.nFactor(r.object(n, path, n))
		if key := fmt.Sprint(f.Kind, f.From); factors[key] {
			r.fault(n, path, "give them different dates (from)", "another n-factor for %s holds from the same day", f.Kind)
		} else {
			factors[key] = true
		}
		s.Factors = append(s.Factors, f)
	})
	s.MeasuredBy = r.measuredBy(o, stations)
	s.Ground = r.ground(o)
	designs := map[string]bool{}
	if o.list("design_values", func(n *yaml.Node, path string) {
		d := r.designValue(r.object(n, path, n), st)
		if key := fmt.Sprint(d.Kind, d.Definition, d.Of, d.Direction, d.From); designs[key] {
			r.fault(n, path, "give them different dates (from)", "another design value of the same kind and definition holds from the same day")
		} else {
			designs[key] = true
		}
		hasFactor := slices.ContainsFunc(s.Factors, func(f pipeline.NFactor) bool { return f.Kind == d.Kind })
		if d.Of == pipeline.OfSurface && !hasFactor {
			r.fault(n, path, fmt.Sprintf("give the surface an n-factor for %s, or a design value of the air", d.Kind),
				"it limits the surface index, which needs an n-factor for %s", d.Kind)
		}
		if d.DepthM != nil && len(s.Ground) == 0 {
			r.fault(n, path, "give the surface its ground, or state an index", "it is a depth of thaw, and nothing is known of the ground")
		}
		s.Designs = append(s.Designs, d)
	}) == nil && !o.has("design_values") {
		o.missing("design_values", "list at least one design value")
	}
	o.done()
	return s
}

// beginning is the first day of all: what holds "from the beginning".
var beginning = pipeline.DayOf(1, time.January, 1)

func (o *object) from() pipeline.Day {
	text, n := o.scalar("from")
	if n == nil {
		o.fallBack("from")
		return beginning
	}
	d, err := pipeline.ParseDay(text)
	if err != nil {
		o.r.fault(n, o.at("from"), "write a date such as 1985-06-01", "%q is none", text)
	}
	return d
}

func (r *reader) nFactor(o *object) pipeline.NFactor {
	f := pipeline.NFactor{
		Kind: oneOf(o, "kind", "", pipeline.Thaw, pipeline.Freeze), From: o.from(), Value: o.number("value", nil, 0.01, 5),
		Source: o.text("source", "say where it was taken from"),
	}
	r.nRange(o, &f)
	o.done()
	return f
}

func (r *reader) designValue(o *object, st *pipeline.Station) pipeline.DesignValue {
	base, near := 0.0, 0.9
	d := pipeline.DesignValue{
		Kind: oneOf(o, "kind", "", pipeline.Thaw, pipeline.Freeze), Definition: oneOf(o, "definition", "", pipeline.Definitions...),
		Of:    oneOf(o, "of", "", pipeline.OfSurface, pipeline.OfAir),
		BaseC: o.number("base_c", &base, -20, 20), Direction: oneOf(o, "direction", "", pipeline.NotAbove, pipeline.NotBelow),
		From: o.from(), NearShare: o.number("near_share", &near, 0.01, 1), Source: o.text("source", "name the document that states it"),
	}
	o.limit(&d)
	o.done()
	if o.bad {
		return d
	}
	if d.Kind == pipeline.Thaw && d.Direction == pipeline.NotBelow {
		r.fault(o.vals["direction"], o.at("direction"), "write not_above, or kind: freeze", "a thawing index has no lower limit to keep")
	}
	if d.Definition == pipeline.NotStated && o.has("definition") {
		r.warn(o.vals["definition"], o.at("definition"), "the definition is not stated: it is compared with the curve index, and the sum is shown beside it")
	}
	if st != nil && len(st.Bases) > 0 {
		r.fault(o.node, o.path, "draw on a station without base_by_date", "the base of station %s changes within the year: its index is kept apart and compared with no design value", st.ID)
	} else if st != nil && st.Measures == pipeline.OfTheSurface {
		r.fault(o.node, o.path, "draw on a station that measures the air, and write measured_by at the surface", "station %s measures a surface", st.ID)
	} else if st != nil {
		if err := d.Comparable(st.BaseC); err != nil {
			right := "state it as curve or sum, or take the value out"
			at := o.vals["definition"]
			if d.Definition != pipeline.Monthly {
				at, right = o.node, "give the station or the design value the other's base_c"
			}
			r.fault(at, o.path, right, "%v", err)
		}
	}
	return d
}

// indexUnit reads a unit; the middle dot may be written as it is printed.
func (o *object) indexUnit() pipeline.IndexUnit {
	if n := o.vals["unit"]; n != nil {
		n.Value = strings.ReplaceAll(n.Value, "·", ".")
	}
	return oneOf(o, "unit", "", pipeline.IndexUnits...)
}
