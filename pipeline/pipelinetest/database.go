package pipelinetest

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"sync"
	"sync/atomic"
	"testing"

	"github.com/jackc/pgx/v5"
	"go.uber.org/goleak"
	"go.uber.org/zap"

	"thawledger/pipeline/localpg"
	"thawledger/pipeline/store"
)

// Database is a database of a test's own, with the schema applied.
type Database struct {
	*store.DB
	URL string
}

const template = "thaw_template"

var (
	once    sync.Once
	server  *localpg.Server
	folder  string
	noStart error
	count   atomic.Int32
)

// Main is what a package's TestMain calls: it runs the tests, stops the server
// and fails if a goroutine is left behind.
func Main(m *testing.M) {
	code := m.Run()
	if server != nil {
		if err := server.Stop(context.Background()); err != nil {
			fmt.Fprintln(os.Stderr, "stop test server:", err)
			code = max(code, 1)
		}
		os.RemoveAll(folder)
	}
	if code == 0 {
		if err := goleak.Find(); err != nil {
			fmt.Fprintln(os.Stderr, err)
			code = 1
		}
	}
	os.Exit(code)
}

// Server returns the address of a database of the process's server, starting it
// if it does not run yet. The server does not sync to disk: a fault test starts
// one of its own.
func Server(tb testing.TB, database string) string {
	tb.Helper()
	once.Do(func() { noStart = start() })
	if noStart != nil {
		if os.Getenv("CI") != "" {
			tb.Fatalf("no PostgreSQL for tests: %v", noStart)
		}
		tb.Skipf("SKIPPED, NOT TESTED: no PostgreSQL for tests: %v", noStart)
	}
	return server.DSN(database)
}

func start() error {
	var prefer []string
	if bin := os.Getenv("THAWLEDGER_TEST_PG"); bin != "" {
		prefer = append(prefer, bin)
	}
	found, err := localpg.Find(prefer)
	if err != nil {
		return err
	}
	install := found[0]
	if os.Getenv("THAWLEDGER_TEST_PLAIN") != "" {
		install.Timescale = false
	}
	if folder, err = os.MkdirTemp("", "thawledger-test-"); err != nil {
		return err
	}
	if err := os.Chmod(folder, 0o755); err != nil { //nolint:gosec // the server may run as another user
		return err
	}
	ctx := context.Background()
	server, err = localpg.Start(ctx, localpg.Config{Dir: filepath.Join(folder, "pg"), Install: install, Log: zap.NewNop()})
	if err != nil {
		return err
	}
	if err := Exec(ctx, server.DSN("postgres"), "create database "+template); err != nil {
		return err
	}
	db, err := store.Open(ctx, server.DSN(template), zap.NewNop())
	if err != nil {
		return err
	}
	defer db.Close()
	_, err = db.Apply(ctx, "test")
	fmt.Printf("testing on PostgreSQL %s, TimescaleDB %q\n", db.Version, db.Timescale)
	return err
}

// Exec runs statements on a connection of its own.
func Exec(ctx context.Context, url, sql string) error {
	conn, err := pgx.Connect(ctx, url)
	if err != nil {
		return fmt.Errorf("connect: %w", err)
	}
	defer conn.Close(ctx)
	if _, err := conn.PgConn().Exec(ctx, sql).ReadAll(); err != nil {
		return fmt.Errorf("run %q: %w", sql, err)
	}
	return nil
}

// New returns a database of the test's own, dropped when the test is over.
func New(tb testing.TB) *Database {
	tb.Helper()
	admin := Server(tb, "postgres")
	name := fmt.Sprintf("thaw_test_%d", count.Add(1))
	ctx := tb.Context()
	if err := Exec(ctx, admin, fmt.Sprintf("create database %s template %s", name, template)); err != nil {
		tb.Fatal(err)
	}
	d := &Database{URL: server.DSN(name)}
	db, err := store.Open(ctx, d.URL, zap.NewNop())
	if err != nil {
		tb.Fatal(err)
	}
	d.DB = db
	tb.Cleanup(func() {
		db.Close()
		if err := Exec(context.Background(), admin, fmt.Sprintf("drop database %s with (force)", name)); err != nil {
			tb.Error(err)
		}
	})
	return d
}

// Rows runs a query and returns each row as text, as "(a,b,c)".
func (d *Database) Rows(tb testing.TB, sql string, args ...any) []string {
	tb.Helper()
	return Rows(tb, d.URL, sql, args...)
}

// Rows runs a query on a connection of its own and returns each row as text, as
// "(a,b,c)".
func Rows(tb testing.TB, url, sql string, args ...any) []string {
	tb.Helper()
	ctx := tb.Context()
	conn, err := pgx.Connect(ctx, url)
	if err != nil {
		tb.Fatal(err)
	}
	defer conn.Close(context.WithoutCancel(ctx))
	rows, err := conn.Query(ctx, "select q::text from ("+sql+") q", args...)
	if err != nil {
		tb.Fatalf("%s: %v", sql, err)
	}
	out, err := pgx.CollectRows(rows, pgx.RowTo[string])
	if err != nil {
		tb.Fatalf("%s: %v", sql, err)
	}
	return out
}
