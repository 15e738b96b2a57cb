package main

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	odds "thawledger/indices/chance"
	"thawledger/indices/extreme"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// reviewDesign prints what the record says of one design value.
func (p program) reviewDesign(ctx context.Context, db *store.DB, d *store.DesignInForce, life int) error {
	say := func(topic, format string, args ...any) {
		fmt.Fprintf(p.out, "  %-9s %s\n", topic, fmt.Sprintf(format, args...))
	}
	fmt.Fprintf(p.out, "%s / %s: %s index of the %s\n", d.Site, d.Surface, d.Kind, described(d.IndexOf, d.Definition))
	stated := ""
	if d.UnitStated != string(pipeline.DegCDays) {
		stated = fmt.Sprintf(" (%g %s as stated)", d.DesignStated, d.UnitStated)
	}
	say("design", "%s %.1f degC.d%s, from %q", limit(d.Direction), d.DesignCDays, stated, d.Source)

	factor := 1.0
	if d.IndexOf == string(pipeline.OfSurface) {
		if d.NFactor == nil {
			say("record", "nothing to be said: there is no n-factor in force")
			fmt.Fprintln(p.out)
			return nil
		}
		factor = *d.NFactor
		others := ""
		if d.NFactors > 1 {
			others = "; those of earlier dates are not used"
		}
		say("n-factor", "surface index = %g x air index in every season, by the n-factor now in force (%q)%s", factor, *d.NFactorSource, others)
	}
	definition := string((&pipeline.DesignValue{Definition: pipeline.Definition(d.Definition)}).Compared())
	rows, err := db.SeasonsOfRecord(ctx, d.Station, d.Kind, definition)
	if err != nil {
		return err
	}
	if len(rows) > 0 && rows[0].BaseC != d.BaseC {
		say("record", "nothing to be said: the design value's base is %g degC, the record's %g degC", d.BaseC, rows[0].BaseC)
		fmt.Fprintln(p.out)
		return nil
	}
	r := newReview(d, rows, factor)
	say("record", "%s", r.used(d.Station))
	if len(r.known) == 0 {
		fmt.Fprintln(p.out)
		return nil
	}
	a, err := odds.Of(odds.Question{
		DesignCDays: d.DesignCDays, Direction: pipeline.Direction(d.Direction), Seasons: r.known,
		ThisYear: d.ThisSeason.Year(), LifeYears: life, Bootstrap: extreme.Usual(),
	})
	if err != nil {
		return fmt.Errorf("review design value of %s/%s: %w", d.Site, d.Surface, err)
	}
	say("passed", "%s", r.passed(&a))
	say("rank", "a season at the design value would be number %d of %d, 1 being the most severe", a.Rank, a.Seasons+1)
	if a.Change != nil {
		say("trend", "%s", changeSaid(a.Change, "seasons"))
	}
	say("chance", "of passing it in the season that starts in %d; return period; at least once in the %d years from then", d.ThisSeason.Year(), life)
	p.estimates(&a)
	breaks, err := db.BreaksOfRecord(ctx, d.Station, rows[0].SeasonStart, rows[len(rows)-1].SeasonStart.AddDate(1, 0, 0))
	if err != nil {
		return err
	}
	for _, text := range append(r.cautions(&a), breaksSaid(breaks)...) {
		say("caution", "%s", text)
	}
	fmt.Fprintln(p.out)
	return nil
}

// review is a record as it is held against a design value.
type review struct {
	design   *store.DesignInForce
	known    []odds.Season // over, and no missing day leaves the index open; index of the design value's place
	leftOut  []string      // the other seasons that are over, each with why
	certain  []string      // of those, the ones that have passed it whatever the missing days were
	open     []string      // seasons that are not over
	rules    []string      // of the daily mean
	none     int           // of known, those that never began
	harmless int           // of known, those with missing days
}

