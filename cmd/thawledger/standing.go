package main

import (
	"context"
	"fmt"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// standing is the command `standing [SITE]`.
func (p program) standing(ctx context.Context, args []string) error {
	f := p.flags("standing", "standing [--settings FILE] [SITE]: how surfaces stand against their design values")
	file := f.String("settings", "settings.yaml", "settings `file`")
	rest, err := parse(f, args, 1)
	if err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	site := strings.Join(rest, "")
	rows, err := db.StandingsNow(ctx, site)
	if err != nil {
		return err
	}
	if len(rows) == 0 && site != "" {
		return fmt.Errorf("nothing is known of a site %q; `thawledger standing` lists those that are", site)
	}
	p.showStandings(rows)
	return nil
}

// showStandings prints one line a surface and design value. Indices are in degC.d.
func (p program) showStandings(rows []store.StandingNow) {
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "SITE / SURFACE\tINDEX OF\tSEASON\tSTATE\tINDEX degC.d\tDESIGN degC.d\tSHARE\tSINCE\tTHROUGH\tFILLED\tMISSING\tOUTLOOK")
	for _, r := range rows {
		season := r.Kind + " " + r.Season
		if !r.SeasonOver {
			season += " (open)"
		}
		fmt.Fprintf(w, "%s / %s\t%s\t%s\t%s\t%s\t%s %.0f\t%s\t%s\t%s\t%s\t%d\t%s\n",
			r.Site, r.Surface, described(r.IndexOf, r.Definition), season, strings.ReplaceAll(r.State, "_", " "),
			bounds(r.IndexLowCDays, r.IndexHighCDays, r.DesignCDays, ""), limit(r.Direction), r.DesignCDays, share(r),
			since(r), r.Day.Format(time.DateOnly), filledDays(r), r.DaysMissing, restOfSeason(r))
	}
	w.Flush()
	fmt.Fprintln(p.out, "\nshare: index (or its range, where missing days leave it open) against the design value. filled, missing: days of the season")
	fmt.Fprintln(p.out, "without a mean of their own, with the standard error that filled ones give the index, degC.d. outlook: chance of ending on the")
	fmt.Fprintln(p.out, "wrong side, and when, in the middle 80 % of past years that do. A season's n-factor on a part of it is an approximation.")
	for _, r := range rows {
		for _, note := range notes(r) {
			fmt.Fprintf(p.out, "%s / %s, %s %s: %s\n", r.Site, r.Surface, r.Kind, r.Season, note)
		}
	}
	fmt.Fprintln(p.out, pipeline.Caution)
}

// filledDays is how many days of the season were filled, and the error of that.
func filledDays(r store.StandingNow) string {
	n := r.DaysInterpolated
	for _, more := range []*int{r.DaysNeighbour, r.DaysClimatology} {
		if more != nil {
			n += *more
		}
	}
	if n > 0 && r.StandardErrorCDays != nil {
		return fmt.Sprintf("%d ±%.1f", n, *r.StandardErrorCDays)
	}
	return fmt.Sprint(n)
}

// restOfSeason is the chance of ending on the wrong side, and when.
func restOfSeason(r store.StandingNow) string {
	if r.ProbabilityLow == nil || r.SeasonOver || r.State == string(pipeline.Exceeded) {
		return "-"
	}
	text := chancePercent(*r.ProbabilityLow)
	if *r.ProbabilityHigh != *r.ProbabilityLow {
		text += " to " + chancePercent(*r.ProbabilityHigh)
	}
	if r.PassDay50 != nil && r.Direction == string(pipeline.NotAbove) {
		text += fmt.Sprintf(", %s (%s to %s)", r.PassDay50.Format(time.DateOnly), r.PassDay10.Format("01-02"), r.PassDay90.Format("01-02"))
	}
	return text
}

// notes are what an engineer has to know of a standing beside its figures.
func notes(r store.StandingNow) (out []string) {
	if e := r.StandardErrorCDays; e != nil && r.Direction == string(pipeline.NotAbove) && r.IndexHighCDays < r.DesignCDays && r.IndexHighCDays+2**e >= r.DesignCDays {
		out = append(out, "the design value lies within two standard errors of the index, which filled days give it: it may have been passed")
	}
	if r.DaysDoubtful != nil && *r.DaysDoubtful > 0 && r.WithoutDoubtfulLow != nil {
		out = append(out, fmt.Sprintf("%d days rest on doubtful values; without them the index is %s degC.d", *r.DaysDoubtful,
			bounds(*r.WithoutDoubtfulLow, *r.WithoutDoubtfulHigh, r.DesignCDays, "")))
	}
	if r.Homogeneous != nil && !*r.Homogeneous {
		out = append(out, "the record changed within the season (see thaw.record_breaks)")
	}
	if r.OnsetProvisional != nil && *r.OnsetProvisional && r.IndexHighCDays > 0 {
		out = append(out, "the season's onset is provisional: a relapse may still move it")
	}
	return out
}

func described(of, definition string) string {
	if definition == string(pipeline.NotStated) {
		return of + ", definition not stated (as curve)"
	}
	return of + ", " + definition
}

func limit(direction string) string {
	if direction == string(pipeline.NotBelow) {
		return "at least"
	}
	return "at most"
}

// farBeyond is the multiple of the design value from which a highest possible
// index says only that nothing is known of some days.
const farBeyond = 10

// bounds shows an index, or its range where it is open.
func bounds(low, high, design float64, unit string) string {
	switch {
	case low == high:
		return fmt.Sprintf("%.1f%s", low, unit)
	case high >= farBeyond*design:
		return fmt.Sprintf("%.1f%s or more", low, unit)
	}
	return fmt.Sprintf("%.1f to %.1f%s", low, high, unit)
}

func share(r store.StandingNow) string {
	return bounds(100*r.IndexLowCDays/r.DesignCDays, 100*r.IndexHighCDays/r.DesignCDays, 100, " %")
}

// since is the day from which the state's level has held.
func since(r store.StandingNow) string {
	switch {
	case r.ExceededOn != nil:
		return r.ExceededOn.Format(time.DateOnly)
	case r.NearOn != nil:
		return r.NearOn.Format(time.DateOnly)
	}
	return "-"
}
