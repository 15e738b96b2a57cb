package store

import (
	"context"
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"errors"
	"fmt"
	"io/fs"
	"strconv"
	"strings"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
)

//go:embed schema/*.sql
var schemaFiles embed.FS

// Step is one numbered file of the schema.
type Step struct {
	Number    int
	Name      string
	Checksum  string
	AppliedAt time.Time // zero if it is not applied
	sql       string
}

// ErrNewerSchema says that the database was brought up by a newer program.
var ErrNewerSchema = errors.New("the database is newer than this program")

// steps reads the embedded files in order; a gap or a number used twice is a
// mistake of the program.
func steps(files fs.FS) ([]Step, error) {
	entries, err := fs.ReadDir(files, "schema")
	if err != nil {
		return nil, fmt.Errorf("list schema steps: %w", err)
	}
	var out []Step
	for i, e := range entries {
		number, _, _ := strings.Cut(e.Name(), "_")
		n, err := strconv.Atoi(number)
		if err != nil || n != i+1 {
			return nil, fmt.Errorf("schema step %s: it should be number %04d", e.Name(), i+1)
		}
		text, err := fs.ReadFile(files, "schema/"+e.Name())
		if err != nil {
			return nil, fmt.Errorf("read schema step: %w", err)
		}
		sum := sha256.Sum256(text)
		out = append(out, Step{Number: n, Name: strings.TrimSuffix(e.Name(), ".sql"), Checksum: hex.EncodeToString(sum[:]), sql: string(text)})
	}
	return out, nil
}

// Schema returns the program's steps and when each was applied. It fails with
// ErrNewerSchema if the database has steps that the program lacks, and with a
// plain error if a step that was applied has since been edited.
func (db *DB) Schema(ctx context.Context) ([]Step, error) {
	all, err := steps(schemaFiles)
	if err != nil {
		return nil, err
	}
	return all, recorded(ctx, db.pool, all)
}

type querier interface {
	Query(ctx context.Context, sql string, args ...any) (pgx.Rows, error)
	QueryRow(ctx context.Context, sql string, args ...any) pgx.Row
}

// recorded fills in AppliedAt.
func recorded(ctx context.Context, q querier, all []Step) error {
	var there bool
	// to_regclass may answer from a cache that has not heard of what another has
	// committed while this transaction waited for the lock.
	err := q.QueryRow(ctx, `select exists (select 1 from pg_class c join pg_namespace n on n.oid = c.relnamespace
		where n.nspname = 'thaw' and c.relname = 'schema_steps')`).Scan(&there)
	if err != nil {
		return fmt.Errorf("look for schema: %w", err)
	}
	if !there {
		return nil
	}
	rows, err := q.Query(ctx, `select step, name, checksum, applied_at from thaw.schema_steps order by step`)
	if err != nil {
		return fmt.Errorf("read schema steps: %w", err)
	}
	var (
		number         int
		name, checksum string
		at             time.Time
	)
	_, err = pgx.ForEachRow(rows, []any{&number, &name, &checksum, &at}, func() error {
		if number > len(all) {
			return fmt.Errorf("%w: it has step %s, this program knows %d steps; run the newer program", ErrNewerSchema, name, len(all))
		}
		if step := all[number-1]; step.Checksum != checksum {
			return fmt.Errorf("schema step %s was applied with checksum %.12s, this program has %.12s; a step is never edited once applied", name, checksum, step.Checksum)
		}
		all[number-1].AppliedAt = at
		return nil
	})
	return err
}

