package localpg

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"os/user"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
)

// account is who the server runs as.
type account struct {
	uid, gid int
	name     string
	drop     bool // this process is root and the server is not
}

// accounts that a server started by root may run as, in order of preference.
var accounts = []string{"postgres", "thawledger", "nobody"}

// accountFor returns the account of the server in dir: this process's own, but
// for root the owner of the cluster that is there or the first of accounts that
// the system has.
func accountFor(dir string) (account, error) {
	self := os.Geteuid()
	owner := account{uid: -1}
	if info, err := os.Lstat(clusterDir(dir)); err == nil {
		st := info.Sys().(*syscall.Stat_t)
		owner = account{uid: int(st.Uid), gid: int(st.Gid), name: nameOf(int(st.Uid)), drop: true}
	}
	if self != 0 {
		if owner.uid >= 0 && owner.uid != self {
			return account{}, fmt.Errorf("%s belongs to %s, but this process runs as %s: run it as the former, or as root", clusterDir(dir), owner.name, nameOf(self))
		}
		return account{uid: self, gid: os.Getegid(), name: nameOf(self)}, nil
	}
	if owner.uid > 0 {
		return owner, nil
	}
	for _, name := range accounts {
		u, err := user.Lookup(name)
		if err != nil {
			continue
		}
		uid, err1 := strconv.Atoi(u.Uid)
		gid, err2 := strconv.Atoi(u.Gid)
		if err1 == nil && err2 == nil && uid != 0 {
			return account{uid: uid, gid: gid, name: name, drop: true}, nil
		}
	}
	return account{}, fmt.Errorf("PostgreSQL refuses to run as root, and the system has none of the accounts %s: run deploy/setup, or make one", strings.Join(accounts, ", "))
}

func nameOf(uid int) string {
	if u, err := user.LookupId(strconv.Itoa(uid)); err == nil {
		return u.Username
	}
	return "uid " + strconv.Itoa(uid)
}

// command is a program run as the account. It is killed with sig when the
// thread that started it ends, so the caller locks its goroutine to one.
func (a account) command(sig syscall.Signal, name string, args ...string) *exec.Cmd {
	cmd := exec.Command(name, args...)
	cmd.Dir = "/"
	// A process group of its own: an interrupt from the terminal is for the
	// daemon, which stops the server last.
	cmd.SysProcAttr = &syscall.SysProcAttr{Pdeathsig: sig, Setpgid: true}
	if a.drop {
		cmd.SysProcAttr.Credential = &syscall.Credential{Uid: uint32(a.uid), Gid: uint32(a.gid)}
	}
	// Messages in English, times in UTC, and none of the PG... variables.
	cmd.Env = []string{"LC_ALL=C", "TZ=UTC"}
	for _, name := range []string{"PATH", "LD_LIBRARY_PATH", "TMPDIR"} {
		if v, ok := os.LookupEnv(name); ok {
			cmd.Env = append(cmd.Env, name+"="+v)
		}
	}
	return cmd
}

// reaches says which folder on the way to dir the account may not enter.
func (a account) reaches(dir string) error {
	if !a.drop || a.enters(dir) == nil {
		return nil
	}
	way := dir
	for parent := filepath.Dir(way); a.enters(parent) != nil; parent = filepath.Dir(way) {
		way = parent
		if way == "/" {
			break
		}
	}
	err := a.enters(way)
	if !errors.Is(err, fs.ErrPermission) || way == "/" {
		return fmt.Errorf("run a program as %s: %w", a.name, err)
	}
	what := "its mode is unknown"
	if info, err := os.Stat(way); err == nil {
		what = fmt.Sprintf("mode %04o, owner %s", info.Mode().Perm(), nameOf(int(info.Sys().(*syscall.Stat_t).Uid)))
	}
	return fmt.Errorf("the database server runs as %s, which may not enter %s (%s) and so can't reach %s: chmod o+x %s, or choose another folder",
		a.name, way, what, dir, way)
}

// enters tries it, since modes do not tell all (access lists, containers).
func (a account) enters(dir string) error {
	program, err := exec.LookPath("true")
	if err != nil {
		return err
	}
	cmd := a.command(0, program)
	cmd.Dir = dir
	return cmd.Run()
}
