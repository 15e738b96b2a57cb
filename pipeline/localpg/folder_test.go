package localpg

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"go.uber.org/zap"
)

func TestSocketDir(t *testing.T) {
	fits := socketMax - len("/socket/") - len(socketFile)
	for _, tc := range []struct {
		name   string
		length int
		inside bool
	}{
		{"short", 20, true},
		{"just fits", fits, true},
		{"one too long", fits + 1, false},
		{"very long", 300, false},
	} {
		t.Run(tc.name, func(t *testing.T) {
			dir := "/" + strings.Repeat("x", tc.length-1)
			got := socketDir(dir)
			if inside := got == dir+"/socket"; inside != tc.inside {
				t.Errorf("socket in %s", got)
			}
			if n := len(got) + 1 + len(socketFile); n > socketMax {
				t.Errorf("socket path of %d bytes", n)
			}
			if got != socketDir(dir) || got == socketDir(dir+"y") {
				t.Error("the name is not the folder's own")
			}
		})
	}
}

// What a folder was made by decides what may run it.
func TestSuits(t *testing.T) {
	plain15 := Install{BinDir: "/fifteen", Version: "15.9", Major: 15}
	plain17 := Install{BinDir: "/seventeen", Version: "17.6", Major: 17}
	scale17 := Install{BinDir: "/scale", Version: "17.6", Major: 17, Timescale: true}
	for _, tc := range []struct {
		name   string
		files  map[string]string
		inst   Install
		reason string
		pick   string // of scale17, plain17, plain15
	}{
		{"nothing there", nil, plain17, "", "/scale"},
		{"same", map[string]string{"cluster/PG_VERSION": "17\n", "made.json": `{"postgresql":17}`}, plain17, "", "/scale"},
		{"other major", map[string]string{"cluster/PG_VERSION": "15\n", "made.json": `{"postgresql":15}`}, plain17, "was made by PostgreSQL 15 and can't be used by PostgreSQL 17.6 in /seventeen", "/fifteen"},
		{"without TimescaleDB", map[string]string{"cluster/PG_VERSION": "17\n", "made.json": `{"postgresql":17,"timescaledb":true}`}, plain17, "was made with TimescaleDB", "/scale"},
		{"older than all", map[string]string{"cluster/PG_VERSION": "14\n", "made.json": `{"postgresql":14}`}, plain15, "was made by PostgreSQL 14 and can't be used by PostgreSQL 15.9", ""},
		{"no record", map[string]string{"cluster/PG_VERSION": "17\n"}, plain17, `in the form {"postgresql":17,"timescaledb":true}`, ""},
		{"spoilt record", map[string]string{"cluster/PG_VERSION": "17\n", "made.json": "?"}, plain17, "is not of the form", ""},
		{"no cluster", map[string]string{"cluster/other": ""}, plain17, "is no PostgreSQL cluster", ""},
	} {
		t.Run(tc.name, func(t *testing.T) {
			dir := t.TempDir()
			for name, text := range tc.files {
				if err := os.MkdirAll(filepath.Dir(filepath.Join(dir, name)), 0o755); err != nil {
					t.Fatal(err)
				}
				if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
					t.Fatal(err)
				}
			}
			err := suits(dir, tc.inst)
			if (err == nil) != (tc.reason == "") || (err != nil && !strings.Contains(err.Error(), tc.reason)) {
				t.Errorf("got %v, want %q", err, tc.reason)
			}
			picked, err := Pick(dir, []Install{scale17, plain17, plain15})
			if picked.BinDir != tc.pick || (err == nil) != (tc.pick != "") {
				t.Errorf("picked %q, %v", picked.BinDir, err)
			}
			if tc.reason != "" {
				if _, err := Start(t.Context(), Config{Dir: dir, Install: tc.inst, Log: zap.NewNop()}); err == nil {
					t.Error("started all the same")
				}
			}
		})
	}
}

// Under /tmp anybody may have made the folder first.
func TestSocketDirOfOthers(t *testing.T) {
	self := account{uid: os.Geteuid(), gid: os.Getegid(), name: "self"}
	dir := t.TempDir()
	link := filepath.Join(dir, "link")
	if err := os.Symlink(dir, link); err != nil {
		t.Fatal(err)
	}
	if err := prepareSocketDir(link, self); err == nil {
		t.Error("a symbolic link was taken for a folder")
	}
	open := filepath.Join(dir, "open")
	if err := os.Mkdir(open, 0o777); err != nil {
		t.Fatal(err)
	}
	if err := prepareSocketDir(open, self); err != nil {
		t.Error(err)
	}
	if info, err := os.Stat(open); err != nil || info.Mode().Perm() != 0o700 {
		t.Errorf("mode %v, %v", info.Mode(), err)
	}
	if os.Geteuid() != 0 {
		return
	}
	foreign := filepath.Join(dir, "foreign")
	if err := os.Mkdir(foreign, 0o700); err != nil {
		t.Fatal(err)
	}
	if err := os.Chown(foreign, 4321, 4321); err != nil {
		t.Fatal(err)
	}
	if err := prepareSocketDir(foreign, self); err == nil || !strings.Contains(err.Error(), "uid 4321") {
		t.Errorf("a folder of another account: %v", err)
	}
}
