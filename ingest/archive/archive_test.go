package archive

import (
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/iotest"
	"time"
)

func TestKeep(t *testing.T) {
	dir := t.TempDir()
	a, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	origin := Origin{Feed: "fell", Name: "fell_2031.csv", SourceTime: time.Date(2031, 5, 1, 0, 0, 0, 0, time.UTC)}
	k, err := a.Keep(origin, strings.NewReader("abc"))
	if err != nil {
		t.Fatal(err)
	}
	// SHA-256 of "abc": FIPS 180-4 example (NIST, SHA256.pdf, one-block message).
	if want := "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"; k.Hash != want || k.Bytes != 3 {
		t.Errorf("kept %+v, want hash %s and 3 bytes", k, want)
	}
	again, err := a.Keep(origin, strings.NewReader("abc"))
	if err != nil || again != k {
		t.Errorf("kept again as %+v, %v", again, err)
	}
	f, err := a.Open(k.Path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if text, _ := io.ReadAll(f); string(text) != "abc" {
		t.Errorf("read back %q", text)
	}
	if beside, err := os.ReadFile(filepath.Join(dir, k.Path) + ".json"); err != nil || !strings.Contains(string(beside), "fell_2031.csv") {
		t.Errorf("origin beside it: %s, %v", beside, err)
	}
}

func TestKeepBrokenOff(t *testing.T) {
	dir := t.TempDir()
	a, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	broken := errors.New("line went dead")
	_, err = a.Keep(Origin{Feed: "fell"}, io.MultiReader(strings.NewReader("half"), iotest.ErrReader(broken)))
	if !errors.Is(err, broken) {
		t.Fatalf("error %v", err)
	}
	left, err := os.ReadDir(filepath.Join(dir, "fell"))
	if err != nil || len(left) != 0 {
		t.Errorf("left behind: %v, %v", left, err)
	}
}

func TestIdentityStays(t *testing.T) {
	dir := t.TempDir()
	a, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	b, err := Open(dir)
	if err != nil || a.ID() == "" || a.ID() != b.ID() {
		t.Errorf("identities %q and %q, %v", a.ID(), b.ID(), err)
	}
}
