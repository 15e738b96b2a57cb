package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"text/tabwriter"
	"time"

	"go.uber.org/zap"

	"thawledger/pipeline/lifecycle"
	"thawledger/pipeline/localpg"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

// reading opens the database for a command that looks at it: the one of the
// settings, the private server of a running daemon, or, if no daemon is
// running, that server started for as long as the command takes.
func (p program) reading(ctx context.Context, set *settings.Settings) (db *store.DB, done func(), err error) {
	url, stop := set.Store.URL, func() {}
	if url == "" {
		dir := filepath.Join(set.Data, "postgresql")
		release, err := lifecycle.LockFolder(set.Data)
		for errors.Is(err, lifecycle.ErrFolderInUse) {
			// Another has a server there, or is about to, or is about to leave.
			brief, cancel := context.WithTimeout(ctx, 5*time.Second)
			db, err = store.Open(brief, localpg.DSN(dir, "postgres"), zap.NewNop())
			inTime := brief.Err() == nil
			cancel()
			if err == nil {
				return db, db.Close, nil
			}
			if inTime || ctx.Err() != nil {
				return nil, nil, err
			}
			release, err = lifecycle.LockFolder(set.Data)
		}
		switch {
		case err != nil:
			return nil, nil, err
		default:
			if _, err := os.Stat(dir); errors.Is(err, fs.ErrNotExist) {
				release()
				return nil, nil, fmt.Errorf("there is no database in %s yet; `thawledger run` or `thawledger schema apply` makes it", dir)
			}
			server, err := startPrivate(ctx, set, zap.NewNop())
			if err != nil {
				release()
				return nil, nil, err
			}
			url = server.DSN("postgres")
			stop = func() {
				if err := server.Stop(context.WithoutCancel(ctx)); err != nil {
					fmt.Fprintf(p.err, "thawledger: %v\n", err)
				}
				release()
			}
		}
	}
	db, err = store.Open(ctx, url, zap.NewNop())
	if err != nil {
		stop()
		return nil, nil, err
	}
	return db, func() { db.Close(); stop() }, nil
}

// schema is the command `schema [apply]`.
func (p program) schema(ctx context.Context, args []string) error {
	f := p.flags("schema", "schema [apply] [--settings FILE]: show the database's schema, or bring it up to date")
	file := f.String("settings", "settings.yaml", "settings `file`")
	apply := len(args) > 0 && args[0] == "apply"
	if apply {
		args = args[1:]
	}
	if _, err := parse(f, args, 0); err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	if apply && set.Store.URL == "" {
		if err := os.MkdirAll(filepath.Join(set.Data, "postgresql"), 0o711); err != nil {
			return fmt.Errorf("make data folder: %w", err)
		}
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	if apply {
		if _, err := db.Apply(ctx, version()); err != nil {
			return err
		}
	}
	steps, err := db.Schema(ctx)
	if err != nil {
		return err
	}
	fmt.Fprintf(p.out, "PostgreSQL %s, TimescaleDB %s\n\n", db.Version, orNone(db.Timescale))
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	missing := 0
	for _, s := range steps {
		at := "not applied"
		if s.AppliedAt.IsZero() {
			missing++
		} else {
			at = s.AppliedAt.UTC().Format("2006-01-02 15:04:05 UTC")
		}
		fmt.Fprintf(w, "%s\t%s\t%.12s\n", s.Name, at, s.Checksum)
	}
	w.Flush()
	if missing > 0 {
		return fmt.Errorf("%d of %d steps are not applied; `thawledger schema apply` does it", missing, len(steps))
	}
	return nil
}
