package localpg

import (
	"crypto/sha256"
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
)

const (
	superuser  = "thawledger"
	port       = "5432"
	socketFile = ".s.PGSQL." + port
	// socketMax is how long the path of a Unix socket may be, in bytes (Linux:
	// sun_path has 108, one of them for the end).
	socketMax = 107
)

func clusterDir(dir string) string { return filepath.Join(dir, "cluster") }

// resolved is dir without symbolic links, as far as it exists, so that all who
// name the folder come to the same socket.
func resolved(dir string) string {
	abs, err := filepath.Abs(dir)
	if err != nil {
		return dir
	}
	if real, err := filepath.EvalSymlinks(abs); err == nil {
		return real
	}
	return abs
}

// socketDir is the folder of the socket: in dir if its path is short enough (and
// has no comma, which clients take for the end of an address), else one of a
// name made from dir under /tmp.
func socketDir(dir string) string {
	dir = resolved(dir)
	if in := filepath.Join(dir, "socket"); len(in)+1+len(socketFile) <= socketMax && !strings.Contains(in, ",") {
		return in
	}
	return fmt.Sprintf("/tmp/thawledger-%x", sha256.Sum256([]byte(dir)))[:len("/tmp/thawledger-")+16]
}

// DSN returns the address of a database on the server that runs, now or later,
// with the data folder dir (Config.Dir). The server has a database "postgres".
func DSN(dir, database string) string {
	u := url.URL{Scheme: "postgres", User: url.User(superuser), Path: "/" + database}
	// Not every client reads "+" as a space.
	u.RawQuery = strings.ReplaceAll(url.Values{"host": {socketDir(dir)}, "port": {port}}.Encode(), "+", "%20")
	return u.String()
}

// made says which PostgreSQL made a cluster, and whether TimescaleDB has been
// loaded into it: if so, it must be from then on.
type made struct {
	PostgreSQL  int  `json:"postgresql"`
	TimescaleDB bool `json:"timescaledb"`
}

func madeFile(dir string) string { return filepath.Join(dir, "made.json") }

// write replaces the file, synced.
func (m made) write(dir string) error {
	b, err := json.Marshal(m)
	if err != nil {
		return err
	}
	next := madeFile(dir) + ".new"
	f, err := os.OpenFile(next, os.O_WRONLY|os.O_CREATE|os.O_TRUNC, 0o644)
	if err != nil {
		return err
	}
	_, err = f.Write(append(b, '\n'))
	if err := errors.Join(err, f.Sync(), f.Close()); err != nil {
		return err
	}
	return os.Rename(next, madeFile(dir))
}

func syncDir(dir string) error {
	f, err := os.Open(dir)
	if err != nil {
		return err
	}
	return errors.Join(f.Sync(), f.Close())
}

// readMade returns what made the cluster in dir; nil if there is none.
func readMade(dir string) (*made, error) {
	b, err := os.ReadFile(filepath.Join(clusterDir(dir), "PG_VERSION"))
	if errors.Is(err, fs.ErrNotExist) {
		if _, err := os.Lstat(clusterDir(dir)); err == nil {
			return nil, fmt.Errorf("%s is no PostgreSQL cluster, for it has no PG_VERSION: move it away, or put back what was in it", clusterDir(dir))
		}
		return nil, nil
	}
	if err != nil {
		return nil, fmt.Errorf("read version of cluster: %w", err)
	}
	major, err := strconv.Atoi(strings.TrimSpace(string(b)))
	if err != nil {
		return nil, fmt.Errorf("%s/PG_VERSION says %q, which is no major version", clusterDir(dir), b)
	}
	const form = `{"postgresql":17,"timescaledb":true}`
	b, err = os.ReadFile(madeFile(dir))
	if err != nil {
		return nil, fmt.Errorf("read what made the cluster: %w; put the file back, in the form %s", err, form)
	}
	var m made
	if err := json.Unmarshal(b, &m); err != nil {
		return nil, fmt.Errorf("%s is not of the form %s: %w", madeFile(dir), form, err)
	}
	m.PostgreSQL = major
	return &m, nil
}

// suits says why inst can't run what is in dir; nil if it can.
func suits(dir string, inst Install) error {
	m, err := readMade(dir)
	switch {
	case err != nil || m == nil:
		return err
	case m.PostgreSQL != inst.Major:
		return fmt.Errorf("%s was made by PostgreSQL %d and can't be used by %v: name the binaries of version %d, or bring the data over with pg_dump or pg_upgrade",
			dir, m.PostgreSQL, inst, m.PostgreSQL)
	case m.TimescaleDB && !inst.Timescale:
		return fmt.Errorf("%s was made with TimescaleDB and can't be used by %v, which runs without: name binaries of PostgreSQL %d with TimescaleDB (deploy/setup gets them)",
			dir, inst, m.PostgreSQL)
	}
	return nil
}

// prepareSocketDir makes the socket's folder, or checks the one that is there.
// Under /tmp anybody could have made it.
func prepareSocketDir(path string, acc account) error {
	err := os.Mkdir(path, 0o700)
	if err != nil && !errors.Is(err, fs.ErrExist) {
		return fmt.Errorf("make socket folder: %w", err)
	}
	info, err := os.Lstat(path)
	if err != nil {
		return fmt.Errorf("look at socket folder: %w", err)
	}
	owner := int(info.Sys().(*syscall.Stat_t).Uid)
	if !info.IsDir() || (owner != acc.uid && owner != os.Geteuid()) {
		return fmt.Errorf("socket folder %s is not a folder of %s but a %v of uid %d: remove it", path, acc.name, info.Mode().Type(), owner)
	}
	if err := os.Chmod(path, 0o700); err != nil {
		return fmt.Errorf("set mode of socket folder: %w", err)
	}
	if owner != acc.uid {
		if err := os.Lchown(path, acc.uid, acc.gid); err != nil {
			return fmt.Errorf("give socket folder to %s: %w", acc.name, err)
		}
	}
	return nil
}
