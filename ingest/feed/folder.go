// Package feed finds out what has newly arrived at a feed's source. A source
// says what there is and opens it; what was read before is the ledger's
// business. A file is opened only once its name, size and time have stood still
// for the feed's settle time, and only inside its folder: a link that leads out
// of it is not followed.
package feed

import (
	"cmp"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"slices"
	"time"
)

// File is a file that lies in a folder.
type File struct {
	Name    string // with the sub-folders that it lies in, separated by /
	Bytes   int64
	Written time.Time // UTC, to the microsecond
}

// Folder is a folder that files arrive in.
type Folder struct {
	dir     string
	pattern string
	deep    bool
	settle  time.Duration
	seen    map[File]time.Time // when each file was first seen as it is now
}

// NewFolder looks at the files of dir, and if it is to go deep of its
// sub-folders, whose names, folders before them left out, match pattern
// (path.Match).
func NewFolder(dir, pattern string, deep bool, settle time.Duration) *Folder {
	return &Folder{dir: dir, pattern: pattern, deep: deep, settle: settle, seen: map[File]time.Time{}}
}

// Look lists the settled files, by the time they were written and then by name,
// and counts those that may still be being written. skip says which need no
// look: those that were read before. What could be listed is returned whatever
// the error. A file counts as settled when it was
// written at least the settle time before now, or has been seen unchanged for so
// long, which is what counts where the file server's clock is ahead.
func (f *Folder) Look(now time.Time, skip func(File) bool) (settled []File, unsettled int, err error) {
	root, err := os.OpenRoot(f.dir)
	if err != nil {
		return nil, 0, fmt.Errorf("open folder: %w", err)
	}
	defer root.Close()
	names, err := f.names(root)
	there := make(map[File]time.Time, len(f.seen))
	for _, name := range names {
		info, err := root.Stat(name)
		if err != nil || !info.Mode().IsRegular() {
			continue // gone again, a folder, or a link that leads out
		}
		file := File{Name: name, Bytes: info.Size(), Written: written(info)}
		if skip(file) {
			continue
		}
		first, ok := f.seen[file]
		if !ok {
			first = now
		}
		there[file] = first
		if now.Sub(file.Written) < f.settle && now.Sub(first) < f.settle {
			unsettled++
			continue
		}
		settled = append(settled, file)
	}
	f.seen = there
	slices.SortFunc(settled, func(a, b File) int {
		return cmp.Or(a.Written.Compare(b.Written), cmp.Compare(a.Name, b.Name))
	})
	return settled, unsettled, err
}

// names lists what the pattern matches. A folder that a link leads to is not
// entered.
func (f *Folder) names(root *os.Root) (out []string, err error) {
	var failed []error
	err = fs.WalkDir(root.FS(), ".", func(name string, e fs.DirEntry, err error) error {
		if err != nil {
			failed = append(failed, fmt.Errorf("list folder: %w", err))
			return fs.SkipDir
		}
		if name == "." {
			return nil
		}
		if ok, err := path.Match(f.pattern, e.Name()); err != nil {
			return fmt.Errorf("match %q: %w", f.pattern, err)
		} else if ok {
			out = append(out, name)
		}
		if e.IsDir() && !f.deep {
			return fs.SkipDir
		}
		return nil
	})
	return out, errors.Join(append(failed, err)...)
}

func written(info fs.FileInfo) time.Time { return info.ModTime().UTC().Truncate(time.Microsecond) }

// Open opens a file that Look has listed.
func (f *Folder) Open(file File) (*os.File, error) {
	root, err := os.OpenRoot(f.dir)
	if err != nil {
		return nil, fmt.Errorf("open folder: %w", err)
	}
	defer root.Close()
	r, err := root.Open(file.Name)
	if err != nil {
		return nil, fmt.Errorf("open file: %w", err)
	}
	return r, nil
}

// Unchanged says whether an open file is still as Look has listed it: if it is
// not, what was read of it may be a mixture and must not be used.
func (f *Folder) Unchanged(r *os.File, file File) (bool, error) {
	info, err := r.Stat()
	if err != nil {
		return false, fmt.Errorf("look at file again: %w", err)
	}
	return info.Size() == file.Bytes && written(info).Equal(file.Written), nil
}
