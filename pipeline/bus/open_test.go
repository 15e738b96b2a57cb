package bus

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

func TestOpenRefuses(t *testing.T) {
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	at := func(listen string) Config { return Config{Embedded: &Embedded{Dir: t.TempDir(), Listen: listen}} }
	for _, c := range []struct {
		name      string
		config    Config
		says      string
		temporary bool
	}{
		{"nothing", Config{}, "exactly one", false},
		{"both", Config{URL: "nats://127.0.0.1:1", Embedded: &Embedded{Dir: "x"}}, "exactly one", false},
		{"no folder", Config{Embedded: &Embedded{}}, "no folder", false},
		{"replicas embedded", Config{Embedded: &Embedded{Dir: "x"}, Replicas: 3}, "for a cluster", false},
		{"replicas", Config{URL: "nats://127.0.0.1:1", Replicas: 6}, "replicas 6", false},
		{"room", Config{URL: "nats://127.0.0.1:1", MaxBytes: 1}, "room", false},
		{"work time", Config{URL: "nats://127.0.0.1:1", WorkTime: 1}, "work time", false},
		{"credentials", Config{URL: "nats://127.0.0.1:1", CredentialsFile: file + "x"}, "read credentials", false},
		{"nobody there", Config{URL: "nats://127.0.0.1:1"}, "connect", true},
		{"folder is a file", Config{Embedded: &Embedded{Dir: file}}, "not a directory", false},
		{"every address", at("0.0.0.0:0"), "loopback", false},
		{"no host", at(":4222"), "loopback", false},
		{"no port", at("127.0.0.1"), "missing port", false},
		{"port", at("127.0.0.1:70000"), "not a number", false},
	} {
		t.Run(c.name, func(t *testing.T) {
			b, err := Open(within(t, patience), c.config)
			if err == nil {
				shut(t, b)
				t.Fatal("no error")
			}
			if !strings.Contains(err.Error(), c.says) || Temporary(err) != c.temporary {
				t.Errorf("%v (temporary %v), want %q (%v)", err, Temporary(err), c.says, c.temporary)
			}
		})
	}
}

func TestAtLeast(t *testing.T) {
	for _, c := range []struct {
		version string
		want    bool
	}{
		{"2.10.4", true}, {"2.10.10", true}, {"2.15.0-RC.1", true}, {"3.0", true}, {"3.0.0", true},
		{"2.10.3", false}, {"2.9.10", false}, {"1.99.99", false}, {"2.10", false}, {"", false}, {"two", false},
	} {
		t.Run(fmt.Sprintf("%q", c.version), func(t *testing.T) {
			if got := atLeast(c.version, 2, 10, 4); got != c.want {
				t.Errorf("%v", got)
			}
		})
	}
}