func newReview(d *store.DesignInForce, rows []store.SeasonOfRecord, factor float64) *review {
	r := &review{design: d}
	for i := range rows {
		s := &rows[i]
		if !slices.Contains(r.rules, s.MeanRule) {
			r.rules = append(r.rules, s.MeanRule)
		}
		low, high := factor*s.IndexLowCDays, factor*s.IndexHighCDays
		switch {
		case !s.SeasonOver:
			r.open = append(r.open, s.Season)
		case s.IndexLowCDays != s.IndexHighCDays:
			r.leftOut = append(r.leftOut, fmt.Sprintf("%s (%s missing, %.0f to %.0f)", s.Season, howMany(s.DaysMissing, "day"), low, high))
			if below := d.Direction == string(pipeline.NotBelow); below && high < d.DesignCDays || !below && low >= d.DesignCDays {
				r.certain = append(r.certain, s.Season)
			}
		default:
			if s.NoSeason {
				r.none++
			}
			if !s.Complete {
				r.harmless++
			}
			r.known = append(r.known, odds.Season{Year: s.SeasonStart.Year(), Label: s.Season, CDays: low})
		}
	}
	return r
}

// used says which seasons the figures rest on, and which not.
func (r *review) used(station string) string {
	var b strings.Builder
	if len(r.known) == 0 {
		fmt.Fprintf(&b, "%s has no season whose index is known", station)
	} else {
		fmt.Fprintf(&b, "%s of %s, %s to %s", howMany(len(r.known), "season"), station, r.known[0].Label, r.known[len(r.known)-1].Label)
	}
	if r.harmless > 0 {
		fmt.Fprintf(&b, "; %d of them with missing days that leave nothing open", r.harmless)
	}
	if len(r.leftOut) > 0 {
		fmt.Fprintf(&b, "; %d left out: %s", len(r.leftOut), seasonList(r.leftOut))
	}
	for _, s := range r.open {
		fmt.Fprintf(&b, "; %s is not over and does not count", s)
	}
	return b.String()
}

// seasonList joins texts, of many the last ones only.
func seasonList(texts []string) string {
	const most = 12
	if len(texts) > most {
		return fmt.Sprintf("%d earlier, %s", len(texts)-most, strings.Join(texts[len(texts)-most:], ", "))
	}
	return strings.Join(texts, ", ")
}

func (r *review) passed(a *odds.Answer) string {
	verb := "reached or passed it"
	if r.design.Direction == string(pipeline.NotBelow) {
		verb = "fell short of it"
	}
	if len(a.Passed) == 0 {
		return fmt.Sprintf("none of %d seasons %s", a.Seasons, verb) + r.certainly()
	}
	texts := make([]string, len(a.Passed))
	for i, s := range a.Passed {
		texts[i] = fmt.Sprintf("%s (%.0f)", s.Label, s.CDays)
	}
	return fmt.Sprintf("%d of %d seasons %s: %s", len(a.Passed), a.Seasons, verb, seasonList(texts)) + r.certainly()
}

func (r *review) certainly() string {
	if len(r.certain) == 0 {
		return ""
	}
	return fmt.Sprintf("; so did, whatever their missing days were, %s, which are not counted", seasonList(r.certain))
}

// changeSaid tells a trend.
func changeSaid(c *odds.Change, what string) string {
	slope := fmt.Sprintf("%+.1f degC.d a year", c.Line.Slope)
	if c.Line.Bounded {
		slope += fmt.Sprintf(" (%+.1f to %+.1f)", c.Line.Low, c.Line.High)
	}
	text := fmt.Sprintf("%s by Theil-Sen over %d %s; Mann-Kendall p %.2g", slope, c.Line.N, what, c.Kendall.P)
	if c.HasLag {
		text += fmt.Sprintf("; lag-one autocorrelation %.2f of %d pairs of years", c.LagOne, c.LagPairs)
	}
	return text
}

