package feed

import (
	"os"
	"path/filepath"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
)

var noon = time.Date(2031, 7, 1, 12, 0, 0, 0, time.UTC)

func put(t *testing.T, dir, name, text string, at time.Time) {
	t.Helper()
	path := filepath.Join(dir, name)
	if err := os.WriteFile(path, []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Chtimes(path, at, at); err != nil {
		t.Fatal(err)
	}
}

func names(files []File) (out []string) {
	for _, f := range files {
		out = append(out, f.Name)
	}
	return out
}

func none(File) bool { return false }

func TestLook(t *testing.T) {
	dir := t.TempDir()
	put(t, dir, "b.csv", "1", noon.Add(-time.Hour))
	put(t, dir, "a.csv", "1", noon.Add(-time.Hour))
	put(t, dir, "z.csv", "1", noon.Add(-2*time.Hour))
	put(t, dir, "growing.csv", "1", noon.Add(-5*time.Second))
	put(t, dir, "notes.txt", "1", noon.Add(-time.Hour))
	put(t, dir, "known.csv", "1", noon.Add(-time.Hour))
	if err := os.Mkdir(filepath.Join(dir, "folder.csv"), 0o700); err != nil {
		t.Fatal(err)
	}
	outside := t.TempDir()
	put(t, outside, "secret", "1", noon.Add(-time.Hour))
	if err := os.Symlink(filepath.Join(outside, "secret"), filepath.Join(dir, "link.csv")); err != nil {
		t.Fatal(err)
	}
	f := NewFolder(dir, "*.csv", false, 10*time.Second)
	settled, unsettled, err := f.Look(noon, func(f File) bool { return f.Name == "known.csv" })
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]string{"z.csv", "a.csv", "b.csv"}, names(settled)); diff != "" || unsettled != 1 {
		t.Errorf("unsettled %d, settled %s", unsettled, diff)
	}
}

// A server whose clock is ahead gives times that never look old.
func TestLookAheadClock(t *testing.T) {
	dir := t.TempDir()
	put(t, dir, "a.csv", "1", noon.Add(time.Hour))
	f := NewFolder(dir, "*", false, 10*time.Second)
	for _, tc := range []struct {
		after time.Duration
		want  int
	}{{0, 0}, {9 * time.Second, 0}, {10 * time.Second, 1}} {
		settled, _, err := f.Look(noon.Add(tc.after), none)
		if err != nil || len(settled) != tc.want {
			t.Errorf("after %s: settled %v, %v", tc.after, settled, err)
		}
	}
}

func TestUnchanged(t *testing.T) {
	dir := t.TempDir()
	put(t, dir, "a.csv", "1", noon.Add(-time.Hour))
	f := NewFolder(dir, "*", false, 0)
	settled, _, err := f.Look(noon, none)
	if err != nil || len(settled) != 1 {
		t.Fatal(settled, err)
	}
	r, err := f.Open(settled[0])
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	if ok, err := f.Unchanged(r, settled[0]); !ok || err != nil {
		t.Errorf("unchanged %t, %v", ok, err)
	}
	put(t, dir, "a.csv", "12", noon)
	if ok, err := f.Unchanged(r, settled[0]); ok || err != nil {
		t.Errorf("changed file is unchanged %t, %v", ok, err)
	}
}
