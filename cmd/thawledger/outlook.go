package main

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"
	"text/tabwriter"

	"thawledger/alerts/judge"
	"thawledger/indices"
	"thawledger/indices/outlook"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

const outlookSynopsis = `outlook [--station S] [--as-of DAY]: what the seasons that are not over may come to; made from the record as it is, shown and stored
thawledger outlook hindcast --station S [--kind thaw] [--definition curve] [--from-year Y]: what such outlooks of past seasons were worth`

// outlook is the command `outlook`.
func (p program) outlook(ctx context.Context, args []string) error {
	if len(args) > 0 && args[0] == "hindcast" {
		return p.hindcast(ctx, args[1:])
	}
	f := p.flags("outlook", outlookSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	station := f.String("station", "", "only surfaces on this `station`")
	asOf := f.String("as-of", "", "use only days up to this `day`, such as 2031-07-20")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	until := pipeline.Day(math.MaxInt32)
	if *asOf != "" {
		var err error
		if until, err = pipeline.ParseDay(*asOf); err != nil {
			return err
		}
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	stations, err := stationsNamed(set.Stations, *station)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	svc := &indices.Service{DB: db}
	var all []indices.MadeOutlook
	var notes []string
	for i := range stations {
		m, err := svc.Outlooks(ctx, &stations[i], until)
		if err != nil {
			return err
		}
		// Scores of a record cut short would stand for the whole one.
		if err := m.Keep(ctx, db, *asOf == ""); err != nil {
			return err
		}
		all, notes = append(all, m.Outlooks...), append(notes, m.Notes...)
	}
	p.showOutlooks(all, notes)
	return nil
}

// stationsNamed returns the stations with the given name, all if it is "".
func stationsNamed(stations []pipeline.Station, name string) ([]pipeline.Station, error) {
	if name == "" {
		return stations, nil
	}
	i := slices.IndexFunc(stations, func(s pipeline.Station) bool { return s.ID == name })
	if i < 0 {
		return nil, fmt.Errorf("there is no station %q in the settings", name)
	}
	return stations[i : i+1], nil
}

// showOutlooks prints one line a surface and design value.
func (p program) showOutlooks(all []indices.MadeOutlook, notes []string) {
	if len(all) > 0 {
		w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
		fmt.Fprintln(w, "SITE / SURFACE\tSEASON\tTHROUGH\tDESIGN degC.d\tTO DATE\tCHANCE\tON (10 to 90 %)\tSEASON'S END 10, 50, 90 %\tMEMBERS\tSKILL (5 to 95 %)\tEXPECTED")
		for i := range all {
			m := &all[i]
			fmt.Fprintf(w, "%s / %s\t%s %s\t%s\t%s\t%s\t%s\t%s\t%s\t%d %s\t%s\t%s\n", m.Design.Site, m.Design.Surface,
				m.Row.Kind, m.Row.Season, m.Row.Through, designOf(&m.Design), bounds(m.Row.IndexLow, m.Row.IndexHigh, m.Row.ThresholdCDays, ""),
				chance(m), passDays(&m.Row), seasonsEnd(&m.Row), m.Row.Members, m.Row.Which, skillShown(m.Row.Skill), expectation(m))
		}
		w.Flush()
		fmt.Fprintf(p.out, "\nIndices are of the air, degC.d. chance: of the season's end, (k + 1/2)/(n + 1) with k of n members. on: if it comes to it at all.\n"+
			"members: past years whose remaining days were joined to this year's path; moved: shifted by the trend since. skill: by how much such\n"+
			"outlooks of past seasons at this lead beat the seasons before them (CRPS). expected: the chance is at least %.0f %%; may be announced only with skill.\n",
			100*judge.ExpectedShare)
	}
	for _, n := range notes {
		fmt.Fprintln(p.out, n)
	}
	if len(all) == 0 && len(notes) == 0 {
		fmt.Fprintln(p.out, "no surface has a design value")
	}
	fmt.Fprintln(p.out, pipeline.Caution)
}

func designOf(d *store.AirDesign) string {
	text := fmt.Sprintf("%s %.0f", limit(string(d.Direction)), d.AirCDays)
	if d.NFactor != nil {
		text += fmt.Sprintf(" (surface %.0f)", d.CDays)
	}
	return text
}

// chance is that of ending on the wrong side of the design value.
func chance(m *indices.MadeOutlook) string {
	low, high := m.Row.Adverse(m.Design.Direction)
	what := "passes"
	if m.Design.Direction == pipeline.NotBelow {
		what = "falls short"
	}
	switch {
	case m.Row.Passed && m.Design.Direction == pipeline.NotBelow:
		return "has come to it"
	case m.Row.Passed:
		return "has passed"
	case low == high:
		return fmt.Sprintf("%s %s", what, chancePercent(low))
	}
	return fmt.Sprintf("%s %s to %s", what, chancePercent(low), chancePercent(high))
}

func chancePercent(p float64) string {
	if p < 0.1 || p > 0.9 {
		return fmt.Sprintf("%.1f %%", 100*p)
	}
	return fmt.Sprintf("%.0f %%", 100*p)
}

func passDays(r *store.OutlookRow) string {
	switch {
	case r.PassDay50 == nil:
		return "-"
	case *r.PassDay10 == *r.PassDay90:
		return r.PassDay50.String()
	}
	return fmt.Sprintf("%s (%s to %s)", r.PassDay50, r.PassDay10.String()[5:], r.PassDay90.String()[5:])
}

func seasonsEnd(r *store.OutlookRow) string {
	middle := "?"
	if r.End50 != nil {
		middle = fmt.Sprintf("%.0f", *r.End50)
	}
	return fmt.Sprintf("%.0f, %s, %.0f", r.End10, middle, r.End90)
}

func skillShown(s *store.OutlookSkill) string {
	switch {
	case s == nil:
		return "unknown"
	case s.Low == nil:
		return fmt.Sprintf("%.2f", s.Value)
	}
	return fmt.Sprintf("%.2f (%.2f to %.2f)", s.Value, *s.Low, *s.High)
}

// expected reports whether even the lowest chance of an adverse end is enough.
func expected(m *indices.MadeOutlook) bool {
	low, _ := m.Row.Adverse(m.Design.Direction)
	return low >= judge.ExpectedShare
}

func expectation(m *indices.MadeOutlook) string {
	switch {
	case m.Row.Passed: // known, and no matter of chance
		return "-"
	case m.Row.AnnouncedAllowed && expected(m):
		return "yes"
	case m.Row.AnnouncedAllowed:
		return "no"
	case m.Row.ScoredYears < outlook.LeastYears:
		return fmt.Sprintf("not announced: %d seasons scored, %d needed", m.Row.ScoredYears, outlook.LeastYears)
	}
	return "not announced: no skill at this lead"
}

// indexDefinition and indexKind read what a season's index is.
func indexDefinition(s string) (pipeline.Definition, error) {
	d := pipeline.Definition(strings.ToLower(s))
	if d != pipeline.Curve && d != pipeline.Sum {
		return "", fmt.Errorf("%q is no definition of an index; curve or sum is right", s)
	}
	return d, nil
}

func indexKind(s string) (pipeline.Kind, error) {
	k := pipeline.Kind(strings.ToLower(s))
	if k != pipeline.Thaw && k != pipeline.Freeze {
		return "", fmt.Errorf("%q is no kind of index; thaw or freeze is right", s)
	}
	return k, nil
}
