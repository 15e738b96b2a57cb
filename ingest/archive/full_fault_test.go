package archive

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"os/exec"
	"os/signal"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// childFolder names the folder of the archive that a child process fills.
const childFolder = "THAWLEDGER_TEST_ARCHIVE"

// TestMain is, in a child process, one that may write no file longer than 64 KiB:
// for the archive that is a disk that is full in the middle of a delivery.
func TestMain(m *testing.M) {
	dir := os.Getenv(childFolder)
	if dir == "" {
		os.Exit(m.Run())
	}
	signal.Ignore(syscall.SIGXFSZ)
	a, err := Open(dir)
	if err == nil {
		err = syscall.Setrlimit(syscall.RLIMIT_FSIZE, &syscall.Rlimit{Cur: 64 << 10, Max: 64 << 10})
	}
	if err != nil {
		os.Stderr.WriteString("cannot begin: " + err.Error())
		os.Exit(2)
	}
	_, err = a.Keep(Origin{Feed: "f", Name: "n"}, bytes.NewReader(make([]byte, 1<<20)))
	if err == nil {
		os.Exit(0)
	}
	os.Stderr.WriteString(err.Error())
	if errors.Is(err, syscall.EFBIG) {
		os.Exit(3)
	}
	os.Exit(4)
}

// A delivery for which there is no room leaves nothing behind, and the error says
// what could not be done.
func TestDiskFull(t *testing.T) {
	dir := t.TempDir()
	c := exec.Command(os.Args[0])
	c.Env = append(os.Environ(), childFolder+"="+dir)
	said, err := c.CombinedOutput()
	if code := c.ProcessState.ExitCode(); code != 3 || !strings.HasPrefix(string(said), "copy to archive: ") {
		t.Fatalf("%v, status %d: %s", err, code, said)
	}
	err = filepath.WalkDir(dir, func(path string, e fs.DirEntry, err error) error {
		if err == nil && !e.IsDir() && e.Name() != "identity" {
			t.Errorf("%s is left behind", path)
		}
		return err
	})
	if err != nil {
		t.Error(err)
	}
}
