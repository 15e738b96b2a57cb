package main

import (
	"context"
	"fmt"
	"time"

	"thawledger/indices/extreme"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

const designSynopsis = `design [--site S] [--surface F] [--years M] [--settings FILE]: every design value in force against the record: who has passed
it, how likely that is in this year's climate, within the years that remain
thawledger design compute --station S --kind thaw|freeze --definition curve|sum --author NAME
    --by three-warmest|warmest-of-ten|return-period [--years T] [--distribution gev|gumbel|normal|pearson3]
    [--direction not_above|not_below] [--latest N] [--without SEASONS]: a design value, once, from the record`

// defaultLife is how many years of service remain where nothing is said: common
// practice, no source.
const defaultLife = 30

// design is the command `design [compute]`.
func (p program) design(ctx context.Context, args []string) error {
	if len(args) > 0 && args[0] == "compute" {
		return p.designCompute(ctx, args[1:])
	}
	f := p.flags("design", designSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	site, surface := f.String("site", "", "`site`; all if left out"), f.String("surface", "", "`surface`; all if left out")
	life := f.Int("years", defaultLife, "`years` of service that remain, 1 to 200")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	if *life < 1 || *life > 200 {
		return fmt.Errorf("--years %d: 1 to 200 years of service may remain", *life)
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
	designs, err := db.DesignsInForce(ctx, *site, *surface)
	if err != nil {
		return err
	}
	if len(designs) == 0 {
		if *site != "" || *surface != "" {
			return fmt.Errorf("no design value is in force for site %q, surface %q; `thawledger design` lists those that are", *site, *surface)
		}
		fmt.Fprintln(p.out, "no design value is in force")
		return nil
	}
	for i := range designs {
		if err := p.reviewDesign(ctx, db, &designs[i], *life); err != nil {
			return err
		}
	}
	fmt.Fprintf(p.out, "%d years of service are taken to remain (--years; %d if left out). Intervals are of 90 %%, of the slope 95 %%; those by a distribution\n"+
		"from %d samples drawn from it. Counted: (passed + 1/2) / (seasons + 1). A chance below 1 in twice the seasons is told as such.\n"+
		"Along the trend: the deviations from the Theil-Sen line of all seasons, moved to this year; over the years that remain the line is taken\n"+
		"to go on as it is. The seasons are taken to be independent.\n", *life, defaultLife, extreme.Usual().Replicates)
	fmt.Fprintln(p.out, pipeline.Caution)
	return nil
}

// recordOf returns the station's record by a definition, as the rules for
// design values take it.
func recordOf(rows []store.SeasonOfRecord) []extreme.Season {
	out := make([]extreme.Season, len(rows))
	for i, r := range rows {
		out[i] = extreme.Season{Start: firstDay(r.SeasonStart), Label: r.Season, Low: r.IndexLowCDays, High: r.IndexHighCDays, Over: r.SeasonOver}
	}
	return out
}

func firstDay(t time.Time) pipeline.Day { return pipeline.DayOf(t.Year(), t.Month(), t.Day()) }

// chanceSaid shows a chance, with as many digits as it bears.
func chanceSaid(chance float64) string {
	switch c := 100 * chance; {
	case c < 0.1:
		return "below 0.1 %"
	case c > 99.9:
		return "above 99.9 %"
	case c < 9.95:
		return fmt.Sprintf("%.1f %%", c)
	default:
		return fmt.Sprintf("%.0f %%", c)
	}
}

// howMany shows a number with its noun.
func howMany(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}
