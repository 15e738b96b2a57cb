package main

import (
	"fmt"
	"slices"
	"strings"
	"text/tabwriter"
	"time"

	odds "thawledger/indices/chance"
	"thawledger/indices/extreme"
	"thawledger/indices/trend"
	"thawledger/pipeline/store"
)

// labelsOf shows seasons with their bounds.
func labelsOf(seasons []extreme.Season) string {
	texts := make([]string, len(seasons))
	for i, s := range seasons {
		texts[i] = fmt.Sprintf("%s (%.0f to %.0f)", s.Label, s.Low, s.High)
	}
	return seasonList(texts)
}

// showUnknown prints the seasons whose index is not known, and what became of them.
func (p program) showUnknown(severe *extreme.Severe, known []extreme.Season, c *computing) {
	if severe.Unended > 0 {
		fmt.Fprintf(p.out, "%s not over: never counts\n", howMany(severe.Unended, "season"))
	}
	if len(c.without) > 0 {
		fmt.Fprintf(p.out, "left out by decision of %s: %s\n", c.author, strings.Join(c.without, ", "))
	}
	if c.by != byPeriod {
		if len(severe.LeftOut) > 0 {
			fmt.Fprintf(p.out, "incomplete, and not among the %s whatever their missing days were: %s\n", c.warmest(), labelsOf(severe.LeftOut))
		}
		if len(severe.Open) > 0 {
			fmt.Fprintf(p.out, "incomplete, and possibly among the %s: %s\n", c.warmest(), labelsOf(severe.Open))
		}
	} else if n := len(severe.Seasons) - len(known); n > 0 {
		out := slices.DeleteFunc(slices.Clone(severe.Seasons), func(s extreme.Season) bool { return slices.Contains(known, s) })
		fmt.Fprintf(p.out, "incomplete, left out of the fits: %s\n", labelsOf(out))
	}
}

// showFits prints the four distributions, with how well each fits.
func (p program) showFits(v *computed, c *computing, noFit error, n int) {
	if noFit != nil {
		fmt.Fprintf(p.out, "no distribution can be fitted: %v\n\n", noFit)
		return
	}
	asked := c.years
	if c.by != byPeriod {
		asked = 25
	}
	fmt.Fprintf(p.out, "\nfits by L-moments to %s\n", howMany(n, "season"))
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintf(w, "DISTRIBUTION\tCORRELATION\tA-D\tP\t10 YEARS\t25\t50\t100\t%g YEARS, 90 %% INTERVAL\tPARAMETERS\n", asked)
	for i := range v.fits {
		f := &v.fits[i]
		name := f.Name.String()
		if i == v.best {
			name += " *"
		}
		if f.Err != nil {
			fmt.Fprintf(w, "%s\t%v\n", name, f.Err)
			continue
		}
		level := func(years float64) float64 { return extreme.ReturnLevel(f.Distribution, c.tail(), years) }
		within := f.Resampled.LevelInterval(c.tail(), asked)
		var parameters []string
		for _, q := range f.Distribution.Parameters() {
			parameters = append(parameters, fmt.Sprintf("%s %.4g", q.Name, q.Value))
		}
		fmt.Fprintf(w, "%s\t%.4f\t%.3f\t%.3f\t%.0f\t%.0f\t%.0f\t%.0f\t%.0f (%.0f to %.0f)\t%s\n", name, f.Correlation, f.Statistic, f.PValue,
			level(10), level(25), level(50), level(100), level(asked), within.Low, within.High, strings.Join(parameters, ", "))
	}
	w.Flush()
	fmt.Fprintf(p.out, "* fits best. correlation: of the probability plot, Cunnane's positions; A-D: Anderson-Darling, and its p from %d samples drawn from the fit\n\n", extreme.Usual().Replicates)
}

