package main

import (
	"context"
	"fmt"
	"strings"
	"text/tabwriter"

	"thawledger/pipeline/store"
)

// ledger is the command `ledger`.
func (p program) ledger(ctx context.Context, args []string) error {
	f := p.flags("ledger", "ledger [--settings FILE]: what arrived and what became of it; status 1 if something waits for somebody's eyes or does not add up")
	file := f.String("settings", "settings.yaml", "settings `file`")
	if _, err := parse(f, args, 0); err != nil {
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
	if err := p.showLedger(ctx, db); err != nil {
		return err
	}
	left, err := db.Pending(ctx)
	if err != nil {
		return err
	}
	if left.HeldBack+left.StuckParts > 0 {
		return fmt.Errorf("%d batches held back, %d parts stuck", left.HeldBack, left.StuckParts)
	}
	return nil
}

// showLedger prints the ledger by feed, checks that it adds up, and lists what
// was set aside and what needs somebody's eyes.
func (p program) showLedger(ctx context.Context, db *store.DB) error {
	lines, err := db.LedgerSums(ctx)
	if err != nil {
		return err
	}
	p.showLedgerLines(lines)
	var wrong []string
	for i := range lines {
		if !lines[i].AddsUp() {
			wrong = append(wrong, lines[i].Feed)
		}
	}
	if len(wrong) > 0 {
		return fmt.Errorf("the ledger does not add up for %v", wrong)
	}
	fmt.Fprintln(p.out, "rows = read + without value + set aside; cells = readings + no value + aside + repeated: adds up")
	if err := p.showSetAside(ctx, db); err != nil {
		return err
	}
	faults, err := db.LedgerFaults(ctx)
	if err != nil {
		return err
	}
	for _, f := range faults {
		reason := ""
		if f.Reason != nil {
			reason = ": " + *f.Reason
		}
		fmt.Fprintf(p.out, "%s: feed %s, %s%s\n", strings.ReplaceAll(f.State, "_", " "), f.Feed, f.Name, reason)
	}
	return nil
}

func (p program) showLedgerLines(lines []store.LedgerLine) {
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', tabwriter.AlignRight)
	fmt.Fprintln(w, "FEED\tSTATE\tFILES\tROWS\tREAD\tWITHOUT VALUE\tSET ASIDE\tCELLS\tREADINGS\tNO VALUE\tASIDE\tREPEATED\t")
	for i := range lines {
		l := &lines[i]
		fmt.Fprintf(w, "%s\t%s\t%d\t%d\t%d\t%d\t%d\t%d\t%d\t%d\t%d\t%d\t\n", l.Feed, strings.ReplaceAll(l.State, "_", " "), l.Batches,
			l.Rows, l.RowsRead, l.RowsWithoutValue, l.RowsSetAside, l.Cells, l.Readings, l.CellsMissing, l.CellsSetAside, l.CellsRepeated)
	}
	w.Flush()
}

// showSetAside prints what was set aside by feed and reason, with an example of each.
func (p program) showSetAside(ctx context.Context, db *store.DB) error {
	sums, err := db.AsideSums(ctx)
	if err != nil || len(sums) == 0 {
		return err
	}
	fmt.Fprintln(p.out, "\nset aside (thaw.set_aside holds each whole):")
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	for _, s := range sums {
		fmt.Fprintf(w, "  %s\t%s\t%d\tfirst: %s:%d: %s\n", s.Feed, s.Code, s.Count, s.Name, s.Line, s.Reason)
	}
	return w.Flush()
}
