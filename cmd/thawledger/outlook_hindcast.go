package main

import (
	"context"
	"fmt"
	"math"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/indices"
	"thawledger/indices/outlook"
	"thawledger/pipeline"
)

// hindcast is the command `outlook hindcast`.
func (p program) hindcast(ctx context.Context, args []string) error {
	f := p.flags("outlook hindcast", outlookSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	station := f.String("station", "", "the `station`")
	kindText := f.String("kind", "thaw", "`kind` of index: thaw or freeze")
	definitionText := f.String("definition", "curve", "`definition` of the index: curve or sum")
	fromYear := f.Int("from-year", 0, "first `year` that a scored season begins in; 0: the first with enough earlier ones")
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	if *station == "" {
		f.Usage()
		return errUsage
	}
	kind, err := indexKind(*kindText)
	if err != nil {
		return err
	}
	definition, err := indexDefinition(*definitionText)
	if err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	found, err := stationsNamed(set.Stations, *station)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	days, err := indices.DaysUntil(ctx, db, *station, pipeline.Day(math.MaxInt32))
	if err != nil {
		return err
	}
	if len(days) == 0 {
		return fmt.Errorf("station %s has no record yet", *station)
	}
	record := outlook.NewRecord(days)
	h := record.Hindcast(indices.OutlookIndex{Kind: kind, Definition: definition}.Question(&found[0]), outlook.HindcastOptions{FromYear: *fromYear, Seed: 1})
	p.showHindcast(*station, record, h)
	return nil
}

func (p program) showHindcast(station string, record *outlook.Record, h *outlook.Hindcast) {
	q := h.Question
	fmt.Fprintf(p.out, "%s, %s index by %s, record %s to %s: %d seasons with a known index\n", station, q.Kind, q.Definition, record.First(), record.Last(), h.Seasons)
	if len(h.Scores) == 0 {
		fmt.Fprintf(p.out, "no season has the %d complete years before it that a hindcast needs\n%s\n", outlook.LeastEarlier, pipeline.Caution)
		return
	}
	better := h.Better()
	fmt.Fprintf(p.out, "outlooks issued on the 1st and the 16th, from years before each season; used: %s\n\n", better)
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "LEAD\tISSUED\tSEASONS\tOUTLOOKS\tCRPS RAW\tMOVED\tCLIMATOLOGY RAW\tMOVED\tSKILL\t5 to 95 %\tFAIR\tALL OTHER YEARS: CRPS\tSKILL\tANNOUNCED\t")
	p.eachLead(h, func(lead int, s *outlook.Score) {
		raw, _ := h.Score(outlook.Earlier, outlook.Raw, lead)
		moved, _ := h.Score(outlook.Earlier, outlook.Moved, lead)
		others, _ := h.Score(outlook.Others, better, lead)
		fmt.Fprintf(w, "%d\t%s\t%d\t%d\t%.1f\t%.1f\t%.1f\t%.1f\t%s\t%s\t%s\t%.1f\t%s\t%s\t\n", lead, issuedIn(q, lead), s.Years, s.N, raw.CRPS, moved.CRPS,
			s.RawClimatologyCRPS, s.MovedClimatologyCRPS, skillValue(s.Skill), skillSpan(s.Skill), skillValue(s.FairSkill), others.CRPS, skillValue(others.Skill), allowedShown(h.Skilful(lead)))
	})
	w.Flush()
	fmt.Fprintf(p.out, "\nBrier scores over %s; quantile scores in degC.d\n", thresholdsShown(h))
	fmt.Fprintln(w, "LEAD\tISSUED\tBRIER\tCLIMATOLOGY\tSKILL\t5 to 95 %\t10 %\tCLIMATOLOGY\t50 %\tCLIMATOLOGY\t90 %\tCLIMATOLOGY\t")
	p.eachLead(h, func(lead int, s *outlook.Score) {
		fmt.Fprintf(w, "%d\t%s\t%.3f\t%.3f\t%s\t%s\t%.1f\t%.1f\t%.1f\t%.1f\t%.1f\t%.1f\t\n", lead, issuedIn(q, lead), s.Brier, s.ClimatologyBrier, skillValue(s.BrierSkill),
			skillSpan(s.BrierSkill), s.Pinball.P10, s.ClimatologyPinball.P10, s.Pinball.P50, s.ClimatologyPinball.P50, s.Pinball.P90, s.ClimatologyPinball.P90)
	})
	w.Flush()
	fmt.Fprintln(p.out, "\nreliability: mean forecast > how often it happened (number of forecasts), %")
	fmt.Fprintln(w, "LEAD\tISSUED\t0 to 10\t10 to 30\t30 to 50\t50 to 70\t70 to 90\t90 to 100\t")
	p.eachLead(h, func(lead int, s *outlook.Score) {
		cells := map[float64]string{}
		for _, b := range s.Reliability {
			cells[b.From] = fmt.Sprintf("%.0f > %.0f (%d)", 100*b.Forecast, 100*b.Happened, b.N)
		}
		fmt.Fprintf(w, "%d\t%s\t%s\t%s\t%s\t%s\t%s\t%s\t\n", lead, issuedIn(q, lead), cells[0], cells[0.1], cells[0.3], cells[0.5], cells[0.7], cells[0.9])
	})
	w.Flush()
	fmt.Fprintln(p.out, "\nScores are in degC.d, lower the better. climatology: the seasons before, as they were and moved along their own trend; skill is against the")
	fmt.Fprintln(p.out, "better of the two, with the interval from samples of the seasons. all other years: later ones too, which flatters in a warming record.")
	fmt.Fprintf(p.out, "announced: whether `expected` may be: at least %d seasons, and the interval above zero.\n%s\n", outlook.LeastYears, pipeline.Caution)
}

// eachLead calls f for each lead of the set that is used.
func (p program) eachLead(h *outlook.Hindcast, f func(lead int, s *outlook.Score)) {
	for lead := 12; lead >= 0; lead-- {
		if s, ok := h.Score(outlook.Earlier, h.Better(), lead); ok {
			f(lead, &s)
		}
	}
}

// issuedIn names the month in which outlooks of a lead are issued.
func issuedIn(q outlook.Question, lead int) string {
	end := pipeline.DayOf(2025, q.Starts.Month, q.Starts.Day) - 1
	_, m, _ := end.Date()
	return time.Month((int(m)-1-lead+24)%12 + 1).String()[:3]
}

func skillValue(s outlook.Skill) string {
	if !s.OK {
		return "-"
	}
	return fmt.Sprintf("%.3f", s.Value)
}

func skillSpan(s outlook.Skill) string {
	if !s.HasInterval {
		return "-"
	}
	return fmt.Sprintf("%.2f to %.2f", s.Low, s.High)
}

func allowedShown(b bool) string {
	if b {
		return "yes"
	}
	return "no"
}

func thresholdsShown(h *outlook.Hindcast) string {
	text := make([]string, len(h.Thresholds))
	for i, t := range h.Thresholds {
		text[i] = fmt.Sprintf("%.0f", t)
	}
	list := strings.Join(text, ", ") + " degC.d"
	if h.FromRecord {
		list += " (25, 50, 75 and 90 % of the record's seasons)"
	}
	return list
}