// estimates prints the chance both ways.
func (p program) estimates(a *odds.Answer) {
	show := func(name, passed string, e *odds.Estimate) {
		fmt.Fprintf(p.out, "    %s, %d to %d, %s\n", name, e.First, e.Last, howMany(e.Seasons, "season"))
		fmt.Fprintf(p.out, "      counted    %d %s: %s (%s to %s); return period %s\n", e.Passed, passed, chanceSaid(e.Empirical),
			chanceSaid(e.EmpiricalInterval.Low), chanceSaid(e.EmpiricalInterval.High), extreme.PeriodOf(e.Empirical, e.Seasons))
		if f := e.Fitted; f != nil {
			fmt.Fprintf(p.out, "      %-10s %s (%s to %s); return period %s; correlation %.4f, Anderson-Darling p %.2f\n", f.Name,
				chanceSaid(f.Chance), chanceSaid(f.Interval.Low), chanceSaid(f.Interval.High), periodSaid(e), f.Correlation, f.PValue)
		} else {
			fmt.Fprintf(p.out, "      no distribution: at least %d seasons that differ are needed\n", extreme.MinSample)
		}
		fmt.Fprintf(p.out, "      remaining  %s\n", chanceSaid(e.Life))
	}
	show("latest 30 years", "passed", &a.Latest)
	if a.Trend == nil {
		fmt.Fprintf(p.out, "    along the trend: %s\n", a.NoTrend)
		return
	}
	show("along the trend", "would pass now", a.Trend)
}

// periodSaid shows a return period with its interval.
func periodSaid(e *odds.Estimate) string {
	short, long := extreme.PeriodOf(e.Fitted.Interval.High, e.Seasons), extreme.PeriodOf(e.Fitted.Interval.Low, e.Seasons)
	if short.Beyond && long.Beyond {
		return e.Period().String()
	}
	return fmt.Sprintf("%s (%s to %s)", e.Period(), short, long)
}

// cautions are what a reader must not miss.
func (r *review) cautions(a *odds.Answer) (out []string) {
	if a.Change != nil && a.Change.Significant() {
		out = append(out, "the record changes with the years: the latest 30 years are a climate of some 15 years ago; look at both chances")
	}
	if a.Change != nil && a.Change.HasLag && a.Change.LagOne > 2/math.Sqrt(float64(a.Change.LagPairs)) {
		out = append(out, "neighbouring years go together: p is too small, and the intervals are too narrow")
	}
	for _, e := range []*odds.Estimate{&a.Latest, a.Trend} {
		if e != nil && e.Fitted != nil && e.Fitted.Poor() {
			out = append(out, fmt.Sprintf("%s is the best of four distributions and still fits poorly: go by the count", e.Fitted.Name))
			break
		}
	}
	if a.Latest.Seasons < odds.TrendSeasons {
		out = append(out, fmt.Sprintf("%s are few: the figures are rough", howMany(a.Latest.Seasons, "season")))
	}
	if r.none > 0 {
		out = append(out, fmt.Sprintf("%s never began and count as 0: no distribution suits that", howMany(r.none, "season")))
	}
	if len(r.rules) > 1 {
		out = append(out, "the daily mean was made by several rules ("+strings.Join(r.rules, ", ")+"): the record is not of one piece")
	}
	if r.design.Definition == string(pipeline.NotStated) {
		out = append(out, "the document does not state the definition: the curve index is taken; by the sum it is as high or higher")
	}
	return out
}

func breaksSaid(breaks []store.BreakOfRecord) []string {
	if len(breaks) == 0 {
		return nil
	}
	texts := make([]string, len(breaks))
	for i, b := range breaks {
		texts[i] = fmt.Sprintf("%s %s", b.FromDay.Format(time.DateOnly), b.What)
		if b.Note != "" {
			texts[i] += " (" + b.Note + ")"
		}
	}
	return []string{"possible breaks of the record: " + seasonList(texts)}
}
