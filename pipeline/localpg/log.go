package localpg

import (
	"errors"
	"fmt"
	"os"
	"strings"
	"sync"
)

const (
	logBytes  = 8 << 20 // of one file; there are two
	tailBytes = 2 << 10
)

// tail keeps the end of what is written to it.
type tail struct {
	mu sync.Mutex
	b  []byte
}

// Write never fails.
func (t *tail) Write(p []byte) (int, error) {
	t.mu.Lock()
	defer t.mu.Unlock()
	t.b = append(t.b, p...)
	if n := len(t.b) - tailBytes; n > 0 {
		t.b = append(t.b[:0], t.b[n:]...)
	}
	return len(p), nil
}

// String returns the end of the text.
func (t *tail) String() string {
	t.mu.Lock()
	defer t.mu.Unlock()
	return strings.TrimSpace(string(t.b))
}

// logFile is a file that starts anew when it is full; the one before is kept
// under the name path.1.
type logFile struct {
	tail
	path string
	max  int64
	file *os.File
	size int64
	err  error // the first, once writing has failed
}

func openLog(path string, max int64) (*logFile, error) {
	l := &logFile{path: path, max: max}
	return l, l.open()
}

func (l *logFile) open() error {
	f, err := os.OpenFile(l.path, os.O_WRONLY|os.O_CREATE|os.O_APPEND, 0o600)
	if err != nil {
		return fmt.Errorf("open log of the database server: %w", err)
	}
	info, err := f.Stat()
	if err != nil {
		f.Close()
		return fmt.Errorf("look at log of the database server: %w", err)
	}
	l.file, l.size = f, info.Size()
	return nil
}

// Write takes everything: a full disk must not block the server at its own
// error stream. The first failure is kept for close to report.
func (l *logFile) Write(p []byte) (int, error) {
	_, _ = l.tail.Write(p)
	if l.size > 0 && l.size+int64(len(p)) > l.max {
		l.note(l.file.Close())
		l.note(os.Rename(l.path, l.path+".1"))
		if err := l.open(); err != nil {
			l.note(err)
			l.size = 0
			return len(p), nil
		}
	}
	n, err := l.file.Write(p)
	l.size += int64(n)
	l.note(err)
	return len(p), nil
}

func (l *logFile) note(err error) {
	if l.err == nil {
		l.err = err
	}
}

func (l *logFile) close() error {
	err := l.file.Close()
	if errors.Is(err, os.ErrClosed) {
		err = nil
	}
	return errors.Join(l.err, err)
}
