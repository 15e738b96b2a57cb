package main

import (
	"context"
	"fmt"
	"strings"
	"text/tabwriter"

	"thawledger/indices/filling"
	"thawledger/pipeline"
)

// fillingBlocks are the lengths of the gaps that are tried, in days: those that
// are asked of, and the longest that a straight line usually bridges.
var fillingBlocks = [...]int{1, 2, 3, 10, 30}

// fillingTest is the command `filling test`.
func (p program) fillingTest(ctx context.Context, args []string) error {
	f := p.flags("filling", fillingSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	station := f.String("station", "", "station whose days are removed")
	var neighbours []string
	f.Func("neighbour", "station from which days are filled; may be given several times", func(s string) error {
		neighbours = append(neighbours, s)
		return nil
	})
	seed := f.Uint64("seed", 1, "of the choice of days")
	repeats := f.Int("repeats", 200, "how often, for each length of gap in each part of the year")
	kind := f.String("kind", string(pipeline.Thaw), "thaw or freeze")
	leastR := f.Float64("least-r", filling.Usual().LeastR, "least correlation of a neighbour's daily means")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	known := *kind == string(pipeline.Thaw) || *kind == string(pipeline.Freeze)
	if *station == "" || !known || *repeats < 1 || *repeats > 100_000 || !(*leastR >= -1 && *leastR <= 1) {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	net, err := p.networkOf(ctx, set, *station, neighbours)
	if err != nil {
		return err
	}
	trial := filling.Trial{Kind: pipeline.Kind(*kind), BaseC: net.station.BaseC, Starts: net.station.ThawYear,
		Options: net.options(*leastR), Blocks: fillingBlocks[:], Repeats: *repeats, Seed: *seed}
	if trial.Kind == pipeline.Freeze {
		trial.Starts = net.station.FreezeYear
	}
	outcome := filling.Experiment(net.target, net.neighbours, trial)
	if len(outcome.Seasons) == 0 {
		return fmt.Errorf("%s has no season of which 80 %% of the days were observed", *station)
	}
	p.showOutcome(*station, &trial, &outcome)
	return nil
}

func (p program) showOutcome(station string, t *filling.Trial, o *filling.Outcome) {
	fmt.Fprintf(p.out, "%s, %s index: %d seasons, %s to %s; each was filled by what the others tell\n\n", station, t.Kind,
		len(o.Seasons), o.Seasons[0], o.Seasons[len(o.Seasons)-1])
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "DEFINITION\tPART OF YEAR\tGAP d\tRUNG\tTRIED\tUNTOUCHED\tWITHIN 2 SE %\tSAMPLING %\tWIDTH degC.d\tBIAS / SE\tRMSE degC.d\tSE degC.d\t")
	var outside, biased []string
	judged, sure := 0, 0
	for i := range o.Cells {
		c := &o.Cells[i]
		name := fmt.Sprintf("%s, %s, gaps of %d, %s", c.Definition, c.Part, c.Block, c.Rung)
		if c.Tried() == 0 {
			fmt.Fprintf(w, "%s\t%s\t%d\t%s\t0\t%d\t-\t-\t-\t-\t-\t-\t\n", c.Definition, c.Part, c.Block, c.Rung, c.Untouched)
			continue
		}
		mark := ""
		if c.Weighs() {
			judged++
			if c.Outside() {
				mark = " *"
				if c.SurelyOutside() {
					sure++
				}
				outside = append(outside, fmt.Sprintf("%s: %.1f %% (%.0f to %.0f)", name, 100*c.Cover(), 100*c.CoverLow, 100*c.CoverHigh))
			}
			if b := c.BiasShare(); b > mostBiasShare || b < -mostBiasShare {
				biased = append(biased, fmt.Sprintf("%s: %+.2f", name, b))
			}
		}
		fmt.Fprintf(w, "%s\t%s\t%d\t%s\t%d\t%d\t%.1f%s\t%.0f to %.0f\t%.1f\t%+.2f\t%.1f\t%.1f\t\n", c.Definition, c.Part, c.Block, c.Rung,
			c.Tried(), c.Untouched, 100*c.Cover(), mark, 100*c.CoverLow, 100*c.CoverHigh, c.WidthC, c.BiasShare(), c.RMSEC, c.SEC)
	}
	w.Flush()
	fmt.Fprintf(p.out, "\n%d days removed in all. Judged: %d rows, those with 20 or more tried and an error of 1 degC.d or more.\n", o.Removed, judged)
	list(p, "outside 90 to 98 %", outside)
	fmt.Fprintf(p.out, "outside by more than sampling explains: %d\n", sure)
	list(p, "bias beyond a quarter of the standard error", biased)
	fmt.Fprint(p.out, `
tried: repeats in which the removed days weigh at all; untouched: in which they do not. within 2 se: share of errors within
two standard errors; sampling: 95 % interval of that share, were the tries independent as far as gaps do not overlap.
width: of +-2 standard errors, mean. bias: mean error. rmse: root mean square error, beside that of the standard errors.
`)
	fmt.Fprintln(p.out, pipeline.Caution)
}

// mostBiasShare is the share of the standard error that a bias may have.
const mostBiasShare = 0.25

func list(p program, what string, rows []string) {
	if len(rows) == 0 {
		fmt.Fprintf(p.out, "%s: none\n", what)
		return
	}
	fmt.Fprintf(p.out, "%s: %d\n  %s\n", what, len(rows), strings.Join(rows, "\n  "))
}