// cautions are what whoever takes the value over must not miss.
func (c *computing) cautions(v *computed, known []extreme.Season, rows []store.SeasonOfRecord) (out []string) {
	out = append(out, c.trends(known, rows)...)
	if c.by == byThree {
		out = append(out, fmt.Sprintf("the mean of the three %s of 30 seasons is on average the value of some 20 to 25 years, and not of 100", c.warmest()))
	}
	if n := len(known); c.by == byPeriod && c.years > 2*float64(n) {
		out = append(out, fmt.Sprintf("%g years are more than twice the record of %s: all that it can bear is > %d years", c.years, howMany(n, "season"), 2*n))
	}
	if v.fits != nil {
		gumbel, best := &v.fits[slices.Index(extreme.Names, extreme.NameGumbel)], &v.fits[v.best]
		if v.best != slices.Index(extreme.Names, extreme.NameGumbel) {
			out = append(out, fmt.Sprintf("Gumbel fits worse than %s (correlation %.4f against %.4f, p %.3f against %.3f): for 100 years it gives %.0f instead of %.0f",
				best.Name, gumbel.Correlation, best.Correlation, gumbel.PValue, best.PValue,
				extreme.ReturnLevel(gumbel.Distribution, c.tail(), 100), extreme.ReturnLevel(best.Distribution, c.tail(), 100)))
		}
		if chosen := &v.fits[v.chosen]; c.by == byPeriod && chosen.Poor() {
			out = append(out, fmt.Sprintf("%s, by which the value is, fits poorly (p %.3f)", chosen.Name, chosen.PValue))
		}
	}
	var rules []string
	for i := range rows {
		if !slices.Contains(rules, rows[i].MeanRule) {
			rules = append(rules, rows[i].MeanRule)
		}
	}
	if len(rules) > 1 {
		out = append(out, "the daily mean was made by several rules ("+strings.Join(rules, ", ")+"): the record is not of one piece")
	}
	return out
}

// trends tells how the whole record and the period change with the years.
func (c *computing) trends(period []extreme.Season, rows []store.SeasonOfRecord) (out []string) {
	all := knownOf(recordOf(rows))
	tell := func(seasons []extreme.Season, what string) {
		points := make([]trend.Point, len(seasons))
		for i, s := range seasons {
			points[i] = trend.Point{Time: float64(s.Start.Time().Year()), Value: s.Low}
		}
		k, err := trend.MannKendall(points)
		if err != nil || k.P >= odds.Significant {
			return
		}
		line, err := trend.TheilSen(points, 0.95)
		if err != nil {
			return
		}
		change := odds.Change{Kendall: k, Line: line}
		change.LagOne, change.LagPairs, change.HasLag = trend.LagOne(points, line)
		out = append(out, what+" changes with the years: "+changeSaid(&change, "seasons")+". A value from past seasons is one of a past climate")
	}
	tell(all, "the record")
	if len(period) != len(all) {
		tell(period, "the period of the value itself")
	}
	return out
}

// block is the value as settings.yaml states it.
func (c *computing) block(v *computed, rows []store.SeasonOfRecord, now time.Time) string {
	source := fmt.Sprintf("computed once from the record of station %s: %s; period %s to %s; seasons %s", c.station, v.method,
		v.period[0].Label, v.period[len(v.period)-1].Label, strings.Join(v.used, ", "))
	if len(c.without) > 0 {
		source += "; without " + strings.Join(c.without, ", ")
	}
	source += fmt.Sprintf("; by %s, %s", strings.TrimSpace(c.author), now.UTC().Format(time.DateOnly))
	var b strings.Builder
	fmt.Fprintf(&b, "        design_values:\n          - kind: %s\n            definition: %s\n            of: air\n            direction: %s\n", c.kind, c.definition, c.direction)
	fmt.Fprintf(&b, "            index: %.1f\n            unit: degC.d\n", v.value)
	if rows[0].BaseC != 0 {
		fmt.Fprintf(&b, "            base_c: %g\n", rows[0].BaseC)
	}
	fmt.Fprintf(&b, "            source: %q\n", source)
	return b.String()
}
