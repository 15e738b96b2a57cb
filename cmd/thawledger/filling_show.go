package main

import (
	"context"
	"fmt"
	"text/tabwriter"
	"time"

	"thawledger/indices/filling"
	"thawledger/pipeline"
)

// fillingShow is the command `filling show`.
func (p program) fillingShow(ctx context.Context, args []string) error {
	f := p.flags("filling", fillingSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	station := f.String("station", "", "station whose days would be filled")
	neighbour := f.String("neighbour", "", "station from which")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	if *station == "" || *neighbour == "" {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	net, err := p.networkOf(ctx, set, *station, []string{*neighbour})
	if err != nil {
		return err
	}
	opt := net.options(filling.Usual().LeastR)
	model := filling.Fit(net.target, net.neighbours, opt)
	months, _ := model.Months(*neighbour)
	climate := model.ClimateMonths()
	fmt.Fprintf(p.out, "%s from %s: estimate = normal of %s + slope x departure of %s from its normal\n\n", *station, *neighbour, *station, *neighbour)
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "MONTH\tDAYS\tYEARS\tR\tR DEPARTURES\tSLOPE\tINTERCEPT degC\tBIAS degC\tS degC\tBIAS OF YEARS degC\tR_1\tCLIMATE S degC\tUSED\t")
	for i := range months {
		m, s := &months[i], &months[i].Spread
		if s.Days == 0 {
			fmt.Fprintf(w, "%s\t%d\t%d\t-\t-\t-\t-\t-\t-\t-\t-\t-\tno: too few days\t\n", time.Month(i+1), m.Days, m.Years)
			continue
		}
		fmt.Fprintf(w, "%s\t%d\t%d\t%.3f\t%.3f\t%.3f\t%+.2f\t%+.2f\t%.2f\t%.2f\t%.2f\t%.2f\t%s\t\n", time.Month(i+1), m.Days, m.Years,
			m.R, m.RDepartures, m.Slope, m.InterceptC, s.BiasC, s.SDC, s.BiasSDC, s.R[1], climate[i].Spread.SEC(), used(m, &climate[i]))
	}
	w.Flush()
	fmt.Fprintf(p.out, `
days, years: observed at both, in the month and the two beside it, as r and slope. r is of daily means (at least %.2f, common
practice, no source), which share the course of the year; r departures is without it. bias, s, r_1: estimate less
observation in the month, each year estimated without itself: mean error, standard deviation of days and correlation
from day to day about the year's own bias, whose standard deviation stands beside. A single day is off by both together.
`, opt.LeastR)
	fmt.Fprintln(p.out, pipeline.Caution)
	return nil
}

// used says whether a month's regression would fill days.
func used(m, climate *filling.Month) string {
	switch {
	case !m.Usable:
		return "no: r"
	case climate.Usable && climate.Spread.SEC() <= m.Spread.SEC():
		return "no: no better than the climate"
	}
	return "yes"
}
