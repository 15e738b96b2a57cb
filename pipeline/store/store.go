package store

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"strings"
	"syscall"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgconn"
	"github.com/jackc/pgx/v5/pgxpool"
	"go.uber.org/zap"
)

// DB is a database with, or about to get, the schema thaw.
type DB struct {
	pool *pgxpool.Pool
	log  *zap.Logger

	// Version is the server's version, as "17.6".
	Version string
	// Timescale is the version of TimescaleDB in use; "" if there is none.
	Timescale string
}

// Open connects to the database at url (a PostgreSQL connection string) and
// waits for it until ctx ends. It changes nothing; see Apply.
func Open(ctx context.Context, url string, log *zap.Logger) (*DB, error) {
	cfg, err := pgxpool.ParseConfig(url)
	if err != nil {
		return nil, fmt.Errorf("read database address: %w", err)
	}
	// Times cross the wire in binary and are UTC; "jit" costs more than it
	// brings for statements as short as these.
	cfg.ConnConfig.RuntimeParams["timezone"] = "UTC"
	cfg.ConnConfig.RuntimeParams["application_name"] = "thawledger"
	cfg.ConnConfig.RuntimeParams["jit"] = "off"
	cfg.MaxConns = max(cfg.MaxConns, 12)
	pool, err := pgxpool.NewWithConfig(ctx, cfg)
	if err != nil {
		return nil, fmt.Errorf("open database: %w", err)
	}
	db := &DB{pool: pool, log: log}
	if err := db.await(ctx); err != nil {
		pool.Close()
		return nil, err
	}
	return db, nil
}

// await asks for the versions until the database answers or ctx ends; an
// answer that trying again will not change ends it at once.
func (db *DB) await(ctx context.Context) error {
	tick := time.NewTicker(200 * time.Millisecond)
	defer tick.Stop()
	for {
		err := db.pool.QueryRow(ctx, `select current_setting('server_version'),
			coalesce((select extversion from pg_extension where extname = 'timescaledb'), '')`).Scan(&db.Version, &db.Timescale)
		if err == nil {
			db.Version, _, _ = strings.Cut(db.Version, " ")
			return nil
		}
		if !Temporary(err) || ctx.Err() != nil {
			return fmt.Errorf("ask database for its version: %w", err)
		}
		select {
		case <-ctx.Done():
			return fmt.Errorf("ask database for its version: %w", err)
		case <-tick.C:
		}
	}
}

// Close closes all connections.
func (db *DB) Close() { db.pool.Close() }

// Temporary says whether err is of the connection or of the server's state, so
// that the same work may succeed later unchanged. After a lost commit nobody
// knows whether it happened: every transaction here may be tried again whole.
func Temporary(err error) bool {
	if err == nil {
		return false
	}
	if pgErr, ok := errors.AsType[*pgconn.PgError](err); ok {
		switch pgErr.Code[:2] {
		case "08", "53", "57", "58": // connection, resources, intervention, system
			return true
		case "40": // serialisation, deadlock
			return true
		}
		return pgErr.Code == "55P03" // lock not available
	}
	if _, ok := errors.AsType[*pgconn.ConnectError](err); ok {
		return true
	}
	// Not net.Error: every errno is one, a file that is not there too.
	if _, ok := errors.AsType[*net.OpError](err); ok {
		return true
	}
	return errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) || errors.Is(err, net.ErrClosed) ||
		errors.Is(err, syscall.ECONNRESET) || errors.Is(err, syscall.EPIPE) || errors.Is(err, context.DeadlineExceeded) ||
		strings.Contains(err.Error(), "conn closed")
}

// within runs f in a transaction that commits if f returns nil.
func (db *DB) within(ctx context.Context, f func(pgx.Tx) error) error {
	return pgx.BeginFunc(ctx, db.pool, f)
}

// lock takes an advisory lock until the transaction ends. The two numbers keep
// the program's locks apart from others and its own families from each other.
func lock(ctx context.Context, tx pgx.Tx, family lockFamily, name string) error {
	_, err := tx.Exec(ctx, `select pg_advisory_xact_lock($1, hashtext($2))`, int32(family), name)
	if err != nil {
		return fmt.Errorf("lock %s: %w", name, err)
	}
	return nil
}

// tryLock is lock without waiting; false if another has it.
func tryLock(ctx context.Context, tx pgx.Tx, family lockFamily, name string) (bool, error) {
	var got bool
	err := tx.QueryRow(ctx, `select pg_try_advisory_xact_lock($1, hashtext($2))`, int32(family), name).Scan(&got)
	if err != nil {
		return false, fmt.Errorf("try to lock %s: %w", name, err)
	}
	return got, nil
}

type lockFamily int32

const (
	lockSchema  lockFamily = 0x7468_0001
	lockFeed    lockFamily = 0x7468_0002
	lockStation lockFamily = 0x7468_0003
	lockSite    lockFamily = 0x7468_0004
	lockStated  lockFamily = 0x7468_0005 // settings
)
