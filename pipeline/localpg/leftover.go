package localpg

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"syscall"
	"time"

	"go.uber.org/zap"
)

// How long a server left over gets for an orderly end, and then for an
// immediate one (which loses nothing: the next start recovers).
const (
	orderlyEnd   = 30 * time.Second
	immediateEnd = 10 * time.Second
)

// clearLeftovers stops whatever still runs on the cluster (a server whose owner
// was killed, or the processes of a server that was), and removes a
// postmaster.pid that PostgreSQL would take for a running server's because its
// number now belongs to another process, or to a dead one that nobody has
// waited for.
func (c Config) clearLeftovers(ctx context.Context) error {
	cluster := clusterDir(c.Dir)
	pids, err := runningIn(cluster)
	if err != nil {
		return fmt.Errorf("look for servers left over: %w", err)
	}
	pidFile := filepath.Join(cluster, "postmaster.pid")
	main := postmaster(pidFile)
	if slices.Contains(pids, main) {
		c.Log.Warn("stopping a database server that was left over", zap.Int("pid", main))
		_ = syscall.Kill(main, syscall.SIGINT)
		pids, err = awaitNone(ctx, cluster, orderlyEnd)
		if err != nil {
			return fmt.Errorf("stop server left over (pid %d): %w", main, err)
		}
	}
	if len(pids) > 0 {
		c.Log.Warn("stopping processes of a database server that was left over, at once", zap.Ints("pids", pids))
		for _, pid := range pids {
			_ = syscall.Kill(pid, syscall.SIGQUIT)
		}
		pids, err = awaitNone(ctx, cluster, immediateEnd)
		if err != nil {
			return fmt.Errorf("stop processes left over: %w", err)
		}
		if len(pids) > 0 {
			return fmt.Errorf("processes %v of an earlier database server still use %s and do not stop: end them", pids, cluster)
		}
	}
	main = postmaster(pidFile)
	if main > 0 && !errors.Is(syscall.Kill(main, 0), syscall.ESRCH) {
		c.Log.Warn("removing the postmaster.pid of a server that is gone", zap.Int("pid", main))
		if err := os.Remove(pidFile); err != nil {
			return fmt.Errorf("remove postmaster.pid of a server that is gone: %w", err)
		}
	}
	for _, name := range []string{socketFile, socketFile + ".lock"} {
		if err := os.Remove(filepath.Join(socketDir(c.Dir), name)); err != nil && !errors.Is(err, os.ErrNotExist) {
			return fmt.Errorf("remove socket of a server that is gone: %w", err)
		}
	}
	return nil
}

// postmaster returns the process number in a postmaster.pid; 0 if there is none.
func postmaster(pidFile string) int {
	b, err := os.ReadFile(pidFile)
	if err != nil {
		return 0
	}
	first, _, _ := bytes.Cut(b, []byte("\n"))
	pid, err := strconv.Atoi(string(bytes.TrimSpace(first)))
	if err != nil {
		return 0
	}
	return pid
}

// runningIn returns the processes of PostgreSQL whose working folder is cluster;
// all processes of a server have it. Dead ones have none.
func runningIn(cluster string) ([]int, error) {
	want, err := os.Stat(cluster)
	if err != nil {
		return nil, err
	}
	entries, err := os.ReadDir("/proc")
	if err != nil {
		return nil, err
	}
	var pids []int
	for _, e := range entries {
		pid, err := strconv.Atoi(e.Name())
		if err != nil {
			continue
		}
		// "postgres (deleted)" after an upgrade.
		exe, err := os.Readlink(filepath.Join("/proc", e.Name(), "exe"))
		if err != nil || !strings.HasPrefix(filepath.Base(exe), "postgres") {
			continue
		}
		cwd, err := os.Stat(filepath.Join("/proc", e.Name(), "cwd"))
		if err == nil && os.SameFile(cwd, want) {
			pids = append(pids, pid)
		}
	}
	return pids, nil
}

// awaitNone waits until nothing runs in cluster, for as long as patience goes,
// and returns what still does.
func awaitNone(ctx context.Context, cluster string, patience time.Duration) ([]int, error) {
	late := time.NewTimer(patience)
	defer late.Stop()
	tick := time.NewTicker(50 * time.Millisecond)
	defer tick.Stop()
	for {
		pids, err := runningIn(cluster)
		if err != nil || len(pids) == 0 {
			return nil, err
		}
		select {
		case <-ctx.Done():
			return nil, ctx.Err()
		case <-late.C:
			return pids, nil
		case <-tick.C:
		}
	}
}
