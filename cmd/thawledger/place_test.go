package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
	"time"

	"thawledger/pipeline/localpg"
	"thawledger/pipeline/pipelinetest"
)

// place is a folder with settings, named settings.yaml, and files beside them,
// for the program to be run in with a private database of its own.
type place struct{ dir, settings string }

// newPlace makes a place. The names of files are relative to it. Its server is of
// the kind that the other tests run on.
func newPlace(tb testing.TB, settings string, files map[string]string) *place {
	tb.Helper()
	pipelinetest.Server(tb, "postgres") // skips, or in CI fails, where there is no server
	p := &place{dir: publicFolder(tb)}
	p.settle(tb, settings)
	for name, text := range files {
		p.write(tb, name, text)
	}
	return p
}

// settle writes the place's settings.
func (p *place) settle(tb testing.TB, settings string) {
	tb.Helper()
	if bin := os.Getenv("THAWLEDGER_TEST_PG"); bin != "" {
		settings += fmt.Sprintf("\nstore: {private: {binaries: %q}}\n", bin)
	}
	p.settings = p.write(tb, "settings.yaml", settings)
}

// dated writes a file as if on a day of January 2026: the order of batches is
// that of these times.
func (p *place) dated(tb testing.TB, name, text string, day int) {
	tb.Helper()
	path, at := p.write(tb, name, text), time.Date(2026, 1, day, 0, 0, 0, 0, time.UTC)
	if err := os.Chtimes(path, at, at); err != nil {
		tb.Fatal(err)
	}
}

func (p *place) write(tb testing.TB, name, text string) (path string) {
	tb.Helper()
	path = filepath.Join(p.dir, name)
	if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
		tb.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		tb.Fatal(err)
	}
	return path
}

// run runs a command with the place's settings and returns what it printed.
func (p *place) run(tb testing.TB, args ...string) string {
	tb.Helper()
	var out, log bytes.Buffer
	if status := (program{out: &out, err: &log}).main(tb.Context(), append(args, "--settings", p.settings)); status != 0 {
		tb.Fatalf("%v: status %d\n%s%s", args, status, out.String(), log.String())
	}
	return out.String()
}

func (p *place) postgresql() string { return filepath.Join(p.dir, "data", "postgresql") }

// rows asks the place's database, whose server runs for as long as that takes.
func (p *place) rows(tb testing.TB, sql string) []string {
	tb.Helper()
	var log bytes.Buffer
	quiet := program{out: &log, err: &log}
	set, err := quiet.load(p.settings)
	if err != nil {
		tb.Fatal(err)
	}
	_, done, err := quiet.reading(tb.Context(), set)
	if err != nil {
		tb.Fatalf("%v\n%s", err, log.String())
	}
	defer done()
	return pipelinetest.Rows(tb, localpg.DSN(p.postgresql(), "postgres"), sql)
}

// process is a daemon running in a process of its own.
type process struct {
	cmd   *exec.Cmd
	ended chan struct{}
	err   error // once ended
	log   string
}

// start runs a command with the place's settings in a process of its own.
func (p *place) start(t *testing.T, args ...string) *process {
	t.Helper()
	d := &process{cmd: exec.Command(os.Args[0], append(args, "--settings", p.settings)...), ended: make(chan struct{}),
		log: filepath.Join(p.dir, "log")}
	log, err := os.Create(d.log)
	if err != nil {
		t.Fatal(err)
	}
	defer log.Close()
	d.cmd.Env = append(os.Environ(), "THAWLEDGER_TEST_AS=daemon")
	d.cmd.Stdout, d.cmd.Stderr = log, log
	if err := d.cmd.Start(); err != nil {
		t.Fatal(err)
	}
	go func() {
		defer close(d.ended)
		d.err = d.cmd.Wait()
	}()
	t.Cleanup(func() {
		_ = d.cmd.Process.Kill()
		<-d.ended
	})
	return d
}

func (p *process) said() string {
	text, _ := os.ReadFile(p.log)
	return string(text)
}

// publicFolder is a temporary folder that the private server's account can
// enter; one of testing's own could not be.
func publicFolder(tb testing.TB) string {
	tb.Helper()
	dir, err := os.MkdirTemp("", "thawledger-test-")
	if err != nil {
		tb.Fatal(err)
	}
	tb.Cleanup(func() { os.RemoveAll(dir) })
	if err := os.Chmod(dir, 0o755); err != nil {
		tb.Fatal(err)
	}
	return dir
}
