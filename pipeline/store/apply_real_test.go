package store_test

import (
	"context"
	"errors"
	"strings"
	"sync"
	"testing"

	"go.uber.org/zap"

	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// fresh is a database that holds nothing.
func fresh(t *testing.T, name string) (url string) {
	t.Helper()
	admin := pipelinetest.Server(t, "postgres")
	if err := pipelinetest.Exec(t.Context(), admin, "create database "+name); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := pipelinetest.Exec(context.Background(), admin, "drop database "+name+" with (force)"); err != nil {
			t.Error(err)
		}
	})
	return pipelinetest.Server(t, name)
}

func open(t *testing.T, url string) *store.DB {
	t.Helper()
	db, err := store.Open(t.Context(), url, zap.NewNop())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(db.Close)
	return db
}

// Programs that start at once bring the schema up once; what is there already
// stays; an edited step and a newer database are refused.
func TestApply(t *testing.T) {
	url := fresh(t, "thaw_apply")
	first := open(t, url)
	steps, err := first.Schema(t.Context())
	if err != nil || len(steps) < 7 || !steps[0].AppliedAt.IsZero() {
		t.Fatalf("empty database: %d steps, %v", len(steps), err)
	}
	var group sync.WaitGroup
	var mu sync.Mutex
	done := map[string]int{}
	for range 4 {
		db := open(t, url)
		group.Go(func() {
			applied, err := db.Apply(t.Context(), "test")
			if err != nil {
				t.Error(err)
			}
			mu.Lock()
			defer mu.Unlock()
			for _, s := range applied {
				done[s.Name]++
			}
		})
	}
	group.Wait()
	for _, s := range steps {
		if done[s.Name] != 1 {
			t.Errorf("step %s applied %d times", s.Name, done[s.Name])
		}
	}
	if again, err := first.Apply(t.Context(), "test"); err != nil || len(again) > 0 {
		t.Errorf("applied again: %v, %v", again, err)
	}
	if got, err := first.Schema(t.Context()); err != nil || got[len(got)-1].AppliedAt.IsZero() {
		t.Errorf("schema after: %v", err)
	}

	if err := pipelinetest.Exec(t.Context(), url, `insert into thaw.schema_steps (step, name, checksum, program) values (99, '0099_later', 'x', 'later')`); err != nil {
		t.Fatal(err)
	}
	for _, f := range []func() error{
		func() error { _, err := first.Schema(t.Context()); return err },
		func() error { _, err := first.Apply(t.Context(), "test"); return err },
	} {
		if err := f(); !errors.Is(err, store.ErrNewerSchema) || !strings.Contains(err.Error(), "0099_later") {
			t.Errorf("newer database: %v", err)
		}
	}
	if err := pipelinetest.Exec(t.Context(), url, `delete from thaw.schema_steps where step = 99; update thaw.schema_steps set checksum = 'other' where step = 3`); err != nil {
		t.Fatal(err)
	}
	if _, err := first.Apply(t.Context(), "test"); err == nil || !strings.Contains(err.Error(), "never edited") {
		t.Errorf("edited step: %v", err)
	}
}

// What the settings state is history: a changed value retires its row, the same
// settings again change nothing, and what is no longer stated is retired.
func TestStatedIsHistory(t *testing.T) {
	db := pipelinetest.New(t)
	state := func(s store.Stated) {
		t.Helper()
		if err := db.State(t.Context(), s); err != nil {
			t.Fatal(err)
		}
	}
	designs := func() string {
		return strings.Join(db.Rows(t, `select design_stated, retired_at is null from thaw.design_values order by design_value_id`), " ")
	}
	state(stated(1000, "Fell"))
	state(stated(1000, "Fell"))
	if got := designs(); got != "(1000,t)" {
		t.Errorf("the same twice: %s", got)
	}
	changes := len(db.Rows(t, `select 1 from thaw.changes`))
	state(stated(1200, "Fell"))
	if got := designs(); got != "(1000,f) (1200,t)" {
		t.Errorf("changed: %s", got)
	}
	if got := len(db.Rows(t, `select 1 from thaw.changes`)); got != changes+1 {
		t.Errorf("%d lines in changes; want one more than %d", got, changes)
	}
	gone := stated(1200, "Fell")
	gone.Sites = nil
	state(gone)
	if got := designs(); got != "(1000,f) (1200,f)" {
		t.Errorf("no longer stated: %s", got)
	}
	if got := db.Rows(t, `select recompute from thaw.stations`); got[0] != "(f)" {
		t.Errorf("marked to be made anew: %v", got)
	}
	state(stated(1200, "Fell Flats")) // a name is no rule
	if got := db.Rows(t, `select recompute from thaw.stations`); got[0] != "(f)" {
		t.Errorf("marked by a new name: %v", got)
	}
	warmer := stated(1200, "Fell")
	warmer.Stations[0].BaseC = 1
	state(warmer)
	if got := db.Rows(t, `select recompute, reindex from thaw.stations`); got[0] != "(f,t)" {
		t.Errorf("marked by a new base: %v; want indices alone", got)
	}
}
