package main

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"time"

	odds "thawledger/indices/chance"
	"thawledger/indices/extreme"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// computing is what `design compute` is asked for.
type computing struct {
	station, kind, definition, by, direction, author string
	years                                            float64
	distribution                                     extreme.Name
	latest                                           int
	without                                          []string
}

// The rules by which a design value may be computed.
const (
	byThree  = "three-warmest"
	byTen    = "warmest-of-ten"
	byPeriod = "return-period"
)

// designCompute is the command `design compute`.
func (p program) designCompute(ctx context.Context, args []string) error {
	f := p.flags("design compute", designSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	var c computing
	f.StringVar(&c.station, "station", "", "`station` whose record is used")
	f.StringVar(&c.kind, "kind", "", "`thaw or freeze`")
	f.StringVar(&c.definition, "definition", "", "`curve or sum`")
	f.StringVar(&c.by, "by", "", "`rule`: "+byThree+" (mean of the three most severe of the latest 30 seasons), "+byTen+" (the most severe of the latest 10), or "+byPeriod)
	f.StringVar(&c.direction, "direction", string(pipeline.NotAbove), "`not_above or not_below`; for not_below (what must freeze enough) the mildest winters are the severe ones")
	f.Float64Var(&c.years, "years", 0, "return period in `years`; for --by "+byPeriod)
	distribution := f.String("distribution", "", "`gev, gumbel, normal or pearson3`; the best fitting one if left out")
	f.IntVar(&c.latest, "latest", odds.LatestYears, "for --by "+byPeriod+": of the latest `seasons`")
	without := f.String("without", "", "`seasons` left out by your decision, such as 1987,1991; the source says so")
	f.StringVar(&c.author, "author", "", "`name` of whoever answers for the value")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	c.distribution = extreme.Name(*distribution)
	for _, label := range strings.Split(*without, ",") {
		if label = strings.TrimSpace(label); label != "" {
			c.without = append(c.without, label)
		}
	}
	if err := c.check(); err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	if _, err := stationNamed(set, c.station); err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	rows, err := db.SeasonsOfRecord(ctx, c.station, c.kind, c.definition)
	if err != nil {
		return err
	}
	if rows, err = c.kept(rows); err != nil {
		return err
	}
	first, last := rows[0].SeasonStart, rows[len(rows)-1].SeasonStart.AddDate(1, 0, 0)
	breaks, err := db.BreaksOfRecord(ctx, c.station, first, last)
	if err != nil {
		return err
	}
	return p.compute(&c, rows, breaks, time.Now())
}

// check says all that is wrong with the call.
func (c *computing) check() error {
	var wrong []error
	oneOf := func(flag, value string, known ...string) {
		if !slices.Contains(known, value) {
			wrong = append(wrong, fmt.Errorf("--%s %q: write one of %s", flag, value, strings.Join(known, ", ")))
		}
	}
	if c.station == "" {
		wrong = append(wrong, errors.New("--station is missing: say whose record"))
	}
	oneOf("kind", c.kind, string(pipeline.Thaw), string(pipeline.Freeze))
	oneOf("definition", c.definition, string(pipeline.Curve), string(pipeline.Sum))
	oneOf("by", c.by, byThree, byTen, byPeriod)
	oneOf("direction", c.direction, string(pipeline.NotAbove), string(pipeline.NotBelow))
	if c.kind == string(pipeline.Thaw) && c.direction == string(pipeline.NotBelow) {
		wrong = append(wrong, errors.New("--direction not_below: a thawing index has no lower limit to keep"))
	}
	if strings.TrimSpace(c.author) == "" {
		wrong = append(wrong, errors.New("--author is missing: say who answers for the value"))
	}
	names := []string{""}
	for _, n := range extreme.Names {
		names = append(names, string(n))
	}
	oneOf("distribution", string(c.distribution), names...)
	switch {
	case c.by == byPeriod && !(c.years > 1 && c.years <= 1000):
		wrong = append(wrong, fmt.Errorf("--years %g: write a return period above 1 and at most 1000 years", c.years))
	case c.by != byPeriod && (c.years != 0 || c.distribution != "" || c.latest != odds.LatestYears):
		wrong = append(wrong, fmt.Errorf("--years, --distribution and --latest belong to --by %s", byPeriod))
	case c.latest < extreme.MinSample:
		wrong = append(wrong, fmt.Errorf("--latest %d: a distribution needs at least %d seasons", c.latest, extreme.MinSample))
	}
	return errors.Join(wrong...)
}

// kept returns the record without the seasons that are left out by decision.
func (c *computing) kept(rows []store.SeasonOfRecord) ([]store.SeasonOfRecord, error) {
	for _, label := range c.without {
		if !slices.ContainsFunc(rows, func(r store.SeasonOfRecord) bool { return r.Season == label }) {
			return nil, fmt.Errorf("--without %s: %s has no such %s season", label, c.station, c.kind)
		}
	}
	out := slices.DeleteFunc(slices.Clone(rows), func(r store.SeasonOfRecord) bool { return slices.Contains(c.without, r.Season) })
	if len(out) == 0 {
		return nil, fmt.Errorf("%s has no %s season", c.station, c.kind)
	}
	return out, nil
}

func (c *computing) tail() extreme.Tail {
	if c.direction == string(pipeline.NotBelow) {
		return extreme.Lower
	}
	return extreme.Upper
}

// computed is a design value made from the record.
type computed struct {
	value  float64 // degC.d
	method string  // for the source
	period []extreme.Season
	used   []string // seasons that it rests on
	fits   []extreme.Fitted
	chosen int // of fits
	best   int
}

// compute works a design value out and prints it with all that it rests on.
func (p program) compute(c *computing, rows []store.SeasonOfRecord, breaks []store.BreakOfRecord, now time.Time) error {
	severe, err := c.severe(recordOf(rows))
	if err != nil {
		return err
	}
	v := computed{period: severe.Seasons}
	known := knownOf(severe.Seasons)
	values := make([]float64, len(known))
	for i, s := range known {
		values[i] = s.Low
	}
	var noFit error
	if v.fits, noFit = extreme.FitAll(values, extreme.Usual()); noFit == nil {
		v.best = extreme.Best(v.fits)
		v.chosen = v.best
	}
	fmt.Fprintf(p.out, "%s index of the air at %s by %s, degC.d, base %g degC: %s to %s, %s, of %d the index is known\n\n", c.kind, c.station, c.definition,
		rows[0].BaseC, v.period[0].Label, v.period[len(v.period)-1].Label, howMany(len(v.period), "season"), len(known))
	p.showUnknown(&severe, known, c)
	p.showFits(&v, c, noFit, len(values))
	if err := c.settle(&v, &severe, known, noFit); err != nil {
		return err
	}
	fmt.Fprintf(p.out, "design value: %.1f degC.d, %s\nseasons used: %s\n", v.value, v.method, strings.Join(v.used, ", "))
	if noFit == nil {
		best := &v.fits[v.best]
		at := extreme.Chance(best.Distribution, c.tail(), v.value)
		fmt.Fprintf(p.out, "by %s it is passed with a chance of %s in a season; return period %s\n", best.Name, chanceSaid(at), extreme.PeriodOf(at, len(values)))
	}
	fmt.Fprintln(p.out)
	for _, text := range slices.Concat(c.cautions(&v, known, rows), breaksSaid(breaks)) {
		fmt.Fprintf(p.out, "caution: %s\n", text)
	}
	fmt.Fprintf(p.out, "\nfor settings.yaml, at the surface that it is for; computed once, it stays until somebody decides otherwise:\n\n%s\n%s\n", c.block(&v, rows, now), pipeline.Caution)
	return nil
}

// severe returns the period, and for the rules of the most severe seasons the value.
func (c *computing) severe(seasons []extreme.Season) (extreme.Severe, error) {
	switch c.by {
	case byThree:
		s, err := extreme.MostSevere(seasons, c.tail(), 3, odds.LatestYears)
		if err != nil {
			err = fmt.Errorf("%w; where 30 are not to be had, --by %s is the rule", err, byTen)
		}
		return s, err
	case byTen:
		return extreme.MostSevere(seasons, c.tail(), 1, 10)
	}
	over := 0
	for _, s := range seasons {
		if s.Over {
			over++
		}
	}
	if over < extreme.MinSample {
		return extreme.Severe{}, fmt.Errorf("the record has %s that are over; a distribution needs at least %d", howMany(over, "season"), extreme.MinSample)
	}
	return extreme.MostSevere(seasons, c.tail(), 1, min(over, c.latest))
}

// knownOf returns the seasons whose index no missing day leaves open.
func knownOf(seasons []extreme.Season) []extreme.Season {
	return slices.DeleteFunc(slices.Clone(seasons), func(s extreme.Season) bool { return !s.Known() })
}

// settle works the value out by the rule.
func (c *computing) settle(v *computed, severe *extreme.Severe, known []extreme.Season, noFit error) error {
	if c.by == byPeriod {
		if noFit != nil {
			return fmt.Errorf("no value by return period: %w", noFit)
		}
		if c.distribution != "" {
			v.chosen = slices.Index(extreme.Names, c.distribution)
		}
		f := &v.fits[v.chosen]
		if f.Err != nil {
			return fmt.Errorf("no value by %s: %w", f.Name, f.Err)
		}
		within := f.Resampled.LevelInterval(c.tail(), c.years)
		v.value = extreme.ReturnLevel(f.Distribution, c.tail(), c.years)
		v.method = fmt.Sprintf("return period %g years by %s, L-moments (90 %% interval %.0f to %.0f)", c.years, f.Name, within.Low, within.High)
		for _, s := range known {
			v.used = append(v.used, s.Label)
		}
		if !(v.value > 0) {
			return fmt.Errorf("no design value: the index of %g years by %s is %.1f degC.d, and an index is above 0", c.years, f.Name, v.value)
		}
		return nil
	}
	if !severe.Settled() {
		return fmt.Errorf("no design value: it is open between %.1f and %.1f degC.d, by what the missing days of %s were; get the missing days, or decide to leave seasons out (--without)",
			severe.Low, severe.High, labelsOf(severe.Open))
	}
	v.value = severe.Low
	if !(v.value > 0) {
		return errors.New("no design value: it would be 0 degC.d")
	}
	v.method = fmt.Sprintf("mean of the three %s of the latest 30 seasons", c.warmest())
	if c.by == byTen {
		v.method = fmt.Sprintf("the %s of the latest 10 seasons", c.warmest())
	}
	for _, s := range severe.Used {
		v.used = append(v.used, fmt.Sprintf("%s (%.1f)", s.Label, s.Low))
	}
	return nil
}

// warmest is what the most severe seasons are called.
func (c *computing) warmest() string {
	switch {
	case c.kind == string(pipeline.Thaw):
		return "warmest"
	case c.tail() == extreme.Lower:
		return "mildest"
	}
	return "coldest"
}
