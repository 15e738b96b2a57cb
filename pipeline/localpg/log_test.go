package localpg

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"
)

func TestLogIsCapped(t *testing.T) {
	path := filepath.Join(t.TempDir(), "server.log")
	for range 2 { // the second goes on with the file
		l, err := openLog(path, 100)
		if err != nil {
			t.Fatal(err)
		}
		for i := range 25 {
			if _, err := l.Write([]byte{byte('a' + i), '2', '3', '4', '5', '6', '7', '8', '9', '\n'}); err != nil {
				t.Fatal(err)
			}
		}
		if got := l.String(); got[len(got)-9:] != "y23456789" {
			t.Errorf("last said %q", got)
		}
		if err := l.close(); err != nil {
			t.Fatal(err)
		}
	}
	for name, lines := range map[string]int{"server.log": 10, "server.log.1": 10} {
		b, err := os.ReadFile(filepath.Join(filepath.Dir(path), name))
		if err != nil {
			t.Fatal(err)
		}
		if n := bytes.Count(b, []byte("\n")); n != lines {
			t.Errorf("%s has %d lines", name, n)
		}
	}
}

func TestTailIsShort(t *testing.T) {
	var l tail
	for range 10 {
		_, _ = l.Write(bytes.Repeat([]byte("x"), tailBytes/3))
	}
	_, _ = l.Write([]byte("end\n"))
	if got := l.String(); len(got) > tailBytes || got[len(got)-3:] != "end" {
		t.Errorf("%d bytes, ending in %q", len(got), got[len(got)-3:])
	}
}
