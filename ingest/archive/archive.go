// Package archive keeps every delivery of every feed as it was received, so
// that what was made of it can be made again and defended years later. A file
// is named by the SHA-256 of its bytes; a small file beside it says which feed
// it came by, under which name and when, so that a lost ledger can be rebuilt.
// Nothing is ever changed or removed here.
package archive

import (
	"crypto/rand"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
)

// Archive is a folder of deliveries.
type Archive struct {
	dir string
	id  string
}

// Kept is a delivery in the archive.
type Kept struct {
	Path  string // within the archive
	Hash  string // SHA-256 of the bytes, hex
	Bytes int64
}

// Origin is what is kept beside the bytes.
type Origin struct {
	Feed       string    `json:"feed"`
	Name       string    `json:"name"`
	SourceTime time.Time `json:"source_time"`
	KeptAt     time.Time `json:"kept_at"`
}

// Open opens the archive in dir, making it if it is not there.
func Open(dir string) (*Archive, error) {
	if err := os.MkdirAll(dir, 0o750); err != nil {
		return nil, fmt.Errorf("make archive: %w", err)
	}
	a := &Archive{dir: dir}
	path := filepath.Join(dir, "identity")
	text, err := os.ReadFile(path)
	if errors.Is(err, fs.ErrNotExist) {
		host, _ := os.Hostname()
		text = []byte(host + "-" + strings.ToLower(rand.Text()[:8]))
		err = writeSynced(path, text)
	}
	if err != nil {
		return nil, fmt.Errorf("read archive identity: %w", err)
	}
	a.id = strings.TrimSpace(string(text))
	return a, nil
}

// ID names the archive in the ledger: only a process that has this archive can
// publish its batches again. Hosts that share the folder share the name.
func (a *Archive) ID() string { return a.id }

// Keep copies r into the archive. When it returns, bytes and origin are on disk.
// The same bytes of the same feed are kept once.
func (a *Archive) Keep(o Origin, r io.Reader) (k Kept, err error) {
	dir := filepath.Join(a.dir, o.Feed)
	if err := os.MkdirAll(dir, 0o750); err != nil {
		return Kept{}, fmt.Errorf("make archive folder: %w", err)
	}
	tmp, err := os.CreateTemp(dir, ".arriving-*")
	if err != nil {
		return Kept{}, fmt.Errorf("open archive file: %w", err)
	}
	defer func() {
		tmp.Close()
		os.Remove(tmp.Name()) // gone already if all went well
	}()
	sum := sha256.New()
	k.Bytes, err = io.Copy(io.MultiWriter(tmp, sum), r)
	if err != nil {
		return Kept{}, fmt.Errorf("copy to archive: %w", err)
	}
	k.Hash = hex.EncodeToString(sum.Sum(nil))
	k.Path = filepath.Join(o.Feed, k.Hash[:2], k.Hash)
	final := filepath.Join(a.dir, k.Path)
	if info, err := os.Stat(final); err == nil && info.Size() == k.Bytes {
		return k, nil
	}
	if err := os.MkdirAll(filepath.Dir(final), 0o750); err != nil {
		return Kept{}, fmt.Errorf("make archive folder: %w", err)
	}
	text, err := json.MarshalIndent(o, "", "  ")
	if err != nil {
		return Kept{}, fmt.Errorf("write origin: %w", err)
	}
	if err := tmp.Sync(); err != nil {
		return Kept{}, fmt.Errorf("sync archive file: %w", err)
	}
	if err := writeSynced(final+".json", append(text, '\n')); err != nil {
		return Kept{}, fmt.Errorf("write origin: %w", err)
	}
	if err := os.Rename(tmp.Name(), final); err != nil {
		return Kept{}, fmt.Errorf("name archive file: %w", err)
	}
	for _, d := range []string{filepath.Dir(final), dir, a.dir} {
		if err := syncFolder(d); err != nil {
			return Kept{}, fmt.Errorf("sync archive folder: %w", err)
		}
	}
	return k, nil
}

// Open opens a kept delivery for reading.
func (a *Archive) Open(path string) (*os.File, error) {
	f, err := os.Open(filepath.Join(a.dir, path))
	if err != nil {
		return nil, fmt.Errorf("open archived batch: %w", err)
	}
	return f, nil
}

// writeSynced writes a file whole or not at all.
func writeSynced(path string, text []byte) error {
	tmp, err := os.CreateTemp(filepath.Dir(path), ".writing-*")
	if err != nil {
		return err
	}
	defer os.Remove(tmp.Name())
	_, err = tmp.Write(text)
	err = errors.Join(err, tmp.Sync(), tmp.Close())
	if err != nil {
		return err
	}
	return os.Rename(tmp.Name(), path)
}

func syncFolder(path string) error {
	d, err := os.Open(path)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}
