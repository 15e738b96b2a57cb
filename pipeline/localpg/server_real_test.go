package localpg

import (
	"context"
	"errors"
	"fmt"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// Every kind of install that there is gives a server with the settings meant.
func TestStart(t *testing.T) {
	install(t) // or skip
	found, err := Find(nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, inst := range found {
		t.Run(inst.String(), func(t *testing.T) {
			c := config(t, inst)
			c.Durable = true
			s := start(t, c)
			for name, want := range map[string]string{
				"listen_addresses": "", "fsync": "on", "synchronous_commit": "on", "full_page_writes": "on",
				"jit": "off", "TimeZone": "UTC", "server_encoding": "UTF8", "wal_level": "minimal",
				"max_locks_per_transaction": "256", "data_checksums": "on", "unix_socket_permissions": "0700",
			} {
				if got := ask(t, c, "show "+name); got != want {
					t.Errorf("%s is %q, want %q", name, got, want)
				}
			}
			if inst.Timescale {
				ask(t, c, "set client_min_messages = error; create extension timescaledb")
				if got := ask(t, c, "show timescaledb.telemetry_level"); got != "off" {
					t.Errorf("telemetry is %q", got)
				}
			}
			info, err := os.Stat(socketDir(c.Dir))
			if err != nil || info.Mode().Perm() != 0o700 {
				t.Errorf("socket folder: mode %v, %v", info.Mode(), err)
			}
			if u, err := url.Parse(s.DSN("a b")); err != nil || u.Path != "/a b" {
				t.Errorf("DSN %q: %v", s.DSN("a b"), err)
			}
			if os.Geteuid() == 0 {
				info, err := os.Stat(fmt.Sprintf("/proc/%d", s.Pid()))
				if err != nil || info.Sys().(*syscall.Stat_t).Uid == 0 {
					t.Errorf("server runs as root: %v", err)
				}
			}
			ask(t, c, "create table kept as select 7 as n")
			stop(t, s)
			stop(t, s) // does no harm
			if err, open := <-s.Exited(); open {
				t.Errorf("stop was told as an exit: %v", err)
			}
			again := start(t, c)
			if got := ask(t, c, "select n from kept"); got != "7" {
				t.Errorf("after a restart the table holds %q", got)
			}
			stop(t, again)
		})
	}
}

// Paths too long for a socket, and with characters that lists and addresses
// give a meaning to, work all the same.
func TestOddPaths(t *testing.T) {
	inst := install(t)
	for _, name := range []string{
		strings.Repeat("ein-langer-Name-", 8),
		`a "b" & 'c' %20+`,
		"with, comma",
	} {
		t.Run(name, func(t *testing.T) {
			c := config(t, inst)
			c.Dir = filepath.Join(filepath.Dir(c.Dir), name)
			s := start(t, c)
			if got := ask(t, c, "select 1"); got != "1" {
				t.Errorf("answer %q", got)
			}
			stop(t, s)
			if socket := socketDir(c.Dir); strings.HasPrefix(socket, "/tmp/thawledger-") {
				if _, err := os.Stat(socket); err == nil {
					t.Errorf("%s is left behind", socket)
				}
			}
		})
	}
}

// initdb broken off leaves nothing behind that a later start would trip over.
func TestInitdbBrokenOff(t *testing.T) {
	c := config(t, install(t))
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := Start(ctx, c); !errors.Is(err, context.Canceled) {
		t.Fatalf("start under an ended context: %v", err)
	}
	// What a kill in the middle leaves.
	if err := os.MkdirAll(filepath.Join(c.Dir, "cluster.new-1", "base"), 0o700); err != nil {
		t.Fatal(err)
	}
	s := start(t, c)
	entries, err := os.ReadDir(c.Dir)
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	if diff := cmp.Diff([]string{"cluster", "made.json", "server.log", "socket"}, names); diff != "" {
		t.Error(diff)
	}
	stop(t, s)
}

func TestTimescaleIsNotLeft(t *testing.T) {
	inst := install(t)
	if !inst.Timescale {
		t.Skip("SKIPPED, NOT TESTED: no TimescaleDB")
	}
	plain := inst
	plain.Timescale = false
	c := config(t, plain)
	stop(t, start(t, c))
	c.Install = inst // from plain to TimescaleDB is allowed
	s := start(t, c)
	ask(t, c, "set client_min_messages = error; create extension timescaledb")
	stop(t, s)
	c.Install = plain
	_, err := Start(t.Context(), c)
	if err == nil || !strings.Contains(err.Error(), "was made with TimescaleDB") {
		t.Errorf("start without TimescaleDB: %v", err)
	}
}

func TestUnreachableParent(t *testing.T) {
	if os.Geteuid() != 0 {
		t.Skip("only root gives the server another account")
	}
	c := config(t, install(t))
	shut := filepath.Join(filepath.Dir(c.Dir), "shut")
	c.Dir = filepath.Join(shut, "open", "pg")
	if err := os.MkdirAll(filepath.Dir(c.Dir), 0o755); err != nil {
		t.Fatal(err)
	}
	if err := os.Chmod(shut, 0o700); err != nil {
		t.Fatal(err)
	}
	_, err := Start(t.Context(), c)
	if err == nil || !strings.Contains(err.Error(), "may not enter "+shut+" (mode 0700, owner root)") {
		t.Errorf("start below a folder of mode 0700: %v", err)
	}
}
