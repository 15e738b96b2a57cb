package store_test

import (
	"fmt"
	"strings"
	"testing"

	"github.com/jackc/pgx/v5"

	"thawledger/pipeline/pipelinetest"
)

func TestMain(m *testing.M) { pipelinetest.Main(m) }

// Analysts read the schema by its comments: nothing goes without one.
func TestEverythingHasAComment(t *testing.T) {
	db := pipelinetest.New(t)
	missing := db.Rows(t, `
		select 'column ' || c.relname || '.' || a.attname
		from pg_class c join pg_namespace n on n.oid = c.relnamespace join pg_attribute a on a.attrelid = c.oid
		where n.nspname = 'thaw' and c.relkind in ('r', 'v', 'p') and a.attnum > 0 and not a.attisdropped and col_description(c.oid, a.attnum) is null
		union all select 'table ' || c.relname from pg_class c join pg_namespace n on n.oid = c.relnamespace
		where n.nspname = 'thaw' and c.relkind in ('r', 'v', 'p') and obj_description(c.oid, 'pg_class') is null
		union all select 'function ' || p.proname from pg_proc p join pg_namespace n on n.oid = p.pronamespace
		where n.nspname = 'thaw' and obj_description(p.oid, 'pg_proc') is null`)
	if len(missing) > 0 {
		t.Errorf("without a comment: %s", strings.Join(missing, " "))
	}
}

// thaw_reader may read everything and write nothing, in tables of every step.
func TestReader(t *testing.T) {
	db := pipelinetest.New(t)
	conn, err := pgx.Connect(t.Context(), db.URL)
	if err != nil {
		t.Fatal(err)
	}
	defer conn.Close(t.Context())
	if _, err := conn.Exec(t.Context(), `set role thaw_reader`); err != nil {
		t.Fatal(err)
	}
	names := db.Rows(t, `select c.relname from pg_class c join pg_namespace n on n.oid = c.relnamespace
		where n.nspname = 'thaw' and c.relkind in ('r', 'v', 'p') order by 1`)
	if len(names) < 20 {
		t.Fatalf("only %v", names)
	}
	for _, name := range names {
		name = strings.Trim(name, "()")
		if _, err := conn.Exec(t.Context(), fmt.Sprintf(`select * from thaw.%s limit 1`, name)); err != nil {
			t.Errorf("read %s: %v", name, err)
		}
		if _, err := conn.Exec(t.Context(), fmt.Sprintf(`delete from thaw.%s`, name)); err == nil {
			t.Errorf("%s can be written to", name)
		}
	}
}

// Readings lie in a hypertable where TimescaleDB is there, and in an ordinary
// table where it is not.
func TestHypertables(t *testing.T) {
	db := pipelinetest.New(t)
	want := "[]"
	if db.Timescale != "" {
		want = "[(reading_values)]"
		if got := fmt.Sprint(db.Rows(t, `select hypertable_name from timescaledb_information.hypertables order by 1`)); got != want {
			t.Errorf("hypertables %s; want %s", got, want)
		}
		return
	}
	if got := fmt.Sprint(db.Rows(t, `select 1 from pg_extension where extname = 'timescaledb'`)); got != want {
		t.Errorf("TimescaleDB is there: %s", got)
	}
}