// Apply brings the database up to the program's schema, each step in a
// transaction of its own, under a lock that other programs wait for. It uses
// TimescaleDB where the server offers it. It returns the steps newly applied.
func (db *DB) Apply(ctx context.Context, program string) ([]Step, error) {
	all, err := steps(schemaFiles)
	if err != nil {
		return nil, err
	}
	if err := db.useTimescale(ctx); err != nil {
		return nil, err
	}
	var done []Step
	for i := range all {
		err := db.within(ctx, func(tx pgx.Tx) error {
			if err := lock(ctx, tx, lockSchema, "schema"); err != nil {
				return err
			}
			if err := recorded(ctx, tx, all); err != nil {
				return err
			}
			step := &all[i]
			if !step.AppliedAt.IsZero() {
				return nil
			}
			if step.Number == 1 {
				if _, err := tx.Exec(ctx, ledgerOfSteps); err != nil {
					return fmt.Errorf("create schema: %w", err)
				}
			}
			// The simple protocol takes a whole file at once.
			if _, err := tx.Conn().PgConn().Exec(ctx, step.sql).ReadAll(); err != nil {
				return fmt.Errorf("schema step %s: %w", step.Name, located(err, step.sql))
			}
			err := tx.QueryRow(ctx, `insert into thaw.schema_steps (step, name, checksum, program) values ($1, $2, $3, $4) returning applied_at`,
				step.Number, step.Name, step.Checksum, program).Scan(&step.AppliedAt)
			if err != nil {
				return fmt.Errorf("record schema step: %w", err)
			}
			done = append(done, *step)
			return nil
		})
		if err != nil {
			return done, err
		}
	}
	return done, nil
}

const ledgerOfSteps = `
create schema if not exists thaw;
comment on schema thaw is 'thawledger: readings, daily means, thawing and freezing indices and standings. Screening figures: local codes and a licensed engineer decide.';
create table thaw.schema_steps (
	step integer primary key, name text not null, checksum text not null,
	program text not null, applied_at timestamptz not null default clock_timestamp());
comment on table thaw.schema_steps is 'Steps of the schema that have been applied.';
comment on column thaw.schema_steps.step is 'Number of the step.';
comment on column thaw.schema_steps.name is 'Its file.';
comment on column thaw.schema_steps.checksum is 'SHA-256 of the file.';
comment on column thaw.schema_steps.program is 'Version of the program that applied it.';
comment on column thaw.schema_steps.applied_at is 'When.';`

// useTimescale switches the extension on where the server has it loaded; a
// database that already has the schema without it is left as it is.
func (db *DB) useTimescale(ctx context.Context) error {
	if db.Timescale != "" {
		return nil
	}
	var offered, plain bool
	err := db.pool.QueryRow(ctx, `select
		exists (select 1 from pg_available_extensions where name = 'timescaledb')
			and current_setting('shared_preload_libraries') like '%timescaledb%',
		to_regclass('thaw.schema_steps') is not null`).Scan(&offered, &plain)
	if err != nil {
		return fmt.Errorf("look for timescaledb: %w", err)
	}
	if !offered || plain {
		return nil
	}
	err = db.within(ctx, func(tx pgx.Tx) error {
		// "if not exists" does not help two who begin at once.
		if err := lock(ctx, tx, lockSchema, "schema"); err != nil {
			return err
		}
		_, err := tx.Exec(ctx, `create extension if not exists timescaledb`)
		return err
	})
	if err != nil {
		return fmt.Errorf("create extension timescaledb: %w", err)
	}
	// A library loaded in mid-connection refuses some calls: start afresh.
	db.pool.Reset()
	return db.await(ctx)
}

// located adds the line and a caret to an error that knows its position.
func located(err error, sql string) error {
	pgErr, ok := errors.AsType[*pgconn.PgError](err)
	if !ok || pgErr.Position == 0 {
		return err
	}
	before := []rune(sql)[:min(int(pgErr.Position)-1, len([]rune(sql)))]
	line := strings.Count(string(before), "\n") + 1
	column := len(before) - (strings.LastIndex(string(before), "\n") + 1)
	return fmt.Errorf("line %d:\n%s\n%s^ %w", line, strings.Split(sql, "\n")[line-1], strings.Repeat(" ", max(column, 0)), err)
}
