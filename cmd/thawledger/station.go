package main

import (
	"context"
	"fmt"
	"math"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/pipeline/store"
)

const stationSynopsis = `station compare STATION SUCCESSOR [--settings FILE]: two records side by side, month by month,
and the adjustment (adjust_c) with which the successor's daily values go on the record of the first`

// Side by side for less than two years, a difference by month is a matter of
// single spells (common practice, no source); a month takes some days at least.
const (
	leastSideBySide = 2 * 365
	leastOfMonth    = 10
)

// station is the command `station`.
func (p program) station(ctx context.Context, args []string) error {
	f := p.flags("station", stationSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	if len(args) == 0 || args[0] != "compare" {
		f.Usage()
		return errUsage
	}
	words, err := parse(f, args[1:], 2)
	if err != nil {
		return err
	}
	if len(words) != 2 {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	for _, id := range words {
		if _, err := stationNamed(set, id); err != nil {
			return err
		}
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	months, err := db.Compare(ctx, words[0], words[1])
	if err != nil {
		return err
	}
	return p.showSideBySide(words[0], words[1], months)
}

func (p program) showSideBySide(first, second string, months []store.SideBySide) error {
	days, sum := 0, 0.0
	for _, m := range months {
		days, sum = days+m.Days, sum+float64(m.Days)*m.MeanC
	}
	if days == 0 {
		return fmt.Errorf("%s and %s have no observed day in common; an adjustment has to come from elsewhere", first, second)
	}
	overall := sum / float64(days)
	fmt.Fprintf(p.out, "daily means of %s less those of %s, degC, on the %d days on which both were observed\n\n", first, second, days)
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "MONTH\tDAYS\tMEAN\tSD OF DAYS\t")
	adjust := [12]float64{}
	for i := range adjust {
		adjust[i] = overall
	}
	var thin []string
	for _, m := range months {
		name := time.Month(m.Month).String()
		fmt.Fprintf(w, "%s\t%d\t%+.2f\t%.2f\t\n", name, m.Days, m.MeanC, m.SDC)
		if m.Days >= leastOfMonth {
			adjust[m.Month-1] = m.MeanC
		} else {
			thin = append(thin, name)
		}
	}
	fmt.Fprintf(w, "all\t%d\t%+.2f\t\t\n", days, overall)
	w.Flush()
	texts := make([]string, 12)
	for i, c := range adjust {
		texts[i] = fmt.Sprint(math.Round(c*100) / 100)
	}
	fmt.Fprintf(p.out, "\nadjust_c: [%s]\n", strings.Join(texts, ", "))
	if len(thin) > 0 || len(months) < 12 {
		fmt.Fprintf(p.out, "months with fewer than %d days have the mean of all\n", leastOfMonth)
	}
	if days < leastSideBySide {
		fmt.Fprintf(p.out, "warning: less than two years side by side (%d days); an adjustment by month rests on single spells\n", days)
	}
	return nil
}
