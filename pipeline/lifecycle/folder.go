package lifecycle

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"syscall"
)

// ErrFolderInUse says that another process has the data folder.
var ErrFolderInUse = errors.New("another thawledger process is using the folder")

// LockFolder makes the data folder if need be and locks it for this process
// until release is called or the process ends, however it ends.
func LockFolder(dir string) (release func(), err error) {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return nil, fmt.Errorf("make data folder: %w", err)
	}
	path := filepath.Join(dir, "lock")
	f, err := os.OpenFile(path, os.O_CREATE|os.O_RDWR, 0o600)
	if err != nil {
		return nil, fmt.Errorf("open lock: %w", err)
	}
	if err := syscall.Flock(int(f.Fd()), syscall.LOCK_EX|syscall.LOCK_NB); err != nil {
		f.Close()
		if errors.Is(err, syscall.EWOULDBLOCK) {
			return nil, fmt.Errorf("%w: %s", ErrFolderInUse, dir)
		}
		return nil, fmt.Errorf("lock %s: %w", path, err)
	}
	return func() {
		// Closing alone would leave the lock to a process that is being started at
		// this moment and still has all open files.
		syscall.Flock(int(f.Fd()), syscall.LOCK_UN) //nolint:errcheck // closing follows
		f.Close()
	}, nil
}
