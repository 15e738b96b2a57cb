package ingest

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"hash"
	"io"
	"os"
	"time"

	"go.uber.org/zap"

	"thawledger/ingest/archive"
	"thawledger/ingest/feed"
	"thawledger/ingest/unpack"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// arrival archives a file, opens its line of the ledger and reads it. It does
// nothing, and says so, if the file changed under its hands.
func (s *Service) arrival(ctx context.Context, f *pipeline.Feed, folder *feed.Folder, file feed.File, last store.FileSeen) (changed bool, err error) {
	r, err := folder.Open(file)
	if err != nil {
		return false, err
	}
	defer r.Close()
	if f.Grows && !unpack.Compressed(r) { // what is compressed is read whole
		return s.growth(ctx, f, r, file, last)
	}
	kept, err := s.keep(f, file, r)
	if err != nil {
		return false, err
	}
	same, err := folder.Unchanged(r, file)
	if err != nil {
		return false, err
	}
	if !same || kept.Bytes != file.Bytes {
		s.Log.Info("file changed while it was read, to be taken later", zap.String("feed", f.Name), zap.String("file", file.Name))
		return true, nil
	}
	return false, s.enter(ctx, f, s.arrived(f, file, kept))
}

func (s *Service) keep(f *pipeline.Feed, file feed.File, r io.Reader) (archive.Kept, error) {
	return s.Archive.Keep(archive.Origin{Feed: f.Name, Name: file.Name, SourceTime: file.Written, KeptAt: s.Now().UTC()}, r)
}

func (s *Service) arrived(f *pipeline.Feed, file feed.File, kept archive.Kept) store.Arrival {
	return store.Arrival{
		Feed: f.Name, Name: file.Name, Hash: kept.Hash, Bytes: kept.Bytes, FileBytes: file.Bytes, SourceTime: earlier(file.Written, s.Now()),
		SeenTime: file.Written, ArrivedAt: s.Now().UTC(), Host: s.Archive.ID(), ArchivePath: kept.Path, Layout: &f.Layout,
		ReplacesSpan: f.ReplacesSpan,
	}
}

// enter opens the arrival's line of the ledger and reads it, if there is
// anything to be read.
func (s *Service) enter(ctx context.Context, f *pipeline.Feed, a store.Arrival) error {
	b, seen, err := s.DB.OpenBatch(ctx, a)
	if err != nil {
		return err
	}
	log := s.Log.With(zap.String("feed", f.Name), zap.String("file", a.Name))
	switch seen {
	case store.SeenSame:
		log.Info("file holds bytes that are known already", zap.String("sha256", a.Hash))
		return nil
	case store.SeenWaiting:
		log.Warn("file has returned to earlier bytes; its batch waits to be asked for", zap.String("sha256", a.Hash))
		return nil
	}
	return s.read(ctx, b)
}

// unendedAfter is how long a growing file must have stood still before a last
// line without an end is taken as whole.
const unendedAfter = 24 * time.Hour

func (s *Service) stoodStill(file feed.File) bool { return s.Now().Sub(file.Written) >= unendedAfter }

// growth takes what a growing file has grown by: from the position that was
// reached to the last line end. Where the bytes before are no longer what they
// were, or nothing of them could be read, it is a file that begins anew.
func (s *Service) growth(ctx context.Context, f *pipeline.Feed, r *os.File, file feed.File, last store.FileSeen) (changed bool, err error) {
	sum, from, err := s.grownFrom(f, r, file, last)
	if err != nil {
		return false, err
	}
	end := file.Bytes
	if !s.stoodStill(file) {
		if end, err = lastLineEnd(r, from.FromByte, file.Bytes); err != nil {
			return false, err
		}
	}
	if end == from.FromByte {
		return false, s.DB.SawFile(ctx, f.Name, s.Archive.ID(), file.Name, file.Bytes, file.Written)
	}
	added := io.NewSectionReader(r, from.FromByte, end-from.FromByte)
	count := &lineCount{}
	kept, err := s.keep(f, file, io.TeeReader(added, io.MultiWriter(sum, count)))
	if err != nil {
		return false, err
	}
	if kept.Bytes != end-from.FromByte {
		s.Log.Info("file became shorter while it was read, to be taken later", zap.String("feed", f.Name), zap.String("file", file.Name))
		return true, nil
	}
	a := s.arrived(f, file, kept)
	from.Lines = from.LinesBefore + count.lines
	a.Hash, a.Growth = hex.EncodeToString(sum.Sum(nil)), &from
	return false, s.enter(ctx, f, a)
}

// grownFrom says where what is new in a growing file begins, and returns the
// hash of what is before that.
func (s *Service) grownFrom(f *pipeline.Feed, r *os.File, file feed.File, last store.FileSeen) (hash.Hash, store.Growth, error) {
	if last.PositionHash == "" || last.Head == 0 {
		return sha256.New(), store.Growth{}, nil
	}
	if file.Bytes >= last.Position {
		sum := sha256.New()
		if _, err := io.Copy(sum, io.NewSectionReader(r, 0, last.Position)); err != nil {
			return nil, store.Growth{}, fmt.Errorf("read what was read before: %w", err)
		}
		if hex.EncodeToString(sum.Sum(nil)) == last.PositionHash {
			return sum, store.Growth{FromByte: last.Position, LinesBefore: last.Lines, Head: last.Head}, nil
		}
	}
	s.Log.Warn("file is not what it was and longer; it is read from its beginning", zap.String("feed", f.Name), zap.String("file", file.Name),
		zap.Int64("bytes", file.Bytes), zap.Int64("bytes_read_before", last.Position))
	return sha256.New(), store.Growth{}, nil
}

// lastLineEnd returns the byte after the last LF in [from, end); from if there is none.
func lastLineEnd(r io.ReaderAt, from, end int64) (int64, error) {
	buf := make([]byte, 64<<10)
	for end > from {
		begin := max(from, end-int64(len(buf)))
		n, err := r.ReadAt(buf[:end-begin], begin)
		if err != nil && err != io.EOF {
			return 0, fmt.Errorf("look for the last line end: %w", err)
		}
		for i := n - 1; i >= 0; i-- {
			if buf[i] == '\n' {
				return begin + int64(i) + 1, nil
			}
		}
		end = begin
	}
	return from, nil
}

// lineCount counts line ends.
type lineCount struct{ lines int64 }

func (c *lineCount) Write(p []byte) (int, error) {
	for _, b := range p {
		if b == '\n' {
			c.lines++
		}
	}
	return len(p), nil
}
