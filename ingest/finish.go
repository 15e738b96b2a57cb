package ingest

import (
	"context"
	"errors"
	"io/fs"
	"time"

	"go.uber.org/zap"

	"thawledger/pipeline/store"
)

// readFailures is how often reading an open batch may fail before it is held back.
const readFailures = 3

// finish brings to their end batches that were begun: those not read to the end,
// those with parts that the bus never confirmed, and those with parts that it
// confirmed and lost.
func (s *Service) finish(ctx context.Context) {
	s.reading.Lock()
	defer s.reading.Unlock()
	if err := errors.Join(s.finishOpen(ctx), s.finishUnpublished(ctx), s.republishLost(ctx)); err != nil && ctx.Err() == nil {
		s.Log.Error("batches not finished, to be tried again", zap.Error(err))
	}
}

// reopenHeld has batches that were held back under another layout read by the
// present one.
func (s *Service) reopenHeld(ctx context.Context) {
	for i := range s.Feeds {
		f := &s.Feeds[i]
		n, err := s.DB.ReopenHeld(ctx, s.Archive.ID(), f.Name, &f.Layout)
		switch {
		case err != nil && ctx.Err() == nil:
			s.Log.Error("batches held back not opened again", zap.String("feed", f.Name), zap.Error(err))
		case n > 0:
			s.Log.Info("batches held back under another layout are read again", zap.String("feed", f.Name), zap.Int("batches", n))
		}
	}
}

func (s *Service) finishOpen(ctx context.Context) error {
	batches, err := s.DB.OpenBatches(ctx, s.Archive.ID())
	if err != nil {
		return err
	}
	var failed []error
	for i := range batches {
		b := &batches[i]
		err := s.read(ctx, b)
		if err == nil || ctx.Err() != nil {
			continue
		}
		failed = append(failed, err)
		// Bytes that are not there may be on a disk that will be: they are waited for.
		if s.failed[b.ID]++; s.failed[b.ID] >= readFailures && !store.Temporary(err) && !errors.Is(err, fs.ErrNotExist) {
			counts, _, _, _ := s.firstPass(ctx, b)
			failed = append(failed, s.DB.HoldBatch(ctx, b.ID, "could not be read: "+err.Error(), counts))
		}
	}
	return errors.Join(failed...)
}

func (s *Service) finishUnpublished(ctx context.Context) error {
	batches, err := s.DB.UnpublishedBatches(ctx, s.Archive.ID())
	if err != nil {
		return err
	}
	return s.publishAgain(ctx, batches, store.Unconfirmed)
}

// republishLost publishes again what the bus confirmed and nobody has committed,
// once the bus is empty: then it cannot be on its way any more. The ledger is
// asked before the bus, and NextAttempt looks at the ledger once more after it.
func (s *Service) republishLost(ctx context.Context) error {
	batches, err := s.DB.OverdueBatches(ctx, s.Archive.ID(), s.RepublishAfter)
	if err != nil || len(batches) == 0 {
		return err
	}
	waiting, err := s.Bus.Waiting(ctx)
	if err != nil || waiting > 0 {
		return err
	}
	return s.publishAgain(ctx, batches, s.RepublishAfter)
}

// publishAgain publishes the open parts of batches that the bus never confirmed,
// or confirmed at least age ago.
func (s *Service) publishAgain(ctx context.Context, batches []store.Batch, age time.Duration) error {
	var failed []error
	for i := range batches {
		if ctx.Err() != nil {
			break
		}
		b := &batches[i]
		attempts, err := s.DB.NextAttempt(ctx, b.ID, age, s.RepublishAllowed)
		if err != nil {
			failed = append(failed, err)
			continue
		}
		if len(attempts) == 0 {
			continue
		}
		s.Log.Warn("parts published again from the archive", zap.Int64("batch", b.ID), zap.String("file", b.Name), zap.Int("parts", len(attempts)))
		failed = append(failed, s.publish(ctx, b, attempts))
	}
	return errors.Join(failed...)
}
