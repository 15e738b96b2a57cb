package localpg

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"

	"go.uber.org/goleak"
	"go.uber.org/zap"
	"go.uber.org/zap/zaptest"
)

// The test program run with this variable is the owner of a server, to be
// killed: it starts one in the folder named, says its pid, and waits.
const (
	ownerDir    = "LOCALPG_TEST_OWNER_DIR"
	ownerSignal = "LOCALPG_TEST_OWNER_SIGNAL" // for the server at the owner's death
)

func TestMain(m *testing.M) {
	if dir := os.Getenv(ownerDir); dir != "" {
		if err := own(dir); err != nil {
			fmt.Println(err)
			os.Exit(1)
		}
		return
	}
	goleak.VerifyTestMain(m)
}

func own(dir string) error {
	found, err := Find(nil)
	if err != nil {
		return err
	}
	signal, err := strconv.Atoi(os.Getenv(ownerSignal))
	if err != nil {
		return err
	}
	// The cluster is there already, so this is all of Start that is needed.
	c := Config{Dir: resolved(dir), Install: found[0], Log: zap.NewNop()}
	acc, err := accountFor(c.Dir)
	if err != nil {
		return err
	}
	s, err := c.launch(acc, syscall.Signal(signal))
	if err != nil {
		return err
	}
	if err := s.awaitReady(context.Background(), c.Log); err != nil {
		return err
	}
	fmt.Println(s.Pid())
	select {}
}

// startOwner starts such a process and returns it with its server's pid.
func startOwner(t *testing.T, dir string, signal syscall.Signal) (owner *exec.Cmd, pid int) {
	t.Helper()
	owner = exec.Command(os.Args[0])
	owner.Env = append(os.Environ(), ownerDir+"="+dir, fmt.Sprintf("%s=%d", ownerSignal, signal))
	out, err := owner.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := owner.Start(); err != nil {
		t.Fatal(err)
	}
	line, _ := bufio.NewReader(out).ReadString('\n')
	pid, err = strconv.Atoi(strings.TrimSpace(line))
	if err != nil {
		_ = owner.Process.Kill()
		t.Fatalf("owner said %q", line)
	}
	t.Cleanup(func() { _ = syscall.Kill(pid, syscall.SIGQUIT) })
	return owner, pid
}

func killOwner(t *testing.T, owner *exec.Cmd) {
	t.Helper()
	if err := owner.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	_ = owner.Wait()
}

// install returns the best install there is.
func install(t *testing.T) Install {
	t.Helper()
	found, err := Find(nil)
	if err != nil {
		if os.Getenv("CI") != "" {
			t.Fatal(err)
		}
		t.Skipf("SKIPPED, NOT TESTED: %v", err)
	}
	return found[0]
}

// folder returns a folder that every account may enter, which t.TempDir is not.
func folder(t *testing.T) string {
	t.Helper()
	dir, err := os.MkdirTemp("", "localpg-test-")
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		if err := os.RemoveAll(dir); err != nil {
			t.Error(err)
		}
	})
	if err := os.Chmod(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	return dir
}

func config(t *testing.T, inst Install) Config {
	t.Helper()
	return Config{Dir: filepath.Join(folder(t), "pg"), Install: inst, Log: zaptest.NewLogger(t, zaptest.Level(zap.WarnLevel))}
}

func start(t *testing.T, c Config) *Server {
	t.Helper()
	s, err := Start(t.Context(), c)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { _ = s.Stop(context.Background()) })
	return s
}

func stop(t *testing.T, s *Server) {
	t.Helper()
	if err := s.Stop(t.Context()); err != nil {
		t.Fatal(err)
	}
}

// ask runs one statement with psql and returns what it prints.
func ask(t *testing.T, c Config, sql string) string {
	t.Helper()
	out, err := psql(c, sql).CombinedOutput()
	if err != nil {
		t.Fatalf("%s: %v: %s", sql, err, out)
	}
	return strings.TrimSpace(string(out))
}

func psql(c Config, sql string) *exec.Cmd {
	return exec.Command(filepath.Join(c.Install.BinDir, "psql"), "-XqAt", "-c", sql, DSN(c.Dir, "postgres"))
}

// gone says whether a process has ended, waited for or not.
func gone(pid int) bool {
	b, err := os.ReadFile(fmt.Sprintf("/proc/%d/stat", pid))
	return errors.Is(err, os.ErrNotExist) || strings.Contains(string(b), ") Z ")
}

func await(t *testing.T, what string, is func() bool) {
	t.Helper()
	late := time.After(30 * time.Second)
	tick := time.NewTicker(10 * time.Millisecond)
	defer tick.Stop()
	for !is() {
		select {
		case <-late:
			t.Fatalf("not in time: %s", what)
		case <-tick.C:
		}
	}
}
