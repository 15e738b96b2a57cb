package localpg

import (
	"cmp"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
)

// oldestMajor is the oldest PostgreSQL that the schema works with.
const oldestMajor = 15

// The folders that deploy/setup found, as it exports them.
const (
	EnvTimescale = "THAWLEDGER_PG_TIMESCALE"
	EnvPlain     = "THAWLEDGER_PG_PLAIN"
)

// Install is a set of PostgreSQL server binaries.
type Install struct {
	BinDir  string
	Version string // as "17.6"
	Major   int
	// Timescale says that TimescaleDB is there, and so will be loaded. Set it
	// to false to run the same binaries as plain PostgreSQL.
	Timescale bool
}

// String names the install in messages.
func (i Install) String() string {
	with := ""
	if i.Timescale {
		with = " with TimescaleDB"
	}
	return fmt.Sprintf("PostgreSQL %s%s in %s", i.Version, with, i.BinDir)
}

// Find returns the usable installs, best first: those in the folders preferred,
// in that order, then the others, TimescaleDB first and newest first. Others
// are what the environment names (see EnvTimescale), what deploy/setup has
// unpacked, and what the system has. Empty names are skipped; a folder that is
// named but of no use is an error, and so is finding nothing.
func Find(prefer []string) ([]Install, error) {
	var found []Install
	add := func(bin string) error {
		inst, err := inspect(bin)
		if err == nil && !slices.ContainsFunc(found, func(f Install) bool { return f.BinDir == inst.BinDir }) {
			found = append(found, inst)
		}
		return err
	}
	for _, bin := range prefer {
		if bin == "" {
			continue
		}
		if err := add(bin); err != nil {
			return nil, fmt.Errorf("use PostgreSQL binaries: %w", err)
		}
	}
	preferred := len(found)
	for _, name := range []string{EnvTimescale, EnvPlain} {
		if bin := os.Getenv(name); bin != "" {
			if err := add(bin); err != nil {
				return nil, fmt.Errorf("use PostgreSQL binaries that %s names: %w", name, err)
			}
		}
	}
	for _, bin := range usualFolders() {
		_ = add(bin) // what can't be used was not asked for
	}
	slices.SortStableFunc(found[preferred:], func(a, b Install) int {
		if a.Timescale != b.Timescale {
			if a.Timescale {
				return -1
			}
			return 1
		}
		return cmp.Compare(b.Major, a.Major)
	})
	if len(found) == 0 {
		return nil, fmt.Errorf("no PostgreSQL server of version %d or later found: "+
			"run deploy/setup, or install the packages postgresql-17 and postgresql-17-timescaledb (or postgresql alone)", oldestMajor)
	}
	return found, nil
}

func usualFolders() []string {
	prefixes := []string{"/var/cache/thawledger/pg17"}
	if cache, err := os.UserCacheDir(); err == nil {
		prefixes = append(prefixes, filepath.Join(cache, "thawledger", "pg17"))
	}
	var bins []string
	for _, p := range prefixes {
		if _, err := os.Stat(filepath.Join(p, "complete")); err == nil {
			bins = append(bins, filepath.Join(p, "usr/lib/postgresql/17/bin"))
		}
	}
	system, _ := filepath.Glob("/usr/lib/postgresql/*/bin")
	bins = append(bins, system...)
	if path, err := exec.LookPath("postgres"); err == nil {
		bins = append(bins, filepath.Dir(path))
	}
	return bins
}

var versionLine = regexp.MustCompile(`\(PostgreSQL\) ((\d+)[0-9a-z.]*)`)

// inspect says what is in a folder.
func inspect(bin string) (Install, error) {
	server, err := filepath.EvalSymlinks(filepath.Join(bin, "postgres"))
	if err != nil {
		return Install{}, fmt.Errorf("folder %s has no program postgres: %w", bin, err)
	}
	if server, err = filepath.Abs(server); err != nil {
		return Install{}, err
	}
	inst := Install{BinDir: filepath.Dir(server)}
	if _, err := os.Stat(filepath.Join(inst.BinDir, "initdb")); err != nil {
		return Install{}, fmt.Errorf("folder %s has no program initdb: %w", inst.BinDir, err)
	}
	out, err := exec.Command(server, "--version").CombinedOutput()
	if err != nil {
		return Install{}, fmt.Errorf("run %s --version: %w: %s", server, err, out)
	}
	m := versionLine.FindSubmatch(out)
	if m == nil {
		return Install{}, fmt.Errorf("%s --version says %q, which is no version of PostgreSQL", server, out)
	}
	inst.Version = string(m[1])
	if inst.Major, err = strconv.Atoi(string(m[2])); err != nil || inst.Major < oldestMajor {
		return Install{}, fmt.Errorf("%s is PostgreSQL %s; %d or later is needed", inst.BinDir, inst.Version, oldestMajor)
	}
	for _, lib := range []string{"../lib/timescaledb.so", "../lib/postgresql/timescaledb.so"} {
		if _, err := os.Stat(filepath.Join(inst.BinDir, lib)); err == nil {
			inst.Timescale = true
		}
	}
	return inst, nil
}

// Pick returns the first install that can run what is in the folder dir, or
// simply the first if there is nothing yet. So a folder goes on with the version
// that made it when a newer one is installed beside.
func Pick(dir string, found []Install) (Install, error) {
	if len(found) == 0 {
		return Install{}, fmt.Errorf("pick PostgreSQL for %s: no installs given", dir)
	}
	var first error
	for _, inst := range found {
		err := suits(dir, inst)
		if err == nil {
			return inst, nil
		}
		first = cmp.Or(first, err)
	}
	return Install{}, first
}
