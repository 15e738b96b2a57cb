package localpg

import (
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"strconv"
	"strings"
	"sync/atomic"
	"syscall"
	"time"

	"go.uber.org/zap"
)

// Config says what to run where.
type Config struct {
	// Dir is the server's folder, made if it is not there; its parents must be.
	// The caller has it locked.
	Dir     string
	Install Install
	// Durable has the server sync what it commits. Off, a power failure may
	// ruin the whole database: for tests.
	Durable bool
	// BackgroundWorkers is how many TimescaleDB may have. With 0 its policies
	// do not run.
	BackgroundWorkers int
	Log               *zap.Logger
}

// Server is a running server.
type Server struct {
	dir    string
	cmd    *exec.Cmd
	log    *logFile
	asked  atomic.Bool   // to stop
	done   chan struct{} // closed at the end; err is set before
	err    error
	exited chan error
}

// retryFor is how long a start that a dying server stands in the way of is
// tried again.
const retryFor = 15 * time.Second

// Start makes the cluster if there is none, starts the server and waits until
// it answers. ctx limits the starting only, which may take long where there is
// much to recover. The server ends with Stop, or with this process.
func Start(ctx context.Context, c Config) (*Server, error) {
	s, err := c.start(ctx)
	if err != nil {
		return nil, fmt.Errorf("start private PostgreSQL: %w", err)
	}
	return s, nil
}

func (c Config) start(ctx context.Context) (*Server, error) {
	if c.Dir == "" || c.Install.BinDir == "" || c.Log == nil {
		return nil, errors.New("folder, install and log are needed")
	}
	if err := os.Mkdir(c.Dir, 0o700); err != nil && !errors.Is(err, os.ErrExist) {
		return nil, fmt.Errorf("make folder: %w", err)
	}
	c.Dir = resolved(c.Dir)
	acc, err := accountFor(c.Dir)
	if err != nil {
		return nil, err
	}
	mode := os.FileMode(0o700)
	if acc.drop {
		mode = 0o711 // passed through, not read
	}
	if err := os.Chmod(c.Dir, mode); err != nil {
		return nil, fmt.Errorf("set mode of folder: %w", err)
	}
	for _, dir := range []string{c.Dir, c.Install.BinDir} {
		if err := acc.reaches(dir); err != nil {
			return nil, err
		}
	}
	if acc.name == "nobody" {
		c.Log.Warn("the database server runs as nobody: other services that do can reach its data; run deploy/setup to make an account")
	}
	if err := c.cluster(ctx, acc); err != nil {
		return nil, err
	}
	if err := prepareSocketDir(socketDir(c.Dir), acc); err != nil {
		return nil, err
	}
	patience := time.NewTimer(retryFor)
	defer patience.Stop()
	for {
		if err := c.clearLeftovers(ctx); err != nil {
			return nil, err
		}
		s, err := c.launch(acc, syscall.SIGINT)
		if err != nil {
			return nil, err
		}
		err = s.awaitReady(ctx, c.Log)
		if err == nil {
			c.Log.Info("database server ready", zap.Stringer("install", c.Install), zap.Int("pid", s.Pid()), zap.String("account", acc.name))
			return s, nil
		}
		if !inTheWay(s.log.String()) {
			return nil, err
		}
		select {
		case <-ctx.Done():
			return nil, err
		case <-patience.C:
			return nil, err
		case <-time.After(200 * time.Millisecond):
			c.Log.Warn("database server refused to start beside an earlier one; trying again", zap.Error(err))
		}
	}
}

// inTheWay says whether a server gave up because another has not quite gone.
func inTheWay(said string) bool {
	return strings.Contains(said, "pre-existing shared memory block") ||
		(strings.Contains(said, "lock file") && strings.Contains(said, "already exists"))
}

func (c Config) args() []string {
	set := []string{
		// A list, so quoted.
		"unix_socket_directories=" + `"` + strings.ReplaceAll(socketDir(c.Dir), `"`, `""`) + `"`,
		"unix_socket_permissions=0700",
		"port=" + port,
		"listen_addresses=",
		"cluster_name=thawledger",
		"wal_level=minimal",
		"max_wal_senders=0",
		"max_wal_size=2GB",
		"shared_buffers=256MB",
		"max_locks_per_transaction=256",
		"max_worker_processes=" + strconv.Itoa(8+c.BackgroundWorkers),
		"jit=off",
		"timezone=UTC",
		"log_timezone=UTC",
		"log_destination=stderr",
		"logging_collector=off",
	}
	if c.Durable {
		set = append(set, "fsync=on", "full_page_writes=on", "synchronous_commit=on")
	} else {
		set = append(set, "fsync=off", "full_page_writes=off")
	}
	if c.Install.Timescale {
		set = append(set, "shared_preload_libraries=timescaledb", "timescaledb.telemetry_level=off",
			"timescaledb.max_background_workers="+strconv.Itoa(c.BackgroundWorkers))
	}
	args := []string{"-D", clusterDir(c.Dir)}
	for _, s := range set {
		args = append(args, "-c", s)
	}
	return args
}

