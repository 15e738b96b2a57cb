package ingest

import (
	"context"
	"fmt"
	"io"
	"slices"
	"time"

	"thawledger/ingest/archive"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// Delivery is one file that is handed over rather than found in a folder.
type Delivery struct {
	Feed       string
	Name       string    // of the file
	SourceTime time.Time // when its source wrote it; it fixes its order among the feed's files
	Body       io.Reader
}

// Receipt is what became of a delivery.
type Receipt struct {
	Batch  int64 // 0 where the same bytes came before
	Known  bool  // the same bytes came before, and count
	Ledger store.LedgerLine
}

// Deliver archives a delivery, opens its line of the ledger and reads it to its
// end: when it returns, its readings are on their way and will not be lost. The
// same bytes again change nothing.
func (s *Service) Deliver(ctx context.Context, d Delivery) (Receipt, error) {
	i := slices.IndexFunc(s.Feeds, func(f pipeline.Feed) bool { return f.Name == d.Feed })
	if i < 0 {
		return Receipt{}, fmt.Errorf("there is no feed %q", d.Feed)
	}
	s.reading.Lock()
	defer s.reading.Unlock()
	b, seen, err := Enter(ctx, s.DB, s.Archive, &s.Feeds[i], d, s.Now)
	if err != nil {
		return Receipt{}, err
	}
	if b == nil {
		return Receipt{Known: true}, nil
	}
	if seen == store.SeenNew {
		if err := s.read(ctx, b); err != nil {
			return Receipt{}, err
		}
	}
	line, err := s.DB.LedgerOf(ctx, b.ID)
	return Receipt{Batch: b.ID, Ledger: line}, err
}

// Enter archives a delivery and opens its line of the ledger, for an ingest
// worker with the same archive to read. It returns no batch where the same bytes
// came before and count.
func Enter(ctx context.Context, db *store.DB, kept *archive.Archive, f *pipeline.Feed, d Delivery, now func() time.Time) (*store.Batch, store.Seen, error) {
	at := d.SourceTime.UTC().Truncate(time.Microsecond)
	k, err := kept.Keep(archive.Origin{Feed: f.Name, Name: d.Name, SourceTime: at, KeptAt: now().UTC()}, d.Body)
	if err != nil {
		return nil, 0, err
	}
	b, seen, err := db.OpenBatch(ctx, store.Arrival{
		Feed: f.Name, Name: d.Name, Hash: k.Hash, Bytes: k.Bytes, SourceTime: earlier(at, now()), SeenTime: at, ArrivedAt: now().UTC(),
		Host: kept.ID(), ArchivePath: k.Path, Layout: &f.Layout, ReplacesSpan: f.ReplacesSpan,
	})
	if err != nil || seen == store.SeenSame {
		return nil, seen, err
	}
	return b, seen, nil
}
