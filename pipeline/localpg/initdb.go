package localpg

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"syscall"

	"go.uber.org/zap"
)

// cluster makes the cluster unless it is there. It grows in a folder of another
// name, so that a kill on the way leaves nothing that looks like one.
func (c Config) cluster(ctx context.Context, acc account) error {
	leftovers, _ := filepath.Glob(filepath.Join(c.Dir, "cluster.new-*"))
	for _, path := range leftovers {
		if err := os.RemoveAll(path); err != nil {
			c.Log.Warn("unfinished database folder stays", zap.Error(err))
		}
	}
	if err := suits(c.Dir, c.Install); err != nil {
		return err
	}
	m, err := readMade(c.Dir)
	if err != nil {
		return err
	}
	now := made{PostgreSQL: c.Install.Major, TimescaleDB: c.Install.Timescale}
	if m != nil {
		if *m == now {
			return nil
		}
		// From plain to TimescaleDB: from here on there is no way back.
		if err := now.write(c.Dir); err != nil {
			return fmt.Errorf("record what runs the cluster: %w", err)
		}
		return nil
	}

	c.Log.Info("making a database", zap.Stringer("install", c.Install), zap.String("folder", c.Dir), zap.String("account", acc.name))
	next, err := os.MkdirTemp(c.Dir, "cluster.new-") // mode 0700
	if err != nil {
		return fmt.Errorf("make database folder: %w", err)
	}
	defer os.RemoveAll(next) //nolint:errcheck // gone if all went well; else the next start tries again
	if acc.drop {
		if err := os.Lchown(next, acc.uid, acc.gid); err != nil {
			return fmt.Errorf("give database folder to %s: %w", acc.name, err)
		}
	}
	if err := c.initdb(ctx, acc, next); err != nil {
		return err
	}
	if err := now.write(c.Dir); err != nil {
		return fmt.Errorf("record what made the cluster: %w", err)
	}
	if err := os.Rename(next, clusterDir(c.Dir)); err != nil {
		return fmt.Errorf("put database folder in place: %w", err)
	}
	if err := syncDir(c.Dir); err != nil {
		return fmt.Errorf("sync database folder: %w", err)
	}
	return nil
}

func (c Config) initdb(ctx context.Context, acc account, into string) error {
	args := []string{
		"-D", into, "-U", superuser, "--encoding=UTF8", "--locale=C",
		"--auth-local=trust", "--auth-host=reject", "--no-instructions",
	}
	if c.Durable {
		args = append(args, "--data-checksums")
	} else {
		args = append(args, "--no-sync")
	}
	runtime.LockOSThread()
	defer runtime.UnlockOSThread()
	cmd := acc.command(syscall.SIGKILL, filepath.Join(c.Install.BinDir, "initdb"), args...)
	var out tail
	cmd.Stdout, cmd.Stderr = &out, &out
	if err := cmd.Start(); err != nil {
		return fmt.Errorf("run initdb as %s: %w", acc.name, err)
	}
	// Interrupted, initdb takes its own children along.
	stop := context.AfterFunc(ctx, func() { _ = cmd.Process.Signal(os.Interrupt) })
	defer stop()
	err := cmd.Wait()
	if ctx.Err() != nil {
		return fmt.Errorf("run initdb: %w", ctx.Err())
	}
	if err != nil {
		return fmt.Errorf("run initdb as %s: %w; it said: %s", acc.name, err, out.String())
	}
	return nil
}
