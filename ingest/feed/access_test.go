package feed

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// folderToLookAt names the folder that a child process looks at.
const folderToLookAt = "THAWLEDGER_TEST_FOLDER"

// TestMain is, in a child process, one without privileges that looks at a folder.
func TestMain(m *testing.M) {
	dir := os.Getenv(folderToLookAt)
	if dir == "" {
		os.Exit(m.Run())
	}
	f := NewFolder(dir, "*.csv", true, 0)
	files, _, err := f.Look(noon, func(File) bool { return false })
	fmt.Println("look:", errors.Is(err, fs.ErrPermission))
	for _, file := range files {
		r, err := f.Open(file)
		if err != nil {
			fmt.Println(file.Name, errors.Is(err, fs.ErrPermission))
			continue
		}
		r.Close()
		fmt.Println(file.Name, "opened")
	}
}

// What may not be read is said, and does not keep the rest from being read.
func TestPermissions(t *testing.T) {
	dir, err := os.MkdirTemp("", "thawledger-test-")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.RemoveAll(dir) })
	feed := filepath.Join(dir, "feed")
	for _, name := range []string{"a.csv", "deep/b.csv", "locked/c.csv", "mine.csv"} {
		if err := os.MkdirAll(filepath.Dir(filepath.Join(feed, name)), 0o755); err != nil {
			t.Fatal(err)
		}
		put(t, feed, name, "x", noon)
	}
	binary := filepath.Join(dir, "look")
	copyFile(t, os.Args[0], binary)
	for path, mode := range map[string]os.FileMode{dir: 0o755, feed: 0o755, binary: 0o755, filepath.Join(feed, "a.csv"): 0o644,
		filepath.Join(feed, "deep", "b.csv"): 0o644, filepath.Join(feed, "locked"): 0, filepath.Join(feed, "mine.csv"): 0} {
		if err := os.Chmod(path, mode); err != nil {
			t.Fatal(err)
		}
	}
	c := exec.Command(binary)
	c.Dir, c.Env = "/", append(os.Environ(), folderToLookAt+"="+feed)
	if os.Geteuid() == 0 {
		c.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}} // nobody
	}
	said, err := c.CombinedOutput()
	if err != nil {
		t.Fatalf("%v\n%s", err, said)
	}
	got := strings.Split(strings.TrimSpace(string(said)), "\n")
	slices.Sort(got)
	if diff := cmp.Diff([]string{"a.csv opened", "deep/b.csv opened", "look: true", "mine.csv true"}, got); diff != "" {
		t.Error(diff)
	}
}

func copyFile(t *testing.T, from, to string) {
	t.Helper()
	r, err := os.Open(from)
	if err != nil {
		t.Fatal(err)
	}
	defer r.Close()
	w, err := os.Create(to)
	if err != nil {
		t.Fatal(err)
	}
	_, err = io.Copy(w, r)
	if err := errors.Join(err, w.Close()); err != nil {
		t.Fatal(err)
	}
}

// Sub-folders are looked into only if they are to be.
func TestSubfolders(t *testing.T) {
	dir := t.TempDir()
	for _, name := range []string{"2031", "2031/07"} {
		if err := os.Mkdir(filepath.Join(dir, name), 0o755); err != nil {
			t.Fatal(err)
		}
	}
	put(t, dir, "a.csv", "x", noon)
	put(t, dir, "2031/07/b.csv", "x", noon)
	put(t, dir, "2031/c.txt", "x", noon)
	for deep, want := range map[bool][]string{false: {"a.csv"}, true: {"2031/07/b.csv", "a.csv"}} {
		f := NewFolder(dir, "*.csv", deep, 0)
		files, _, err := f.Look(noon, func(File) bool { return false })
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(want, names(files)); diff != "" {
			t.Errorf("deep %t: %s", deep, diff)
		}
	}
}
