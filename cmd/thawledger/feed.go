package main

import (
	"context"
	"fmt"
	"strconv"
	"strings"

	"thawledger/pipeline"
	"thawledger/pipeline/settings"
)

const feedSynopsis = `feed try FILE [--feed FEED]: read a file as a feed would, using nothing; without --feed propose a layout for it
thawledger feed reread FEED [BATCH...] [--settings FILE]: read archived batches of a feed again by its present layout
thawledger feed take BATCH [--settings FILE]: use a batch that waits, or is held back as implausible
thawledger feed read FEED FILE... [--settings FILE]: take files as if the feed had brought them; - is standard input`

// feed is the command `feed`.
func (p program) feed(ctx context.Context, args []string) error {
	if len(args) > 0 {
		switch args[0] {
		case "reread":
			return p.feedReread(ctx, args[1:])
		case "take":
			return p.feedTake(ctx, args[1:])
		case "try":
			return p.feedTry(ctx, args[1:])
		case "read":
			return p.feedRead(ctx, args[1:])
		}
	}
	f := p.flags("feed", feedSynopsis)
	f.Usage()
	return errUsage
}

func feedNamed(set *settings.Settings, name string) (*pipeline.Feed, error) {
	var names []string
	for i := range set.Feeds {
		if set.Feeds[i].Name == name {
			return &set.Feeds[i], nil
		}
		names = append(names, set.Feeds[i].Name)
	}
	return nil, fmt.Errorf("there is no feed %q in the settings; feeds are %s", name, strings.Join(names, ", "))
}

// batchNumbers reads batches as the ledger numbers them.
func batchNumbers(words []string) ([]int64, error) {
	var out []int64
	for _, w := range words {
		n, err := strconv.ParseInt(w, 10, 32)
		if err != nil || n < 1 {
			return nil, fmt.Errorf("%q is not the number of a batch; thaw.ledger has them as batch_id", w)
		}
		out = append(out, n)
	}
	return out, nil
}

// feedReread asks for batches to be read again. The daemon does it; where none
// runs, the next one will.
func (p program) feedReread(ctx context.Context, args []string) error {
	f := p.flags("feed", feedSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	rest, err := parse(f, args, 1000)
	if err != nil {
		return err
	}
	if len(rest) == 0 {
		f.Usage()
		return errUsage
	}
	only, err := batchNumbers(rest[1:])
	if err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	of, err := feedNamed(set, rest[0])
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	again, err := db.Reread(ctx, of.Name, only, &of.Layout, of.ReplacesSpan)
	if err != nil {
		return err
	}
	for _, r := range again {
		fmt.Fprintf(p.out, "%s: batch %d will be read again, as batch %d\n", r.Name, r.Of, r.Batch)
	}
	if len(again) == 0 {
		fmt.Fprintln(p.out, "the present layout reads no batch otherwise than it was read")
		return nil
	}
	fmt.Fprintln(p.out, "\nA running daemon begins within seconds; `thawledger run` does otherwise. Until a batch is read its old readings count.")
	return nil
}

// feedTake asks for a waiting batch to be used.
func (p program) feedTake(ctx context.Context, args []string) error {
	f := p.flags("feed", feedSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	rest, err := parse(f, args, 1)
	if err != nil {
		return err
	}
	ids, err := batchNumbers(rest)
	if err != nil {
		return err
	}
	if len(ids) == 0 {
		f.Usage()
		return errUsage
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
	if err := db.TakeByHand(ctx, ids[0]); err != nil {
		return err
	}
	fmt.Fprintf(p.out, "batch %d will be read\n", ids[0])
	return nil
}
