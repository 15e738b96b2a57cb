package lifecycle

import (
	"context"
	"errors"
	"os"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/zap"
)

// journal notes what happens in which order.
type journal struct {
	mu    sync.Mutex
	lines []string
}

func (j *journal) add(line string) {
	j.mu.Lock()
	defer j.mu.Unlock()
	j.lines = append(j.lines, line)
}

func (j *journal) stage(name string, finish time.Duration) Stage {
	return Stage{name, func(intake, work context.Context) error {
		<-intake.Done()
		j.add(name + " stops taking")
		select {
		case <-time.After(finish):
			j.add(name + " is finished")
		case <-work.Done():
			j.add(name + " is broken off")
		}
		return nil
	}}
}

func TestStopsInOrder(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		var j journal
		ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
		defer cancel()
		err := Run(ctx, zap.NewNop(), time.Hour, nil, j.stage("ingest", 3*time.Second), j.stage("indices", time.Second))
		if err != nil {
			t.Error(err)
		}
		want := []string{"ingest stops taking", "ingest is finished", "indices stops taking", "indices is finished"}
		if diff := cmp.Diff(want, j.lines); diff != "" {
			t.Error(diff)
		}
	})
}

func TestBreaksOff(t *testing.T) {
	for _, tc := range []struct {
		name  string
		grace time.Duration
		hurry bool
	}{{"past the deadline", 2 * time.Second, false}, {"when hurried", time.Hour, true}} {
		t.Run(tc.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				var j journal
				ctx, cancel := context.WithCancel(t.Context())
				cancel()
				hurry := make(chan struct{})
				if tc.hurry {
					close(hurry)
				}
				err := Run(ctx, zap.NewNop(), tc.grace, hurry, j.stage("ingest", time.Hour))
				if !errors.Is(err, ErrBrokenOff) {
					t.Errorf("error %v", err)
				}
				if diff := cmp.Diff([]string{"ingest stops taking", "ingest is broken off"}, j.lines); diff != "" {
					t.Error(diff)
				}
			})
		})
	}
}

func TestAStageThatFailsStopsAll(t *testing.T) {
	var j journal
	broken := errors.New("no bus")
	err := Run(t.Context(), zap.NewNop(), time.Minute, nil, j.stage("ingest", 0),
		Stage{"indices", func(context.Context, context.Context) error { return broken }})
	if !errors.Is(err, broken) || !strings.Contains(err.Error(), "indices") {
		t.Errorf("error %v", err)
	}
	if diff := cmp.Diff([]string{"ingest stops taking", "ingest is finished"}, j.lines); diff != "" {
		t.Error(diff)
	}
}

func TestLockFolder(t *testing.T) {
	dir := t.TempDir() + "/data"
	release, err := LockFolder(dir)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := LockFolder(dir); !errors.Is(err, ErrFolderInUse) {
		t.Errorf("second lock: %v", err)
	}
	release()
	again, err := LockFolder(dir)
	if err != nil {
		t.Fatal(err)
	}
	again()
	if _, err := os.Stat(dir); err != nil {
		t.Error(err)
	}
}