// launch starts the process, to be sent sig should this process die.
func (c Config) launch(acc account, sig syscall.Signal) (*Server, error) {
	log, err := openLog(filepath.Join(c.Dir, "server.log"), logBytes)
	if err != nil {
		return nil, err
	}
	from, to, err := os.Pipe()
	if err != nil {
		return nil, errors.Join(err, log.close())
	}
	cmd := acc.command(sig, filepath.Join(c.Install.BinDir, "postgres"), c.args()...)
	cmd.Stdout, cmd.Stderr = to, to
	s := &Server{dir: c.Dir, cmd: cmd, log: log, done: make(chan struct{}), exited: make(chan error, 1)}
	started := make(chan error)
	go func() {
		// The signal at this process's death is really one at the death of the
		// thread that started the child: so that thread stays.
		runtime.LockOSThread()
		defer runtime.UnlockOSThread()
		err := cmd.Start()
		to.Close()
		started <- err
		if err == nil {
			s.attend(from)
		}
	}()
	if err := <-started; err != nil {
		return nil, errors.Join(fmt.Errorf("run postgres as %s: %w", acc.name, err), from.Close(), log.close())
	}
	return s, nil
}

// attend writes down what the server says until it ends.
func (s *Server) attend(from *os.File) {
	copied := make(chan struct{})
	go func() {
		defer close(copied)
		_, _ = io.Copy(s.log, from)
	}()
	err := s.cmd.Wait()
	// Processes of a killed server hold the pipe a little longer.
	_ = from.SetReadDeadline(time.Now().Add(2 * time.Second))
	<-copied
	from.Close()
	if lost := s.log.close(); lost != nil {
		err = errors.Join(err, fmt.Errorf("write its log: %w", lost))
	}
	if socket := socketDir(s.dir); filepath.Dir(socket) != s.dir {
		_ = os.Remove(socket) // under /tmp; after a crash it is not empty and stays
	}
	s.err = err
	if !s.asked.Load() {
		if err == nil {
			err = errors.New("it was told to stop by somebody else")
		}
		s.exited <- fmt.Errorf("database server ended: %w; it last said: %s", err, s.log.String())
	}
	close(s.exited)
	close(s.done)
}

// awaitReady waits until the server says in its postmaster.pid (line 8, as
// pg_ctl reads it) that it is ready and its socket can be reached. If not, the
// server is gone when it returns.
func (s *Server) awaitReady(ctx context.Context, log *zap.Logger) error {
	slow := time.NewTimer(10 * time.Second)
	defer slow.Stop()
	tick := time.NewTicker(20 * time.Millisecond)
	defer tick.Stop()
	for {
		if s.ready() {
			conn, err := new(net.Dialer).DialContext(ctx, "unix", filepath.Join(socketDir(s.dir), socketFile))
			if err == nil {
				conn.Close()
				return nil
			}
			if !errors.Is(err, syscall.EAGAIN) {
				return errors.Join(fmt.Errorf("reach database server: %w", err), s.Stop(ctx))
			}
		}
		select {
		case err := <-s.exited:
			<-s.done
			return err
		case <-ctx.Done():
			err := fmt.Errorf("wait for database server: %w; it last said: %s", ctx.Err(), s.log.String())
			return errors.Join(err, s.Stop(ctx))
		case <-slow.C:
			log.Info("the database server is still starting; after a crash it has to recover", zap.String("last_said", s.log.String()))
		case <-tick.C:
		}
	}
}

func (s *Server) ready() bool {
	b, err := os.ReadFile(filepath.Join(clusterDir(s.dir), "postmaster.pid"))
	if err != nil {
		return false
	}
	lines := strings.Split(string(b), "\n")
	return len(lines) >= 8 && lines[0] == strconv.Itoa(s.Pid()) && strings.TrimSpace(lines[7]) == "ready"
}

// DSN returns the address of a database of this server; see the function DSN.
func (s *Server) DSN(database string) string { return DSN(s.dir, database) }

// Pid returns the process number of the server.
func (s *Server) Pid() int { return s.cmd.Process.Pid }

// Exited gives one error, for one listener, if the server ends without Stop.
// It is closed when the server has ended, however it did.
func (s *Server) Exited() <-chan error { return s.exited }

// Stop ends open sessions and shuts the server down. When ctx ends, the server
// is stopped at once and recovers at its next start; that is an error, though
// nothing committed is lost. Stop may be called more than once, and of a server
// that has ended.
func (s *Server) Stop(ctx context.Context) error {
	select {
	case <-s.done: // told by Exited, or by the Stop before
		return nil
	default:
	}
	s.asked.Store(true)
	_ = s.cmd.Process.Signal(syscall.SIGINT)
	select {
	case <-s.done:
		if s.err != nil {
			return fmt.Errorf("stop database server: %w; it last said: %s", s.err, s.log.String())
		}
		return nil
	case <-ctx.Done():
	}
	_ = s.cmd.Process.Signal(syscall.SIGQUIT)
	select {
	case <-s.done:
	case <-time.After(immediateEnd):
		_ = s.cmd.Process.Kill()
		<-s.done
	}
	return fmt.Errorf("stop database server: %w; it was stopped at once and will recover at its next start", ctx.Err())
}
