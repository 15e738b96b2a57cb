package settings

import (
	"maps"
	netmail "net/mail"
	"net/url"
	"slices"
	"strings"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// backWithin is how the settings write the state within among those to hear of.
const backWithin pipeline.State = "back within"

// heardStates are the states to hear of, as the settings write them.
var heardStates = []pipeline.State{pipeline.Exceeded, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.FellShort, backWithin}

// tags reads a site's tags.
func (r *reader) tags(o *object) []string {
	tags := o.texts("tags")
	for _, tag := range tags {
		if !anID.MatchString(tag) {
			r.fault(o.vals["tags"], o.at("tags"), "use up to 40 letters, digits, - and _", "%q will not do", tag)
		}
	}
	return tags
}

// instructions reads what a site wants to be done, by state.
func (r *reader) instructions(o *object) map[pipeline.State]string {
	if !o.has("instructions") {
		o.known = append(o.known, "instructions")
		return nil
	}
	out := map[pipeline.State]string{}
	n := o.get("instructions")
	f := r.object(n, o.at("instructions"), n)
	for _, state := range heardStates {
		if text := strings.TrimSpace(f.optional(string(state))); text != "" {
			out[shownState(state)] = text
		}
	}
	f.done()
	return out
}

// optional returns a text that has no default to be marked.
func (o *object) optional(key string) string {
	text, _ := o.scalar(key)
	return text
}

func shownState(s pipeline.State) pipeline.State {
	if s == backWithin {
		return pipeline.Within
	}
	return s
}

func writtenState(s pipeline.State) pipeline.State {
	if s == pipeline.Within {
		return backWithin
	}
	return s
}

// readRecipients reads who is told, once channels and sites are known.
func (r *reader) readRecipients(s *Settings, o *object) {
	seen := map[string]*yaml.Node{}
	var nodes []*object
	o.list("recipients", func(n *yaml.Node, path string) {
		f := r.object(n, path, n)
		to := r.recipient(f, s)
		if first, ok := seen[to.ID]; ok && to.ID != "" {
			r.fault(n, path, "give each recipient an id of its own", "recipient %s stands in line %d already", to.ID, first.Line)
			return
		}
		seen[to.ID] = n
		s.Recipients, nodes = append(s.Recipients, to), append(nodes, f)
	})
	for i, to := range s.Recipients {
		switch {
		case to.Next == "":
		case to.Next == to.ID:
			r.fault(nodes[i].vals["next"], nodes[i].at("next"), "name somebody else", "a recipient cannot stand in for itself")
		case seen[to.Next] == nil:
			r.fault(nodes[i].vals["next"], nodes[i].at("next"), known("recipients", maps.Keys(seen)), "there is no recipient %q", to.Next)
		}
	}
	if len(s.Channels) > 0 && len(s.Recipients) == 0 && len(r.faults) == 0 {
		r.warn(o.vals["channels"], "channels", "there are channels and no recipients: nobody is told")
	}
}

func (r *reader) recipient(o *object, s *Settings) pipeline.Recipient {
	to := pipeline.Recipient{ID: o.id("id"), Name: o.textOr("name", "")}
	if to.Name == "" {
		to.Name = to.ID
	}
	channels := map[string]*pipeline.Channel{}
	for i := range s.Channels {
		channels[s.Channels[i].Name] = &s.Channels[i]
	}
	to.Addresses = r.addresses(o, channels)
	if o.list("hears", func(n *yaml.Node, path string) {
		to.Hears = append(to.Hears, r.hearing(r.object(n, path, n), s, channels))
	}) == nil && !o.has("hears") {
		o.missing("hears", "say of what the recipient hears, and by which channels")
	}
	for _, name := range to.Channels() {
		if c := channels[name]; c != nil && c.Addressed() && to.Addresses[name] == "" {
			r.fault(o.node, o.at("addresses"), "write addresses: {"+name+": ...}", "%s hears by %s and has no address there", to.ID, name)
		}
	}
	to.Unit = r.shownUnit(o)
	to.Zone = r.namedZone(o)
	to.Quiet = r.quiet(o)
	to.GatherFor = o.duration("gather_for", 10*time.Minute)
	to.RemindEvery = o.duration("remind_every", 24*time.Hour)
	if n := o.vals["remind_every"]; to.RemindEvery > 0 && to.RemindEvery < time.Hour {
		r.fault(n, o.at("remind_every"), "write an hour or more, or 0s for never", "%s is too often", to.RemindEvery)
	}
	to.Next = o.textOr("next", "")
	if to.Next != "" {
		to.NextAfter = o.duration("next_after", 4*time.Hour)
	} else if o.known = append(o.known, "next_after"); o.has("next_after") {
		r.fault(o.keys["next_after"], o.at("next_after"), "write next: and a recipient, or leave it out", "nobody is next")
	}
	o.done()
	return to
}

func (r *reader) addresses(o *object, channels map[string]*pipeline.Channel) map[string]string {
	out := map[string]string{}
	n := o.get("addresses")
	f := r.object(n, o.at("addresses"), o.node)
	for _, name := range slices.Sorted(maps.Keys(channels)) {
		address := f.optional(name)
		if address == "" {
			continue
		}
		switch c := channels[name]; {
		case c.Mail != nil:
			if _, err := netmail.ParseAddress(address); err != nil {
				r.fault(f.vals[name], f.at(name), "write one such as duty@agency.example", "%q is no e-mail address", address)
			}
		case c.Addressed():
			if u, err := url.Parse(address); err != nil || u.Host == "" || u.User != nil || u.Scheme != "https" && (u.Scheme != "http" || c.Webhook.WhyNone == "") {
				r.fault(f.vals[name], f.at(name), "write https://, a host and a path, without credentials", "that is no address to post to")
			}
		default:
			r.fault(f.vals[name], f.at(name), "leave it out", "channel %s says itself where notices go", name)
		}
		out[name] = address
	}
	f.done()
	return out
}

func (r *reader) hearing(o *object, s *Settings, channels map[string]*pipeline.Channel) pipeline.Hearing {
	sites, tags, surfaces := map[string]bool{}, map[string]bool{}, map[string]bool{}
	for i := range s.Sites {
		sites[s.Sites[i].ID] = true
		for _, tag := range s.Sites[i].Tags {
			tags[tag] = true
		}
		for j := range s.Sites[i].Surfaces {
			surfaces[s.Sites[i].Surfaces[j].ID] = true
		}
	}
	h := pipeline.Hearing{
		Sites: r.named(o, "sites", "site", maps.Keys(sites)), Tags: r.named(o, "tags", "tag", maps.Keys(tags)),
		Surfaces: r.named(o, "surfaces", "surface", maps.Keys(surfaces)), Channels: r.named(o, "channels", "channel", maps.Keys(channels)),
	}
	if !o.has("channels") {
		o.missing("channels", known("channels", maps.Keys(channels)))
	}
	for _, word := range r.named(o, "states", "state", slices.Values(words(heardStates))) {
		h.States = append(h.States, shownState(pipeline.State(word)))
	}
	if len(h.States) == 0 {
		for _, state := range heardStates {
			h.States = append(h.States, shownState(state))
		}
	}
	o.done()
	return h
}

func words(states []pipeline.State) (out []string) {
	for _, s := range states {
		out = append(out, string(s))
	}
	return out
}

// named reads a list of words that have to be known; nil, and marked as left to
// its default, if there is none.
func (r *reader) named(o *object, key, what string, there func(func(string) bool)) []string {
	if !o.has(key) {
		o.known = append(o.known, key)
		o.fallBack(key)
		return nil
	}
	list := o.texts(key)
	all := slices.Sorted(there)
	for i, word := range list {
		switch {
		case slices.Contains(list[:i], word):
			r.fault(o.vals[key], o.at(key), "name it once", "%s %q stands there twice", what, word)
		case !slices.Contains(all, word):
			right := known(what+"s", slices.Values(all))
			if near := nearest(word, all); near != "" {
				right = "did you mean " + near + "?"
			}
			r.fault(o.vals[key], o.at(key), right, "there is no %s %q", what, word)
		}
	}
	if len(list) == 0 {
		r.fault(o.vals[key], o.at(key), "leave it out for all", "the list is empty")
	}
	return list
}

// shownUnit reads the unit that indices are shown in.
func (r *reader) shownUnit(o *object) pipeline.IndexUnit {
	if n := o.vals["unit"]; n != nil {
		n.Value = strings.ReplaceAll(n.Value, "·", ".")
	}
	return oneOf(o, "unit", pipeline.DegCDays, pipeline.DegCDays, pipeline.DegFDays)
}

func (r *reader) namedZone(o *object) *time.Location {
	name := o.textOr("time_zone", "UTC")
	zone, err := time.LoadLocation(name)
	if err != nil || name == "" || name == "Local" {
		r.fault(o.vals["time_zone"], o.at("time_zone"), "write a name of the IANA time zone database, such as America/Whitehorse, or UTC", "%q is no time zone", name)
		return time.UTC
	}
	return zone
}

// quiet reads the hours in which a recipient is told nothing; nil for none.
func (r *reader) quiet(o *object) *pipeline.Quiet {
	if !o.has("quiet") {
		o.known = append(o.known, "quiet")
		return nil
	}
	n := o.get("quiet")
	f := r.object(n, o.at("quiet"), n)
	q := &pipeline.Quiet{From: f.hourOfDay("from"), To: f.hourOfDay("to")}
	f.done()
	if q.From == q.To && f.has("from") && f.has("to") {
		r.fault(n, o.at("quiet"), "leave quiet out, or make them differ", "it begins when it ends")
		return nil
	}
	return q
}

// clock reads a time of day.
func (o *object) hourOfDay(key string) time.Duration {
	text := o.text(key, `write a time of day, in quotes, such as "22:00"`)
	if text == "" {
		return 0
	}
	t, err := time.Parse("15:04", text)
	if err != nil {
		o.r.fault(o.vals[key], o.at(key), `write a time of day, in quotes, such as "22:00"`, "%q is none", text)
	}
	return time.Duration(t.Hour())*time.Hour + time.Duration(t.Minute())*time.Minute
}
