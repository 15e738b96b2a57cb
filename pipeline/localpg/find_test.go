package localpg

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// binaries makes a folder that looks like an install.
func binaries(t *testing.T, version string, timescale bool) string {
	t.Helper()
	root := t.TempDir()
	files := map[string]string{
		"bin/postgres": fmt.Sprintf("#!/bin/sh\necho 'postgres (PostgreSQL) %s'\n", version),
		"bin/initdb":   "",
	}
	if timescale {
		files["lib/timescaledb.so"] = ""
	}
	for name, text := range files {
		path := filepath.Join(root, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(text), 0o755); err != nil { //nolint:gosec // a program
			t.Fatal(err)
		}
	}
	return filepath.Join(root, "bin")
}

func TestFind(t *testing.T) {
	named, scale, plain := binaries(t, "15.9", false), binaries(t, "99.2 (Debian 99.2-1)", true), binaries(t, "99beta1", false)
	t.Setenv(EnvPlain, plain)
	t.Setenv(EnvTimescale, scale)
	found, err := Find([]string{"", named, named})
	if err != nil {
		t.Fatal(err)
	}
	if found[0] != (Install{BinDir: named, Version: "15.9", Major: 15}) {
		t.Errorf("first is %+v, not what was preferred", found[0])
	}
	if found[1] != (Install{BinDir: scale, Version: "99.2", Major: 99, Timescale: true}) {
		t.Errorf("second is %+v, not TimescaleDB", found[1])
	}
	at := map[string]int{}
	for i, inst := range found {
		if _, twice := at[inst.BinDir]; twice {
			t.Errorf("%v is there twice", inst)
		}
		at[inst.BinDir] = i
		if inst.Timescale && i > at[plain] && at[plain] > 0 {
			t.Errorf("%v comes after one without TimescaleDB", inst)
		}
	}
	if i := at[plain]; i == 0 || found[i].Version != "99beta1" {
		t.Errorf("the plain one is %+v", found[i])
	}
}

// A folder that somebody names must be of use.
func TestFindRefuses(t *testing.T) {
	bare := binaries(t, "17.6", false)
	if err := os.Remove(filepath.Join(bare, "initdb")); err != nil {
		t.Fatal(err)
	}
	for _, tc := range []struct {
		name, bin, reason string
	}{
		{"old", binaries(t, "14.13", true), "PostgreSQL 14.13; 15 or later is needed"},
		{"something else", binaries(t, "' && echo '", false), "is no version of PostgreSQL"},
		{"empty", t.TempDir(), "has no program postgres"},
		{"no initdb", bare, "has no program initdb"},
	} {
		t.Run(tc.name, func(t *testing.T) {
			if _, err := Find([]string{tc.bin}); err == nil || !strings.Contains(err.Error(), tc.reason) {
				t.Errorf("preferred: %v", err)
			}
			t.Setenv(EnvTimescale, tc.bin)
			if _, err := Find(nil); err == nil || !strings.Contains(err.Error(), EnvTimescale) {
				t.Errorf("in the environment: %v", err)
			}
		})
	}
}
