package delivery

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strings"

	"thawledger/pipeline"
)

var (
	kinds      = []Kind{News, Update, Withdrawal, Reminder, Drill}
	states     = []pipeline.State{pipeline.Exceeded, pipeline.Unknown, pipeline.Expected, pipeline.Near, pipeline.Within, pipeline.FellShort}
	indexKinds = []pipeline.Kind{pipeline.Thaw, pipeline.Freeze}
	directions = []pipeline.Direction{pipeline.NotAbove, pipeline.NotBelow}
	shownUnits = []pipeline.IndexUnit{"", pipeline.DegCDays, pipeline.DegFDays}
)

// maxName is the greatest length of a key and of an item's About.
const maxName = 80

// Check says everything that is wrong with a notice; nil if nothing is. Channels
// deliver only what passes it, so that no message goes out with a figure that is
// none, and no key breaks a header.
func (n *Notice) Check() error {
	var faults []error
	add := func(bad bool, format string, args ...any) {
		if bad {
			faults = append(faults, fmt.Errorf(format, args...))
		}
	}
	add(!IsName(n.Key), "key %q: 1 to %d of a-z A-Z 0-9 . _ - are needed", n.Key, maxName)
	add(!slices.Contains(kinds, n.Kind), "kind %q is unknown", n.Kind)
	add(n.Written.IsZero(), "it does not say when it was written")
	add(len(n.Items) == 0, "there are no items")
	add(!slices.Contains(shownUnits, n.Recipient.Unit), "unit %q: indices are shown in %s or %s", n.Recipient.Unit, pipeline.DegCDays, pipeline.DegFDays)
	about := map[string]bool{}
	for i := range n.Items {
		item := &n.Items[i]
		add(about[item.About], "two items are about %s", item.About)
		about[item.About] = true
		add((item.Kind == Drill) != (n.Kind == Drill), "item %d (%s) is of kind %s in a notice of kind %s; an exercise stands alone", i+1, item.About, item.Kind, n.Kind)
		if err := item.check(); err != nil {
			faults = append(faults, fmt.Errorf("item %d (%s): %w", i+1, item.About, err))
		}
	}
	if len(faults) == 0 {
		return nil
	}
	return fmt.Errorf("notice %q: %w", n.Key, errors.Join(faults...))
}

func (i *Item) check() error {
	var faults []string
	add := func(bad bool, format string, args ...any) {
		if bad {
			faults = append(faults, fmt.Sprintf(format, args...))
		}
	}
	add(!IsName(i.About), "about %q: 1 to %d of a-z A-Z 0-9 . _ - are needed", i.About, maxName)
	add(!slices.Contains(kinds, i.Kind), "kind %q is unknown", i.Kind)
	add(i.Site == "" || i.Surface == "", "site or surface is not named")
	add(!slices.Contains(indexKinds, i.Index), "kind of index %q is unknown", i.Index)
	add(!slices.Contains(directions, i.Direction), "direction %q is unknown", i.Direction)
	add(i.From != "" && !slices.Contains(states, i.From), "state %q is unknown", i.From)
	add(!slices.Contains(states, i.To), "state %q is unknown", i.To)
	add(i.Kind == Withdrawal && len(i.Earlier) == 0, "a withdrawal has to cite what it withdraws")
	for _, c := range i.Earlier {
		add(!IsName(c.Key) || c.Written.IsZero(), "earlier notice %q is not named by key and time", c.Key)
	}
	add(!(i.ToDate.Low <= i.ToDate.High), "index from %v to %v are no bounds", i.ToDate.Low, i.ToDate.High)
	add(!(i.Design.CDays > 0), "design value %v degC.d is not above 0", i.Design.CDays)
	add(i.Place != nil && !i.Place.valid(), "place is not on Earth")
	add(i.Rank != nil && !(1 <= i.Rank.Place && i.Rank.Place <= i.Rank.Of), "rank is not one of the seasons'")
	add(i.Outlook != nil && !(0 <= i.Outlook.Probability && i.Outlook.Probability <= 1), "probability is not from 0 to 1")
	for _, v := range i.numbers() {
		if math.IsNaN(v) || math.Abs(v) > 1e9 {
			add(true, "%v is not a figure", v)
			break
		}
	}
	if len(faults) == 0 {
		return nil
	}
	return errors.New(strings.Join(faults, "; "))
}

// numbers returns every number that the item shows.
func (i *Item) numbers() []float64 {
	out := []float64{i.ToDate.Low, i.ToDate.High, i.Design.CDays, i.Design.Stated, i.Design.NearShare}
	for _, p := range []*float64{i.ToDate.Central, i.Design.NFactor} {
		if p != nil {
			out = append(out, *p)
		}
	}
	if m := i.Margin; m != nil {
		out = append(out, m.CDays)
		if m.Days != nil {
			out = append(out, *m.Days)
		}
	}
	if o := i.Outlook; o != nil && o.End != nil {
		out = append(out, o.End.P10, o.End.P50, o.End.P90)
	}
	if c := i.Chart; c != nil {
		for _, d := range c.Season {
			out = append(out, d.Low, d.High)
		}
		for _, d := range c.Past {
			out = append(out, d.P10, d.P50, d.P90)
		}
	}
	return out
}

func (p *Place) valid() bool {
	ok := func(lat, lon float64) bool { return -90 <= lat && lat <= 90 && -180 <= lon && lon <= 180 }
	for _, q := range p.Outline {
		if !ok(q.Lat, q.Lon) {
			return false
		}
	}
	return ok(p.Lat, p.Lon)
}

// IsName reports whether s can be a key: 1 to 80 of a-z A-Z 0-9 . _ -
func IsName(s string) bool {
	if s == "" || len(s) > maxName {
		return false
	}
	for _, r := range s {
		switch {
		case 'a' <= r && r <= 'z', 'A' <= r && r <= 'Z', '0' <= r && r <= '9', r == '.', r == '_', r == '-':
		default:
			return false
		}
	}
	return true
}
