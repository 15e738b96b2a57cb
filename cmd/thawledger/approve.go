package main

import (
	"context"
	"fmt"
	"text/tabwriter"
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

const approveSynopsis = `approve through STATION DATE --reason TEXT: answer for the record through a day; later days are provisional
thawledger approve withdraw STATION DATE --reason TEXT: make days after a date provisional again
thawledger approve accept|reject BATCH --reason TEXT: decide on a batch's readings that would change approved days
thawledger approve list: how far records are approved, and what waits for a decision`

// approve is the command `approve`.
func (p program) approve(ctx context.Context, args []string) error {
	if len(args) == 0 {
		p.flags("approve", approveSynopsis).Usage()
		return errUsage
	}
	verb := args[0]
	words := map[string]int{"list": 0, "accept": 1, "reject": 1, "through": 2, "withdraw": 2}
	n, known := words[verb]
	f := p.editFlags()
	f.Usage = p.flags("approve", approveSynopsis).Usage
	rest, err := parse(f.FlagSet, args[1:], n)
	if err != nil {
		return err
	}
	if !known || len(rest) != n {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*f.file)
	if err != nil {
		return err
	}
	var author, reason string
	if verb != "list" {
		if author, reason, err = f.answerable(); err != nil {
			return err
		}
	}
	do, err := p.approval(verb, rest, author, reason, set.Stations)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	return do(ctx, db)
}

// approval reads what is to be done.
func (p program) approval(verb string, words []string, author, reason string, stations []pipeline.Station) (func(context.Context, *store.DB) error, error) {
	switch verb {
	case "list":
		return p.approveList, nil
	case "accept", "reject":
		ids, err := batchNumbers(words)
		if err != nil {
			return nil, err
		}
		return func(ctx context.Context, db *store.DB) error {
			n, err := db.Decide(ctx, ids[0], verb == "accept", author, reason)
			if err == nil {
				fmt.Fprintf(p.out, "batch %d: %d readings %sed\n", ids[0], n, verb)
			}
			return err
		}, nil
	}
	day, err := pipeline.ParseDay(words[1])
	if err != nil {
		return nil, fmt.Errorf("%q is no date such as 2031-07-20", words[1])
	}
	var st *pipeline.Station
	for i := range stations {
		if stations[i].ID == words[0] {
			st = &stations[i]
		}
	}
	if st == nil {
		return nil, fmt.Errorf("there is no station %q in the settings", words[0])
	}
	return func(ctx context.Context, db *store.DB) error {
		if verb == "withdraw" {
			return db.WithdrawApprovals(ctx, st.ID, day, author, reason)
		}
		if err := db.Approve(ctx, st.ID, day, st.DayStart(day+1), author, reason); err != nil {
			return err
		}
		fmt.Fprintf(p.out, "the record of %s is approved through %s; what would change it waits for a decision from now on\n", st.ID, day)
		return nil
	}, nil
}

func (p program) approveList(ctx context.Context, db *store.DB) error {
	approved, err := db.Approvals(ctx)
	if err != nil {
		return err
	}
	waiting, err := db.Waiting(ctx)
	if err != nil {
		return err
	}
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "STATION\tAPPROVED THROUGH\tBY\tON\tNOTE")
	for _, a := range approved {
		if a.ThroughDay == nil {
			fmt.Fprintf(w, "%s\tnot at all\t\t\t\n", a.Station)
			continue
		}
		fmt.Fprintf(w, "%s\t%s\t%s\t%s\t%s\n", a.Station, a.ThroughDay.Format(time.DateOnly), *a.ApprovedBy, a.RecordedAt.UTC().Format(time.DateOnly), *a.Note)
	}
	w.Flush()
	if len(waiting) == 0 {
		fmt.Fprintln(p.out, "\nnothing waits for a decision")
		return nil
	}
	fmt.Fprintln(p.out, "\nreadings that would change approved days (thaw.corrections has each):")
	for _, c := range waiting {
		fmt.Fprintf(w, "  batch %d\t%s\t%s\t%d readings\t%s to %s UTC\n", c.BatchID, c.Name, c.Station, c.Readings,
			c.FirstUTC.UTC().Format("2006-01-02 15:04"), c.LastUTC.UTC().Format("2006-01-02 15:04"))
	}
	return w.Flush()
}
