package localpg

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// A server killed outright is told of, and what it had committed is there after
// the next start, even while one of its processes works on, deaf to the news.
func TestServerKilled(t *testing.T) {
	c := config(t, install(t))
	c.Durable = true
	s := start(t, c)
	ask(t, c, "create table kept as select 7 as n")
	deaf := psql(c, "do 'begin loop end loop; end'")
	if err := deaf.Start(); err != nil {
		t.Fatal(err)
	}
	var session int
	await(t, "a session at work", func() bool {
		pid := ask(t, c, "select pid from pg_stat_activity where query like 'do %' and state = 'active'")
		session, _ = strconv.Atoi(pid)
		return session > 0
	})
	t.Cleanup(func() {
		_ = syscall.Kill(session, syscall.SIGQUIT)
		_ = deaf.Wait() // it fails, as it should
	})
	if err := syscall.Kill(s.Pid(), syscall.SIGKILL); err != nil {
		t.Fatal(err)
	}
	select {
	case err := <-s.Exited():
		if err == nil || !strings.Contains(err.Error(), "killed") {
			t.Errorf("exit told as %v", err)
		}
	case <-time.After(30 * time.Second):
		t.Fatal("nothing was told")
	}
	stop(t, s) // of what has ended: no error
	again := start(t, c)
	if got := ask(t, c, "select n from kept"); got != "7" {
		t.Errorf("after the kill the table holds %q", got)
	}
	stop(t, again)
}

// A server dies with its owner, in order.
func TestOwnerKilled(t *testing.T) {
	c := config(t, install(t))
	stop(t, start(t, c))
	owner, pid := startOwner(t, c.Dir, syscall.SIGINT)
	killOwner(t, owner)
	await(t, "the server's end", func() bool { return gone(pid) })
	if _, err := os.Stat(filepath.Join(clusterDir(c.Dir), "postmaster.pid")); err == nil {
		t.Error("the server did not shut down in order")
	}
	stop(t, start(t, c))
}

// A server that outlives its owner is stopped by the next start.
func TestOrphan(t *testing.T) {
	c := config(t, install(t))
	stop(t, start(t, c))
	owner, pid := startOwner(t, c.Dir, 0)
	killOwner(t, owner)
	if got := ask(t, c, "select 1"); got != "1" {
		t.Fatalf("the orphan answers %q", got)
	}
	s := start(t, c)
	if !gone(pid) {
		t.Error("the orphan still runs")
	}
	if s.Pid() == pid {
		t.Error("the server is the orphan")
	}
	stop(t, s)
}

// A postmaster.pid whose number now belongs to another process of the server's
// account does not keep the server from starting.
func TestNumberTaken(t *testing.T) {
	c := config(t, install(t))
	stop(t, start(t, c))
	acc, err := accountFor(c.Dir)
	if err != nil {
		t.Fatal(err)
	}
	other := acc.command(0, "sleep", "600")
	if err := other.Start(); err != nil {
		t.Fatal(err)
	}
	defer func() { _ = other.Process.Kill(); _ = other.Wait() }()
	file := filepath.Join(clusterDir(c.Dir), "postmaster.pid")
	text := fmt.Sprintf("%d\n%s\n1900000000\n5432\n/nowhere\n\n        0         0\nready   \n", other.Process.Pid, clusterDir(c.Dir))
	if err := os.WriteFile(file, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Chown(file, acc.uid, acc.gid); err != nil {
		t.Fatal(err)
	}
	stop(t, start(t, c))
	if gone(other.Process.Pid) {
		t.Error("the other process was stopped")
	}
}

// A stop that may not take its time is an error, and loses nothing committed.
func TestStopAtOnce(t *testing.T) {
	c := config(t, install(t))
	s := start(t, c)
	ask(t, c, "create table kept as select 7 as n")
	pid := s.Pid()
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if err := s.Stop(ctx); !errors.Is(err, context.Canceled) {
		t.Errorf("stop under an ended context: %v", err)
	}
	if !gone(pid) {
		t.Error("the server still runs")
	}
	again := start(t, c)
	if got := ask(t, c, "select n from kept"); got != "7" {
		t.Errorf("after that the table holds %q", got)
	}
	stop(t, again)
}
