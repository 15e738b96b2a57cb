package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"time"

	"go.uber.org/zap"

	"thawledger/ingest"
	"thawledger/ingest/archive"
	"thawledger/pipeline"
	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

// feedRead takes files as deliveries of a feed. A running daemon reads them;
// where none runs, the stages run here until everything has settled.
func (p program) feedRead(ctx context.Context, args []string) error {
	f := p.flags("feed", feedSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	name := f.String("name", "", "`name` for standard input, where the layout takes the station from the file's name")
	rest, err := parse(f, args, 10000)
	if err != nil {
		return err
	}
	if len(rest) < 2 {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	of, err := feedNamed(set, rest[0])
	if err != nil {
		return err
	}
	release, err := lifecycle.LockFolder(set.Data)
	if errors.Is(err, lifecycle.ErrFolderInUse) {
		return p.handOver(ctx, set, of, rest[1:], *name)
	}
	if err != nil {
		return err
	}
	release()
	return p.readHere(ctx, set, of, rest[1:], *name)
}

// delivery opens a file, or standard input, as a delivery.
func (p program) delivery(f *pipeline.Feed, path, name string) (d ingest.Delivery, done func(), err error) {
	if path == "-" {
		if name == "" {
			name = "standard-input-" + time.Now().UTC().Format("20060102T150405") + ".csv"
		}
		return ingest.Delivery{Feed: f.Name, Name: name, SourceTime: time.Now(), Body: p.in()}, func() {}, nil
	}
	r, err := os.Open(path)
	if err != nil {
		return d, nil, fmt.Errorf("open file: %w", err)
	}
	info, err := r.Stat()
	if err == nil && !info.Mode().IsRegular() {
		err = fmt.Errorf("%s is not a file", path)
	}
	if err != nil {
		r.Close()
		return d, nil, err
	}
	return ingest.Delivery{Feed: f.Name, Name: filepath.Base(path), SourceTime: info.ModTime(), Body: r}, func() { r.Close() }, nil
}

func (p program) in() io.Reader {
	if p.stdin != nil {
		return p.stdin
	}
	return os.Stdin
}

// handOver enters deliveries for the running daemon and waits for it.
func (p program) handOver(ctx context.Context, set *settings.Settings, f *pipeline.Feed, paths []string, name string) error {
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	kept, err := archive.Open(filepath.Join(set.Data, "archive"))
	if err != nil {
		return err
	}
	return p.eachDelivery(ctx, db, f, paths, name, func(d ingest.Delivery) (ingest.Receipt, error) {
		b, _, err := ingest.Enter(ctx, db, kept, f, d, time.Now)
		if err != nil || b == nil {
			return ingest.Receipt{Known: err == nil}, err
		}
		line, err := awaitBatch(ctx, db, b.ID, set.Work.IdleDeadline)
		return ingest.Receipt{Batch: b.ID, Ledger: line}, err
	})
}

// awaitBatch waits until a batch is read and committed, or cannot be.
func awaitBatch(ctx context.Context, db *store.DB, id int64, patience time.Duration) (store.LedgerLine, error) {
	ctx, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	tick := time.NewTicker(200 * time.Millisecond)
	defer tick.Stop()
	for {
		line, err := db.LedgerOf(ctx, id)
		if err != nil || line.State != "opened" && line.State != "on its way" {
			return line, err
		}
		select {
		case <-ctx.Done():
			return line, fmt.Errorf("batch %d is still %s: %w", id, line.State, ctx.Err())
		case <-tick.C:
		}
	}
}

// readHere runs the stages for the deliveries alone.
func (p program) readHere(ctx context.Context, set *settings.Settings, f *pipeline.Feed, paths []string, name string) error {
	d, err := build(ctx, set, p.logger().WithOptions(zap.IncreaseLevel(zap.WarnLevel)), time.Now)
	if err != nil {
		return err
	}
	d.ingest.DeliveriesOnly = true
	var batches []int64
	err = p.eachDelivery(ctx, nil, f, paths, name, func(delivery ingest.Delivery) (ingest.Receipt, error) {
		r, err := d.ingest.Deliver(ctx, delivery)
		if r.Batch != 0 {
			batches = append(batches, r.Batch)
		}
		return r, err
	})
	idle := d.runUntilIdle(ctx, p.hurry, nil, p.progress())
	for _, id := range batches {
		err = errors.Join(err, p.showBatch(ctx, d.db, id))
	}
	return errors.Join(err, idle, d.close(context.WithoutCancel(ctx)))
}

// eachDelivery enters one file after another. With db it shows what became of
// each at once.
func (p program) eachDelivery(ctx context.Context, db *store.DB, f *pipeline.Feed, paths []string, name string, enter func(ingest.Delivery) (ingest.Receipt, error)) error {
	var failed []error
	for _, path := range paths {
		d, done, err := p.delivery(f, path, name)
		if err != nil {
			failed = append(failed, err)
			continue
		}
		r, err := enter(d)
		done()
		switch {
		case err != nil:
			failed = append(failed, fmt.Errorf("%s: %w", path, err))
		case r.Known:
			fmt.Fprintf(p.out, "%s: the same bytes came before; nothing changes\n", path)
		case db != nil:
			failed = append(failed, p.showBatch(ctx, db, r.Batch))
		}
	}
	return errors.Join(failed...)
}

// asideShown is how many set-aside rows of a batch are shown.
const asideShown = 20

// showBatch prints a batch's line of the ledger and what was set aside; an error
// if nothing of it is used.
func (p program) showBatch(ctx context.Context, db *store.DB, id int64) error {
	line, err := db.LedgerOf(ctx, id)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "batch %d\n", id)
	p.showLedgerLines([]store.LedgerLine{line})
	aside, err := db.AsideOf(ctx, id, asideShown)
	if err != nil {
		return err
	}
	for _, a := range aside {
		fmt.Fprintf(p.out, "  line %d: %s: %s\n", a.Line, a.Code, a.Reason)
	}
	if more := line.CellsSetAside - int64(len(aside)); len(aside) == asideShown && more > 0 {
		fmt.Fprintln(p.out, "  and more: thaw.set_aside has them all")
	}
	if line.Reason != nil {
		return fmt.Errorf("batch %d is %s: %s", id, strings.ReplaceAll(line.State, "_", " "), *line.Reason)
	}
	return nil
}
