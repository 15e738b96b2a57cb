package ingest

import (
	"context"
	"errors"
	"fmt"
	"io"

	"go.uber.org/zap"

	"thawledger/ingest/csvfeed"
	"thawledger/ingest/unpack"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// setAsideChunk is how many set-aside rows are written at a time.
const setAsideChunk = 1000

// flushParts is how many parts are published between two entries in the ledger.
const flushParts = 200

// read brings an open batch from the archive to the bus. A batch that is not
// readable as a whole is held back, which is no error.
func (s *Service) read(ctx context.Context, b *store.Batch) error {
	log := s.Log.With(zap.String("feed", b.Feed), zap.String("file", b.Name), zap.Int64("batch", b.ID))
	counts, lines, doubt, err := s.firstPass(ctx, b)
	if err == nil && doubt != "" {
		err = &csvfeed.HoldError{Text: doubt + fmt.Sprintf("; if it is right as it is: thawledger feed take %d", b.ID)}
	}
	if hold, ok := errors.AsType[*csvfeed.HoldError](err); ok {
		log.Error("batch held back, nothing of it is used", zap.Error(hold))
		return s.DB.HoldBatch(ctx, b.ID, hold.Error(), counts)
	}
	if err != nil {
		return err
	}
	if err := s.DB.ReadBatch(ctx, b.ID, counts, lines); err != nil {
		return err
	}
	log.Info("batch read", zap.Int64("rows", counts.Rows), zap.Int64("read", counts.RowsRead), zap.Int64("without_value", counts.RowsWithoutValue),
		zap.Int64("set_aside", counts.RowsSetAside), zap.Int64("readings", counts.CellsRead), zap.Int("parts", len(lines)))
	return s.publish(ctx, b, nil)
}

// firstPass counts, keeps what is set aside, lists the parts, and says what is
// doubtful about the batch as a whole.
func (s *Service) firstPass(ctx context.Context, b *store.Batch) (_ pipeline.Counts, _ []store.PartLine, doubt string, _ error) {
	if err := s.DB.ClearBatch(ctx, b.ID); err != nil {
		return pipeline.Counts{}, nil, "", err
	}
	doubts := s.newDoubts(b)
	var lines []store.PartLine
	var aside []pipeline.SetAside
	flush := func() error {
		if len(aside) == 0 {
			return nil
		}
		err := s.DB.AddSetAside(ctx, b.ID, aside)
		aside = aside[:0]
		return err
	}
	counts, err := s.decode(ctx, b, func(p *pipeline.Part) error {
		line := store.PartLine{Number: p.Number, Station: p.Station, Readings: len(p.Readings), FirstS: p.Readings[0].StartS, LastS: p.Readings[0].StartS}
		for _, r := range p.Readings {
			line.FirstS, line.LastS = min(line.FirstS, r.StartS), max(line.LastS, r.StartS)
		}
		lines = append(lines, line)
		return doubts.add(ctx, p)
	}, func(row pipeline.SetAside) error {
		aside = append(aside, row)
		if len(aside) < setAsideChunk {
			return nil
		}
		return flush()
	})
	if flushed := flush(); err == nil {
		err = flushed
	}
	return counts, lines, doubts.verdict(), err
}

// publish sends the parts of a read batch: those in attempts, as the attempt
// given there, or all of them for the first time if attempts is nil.
func (s *Service) publish(ctx context.Context, b *store.Batch, attempts store.Attempts) error {
	out := s.Bus.NewPublisher()
	var sent []int32
	flush := func() error {
		if len(sent) == 0 {
			return nil
		}
		if err := out.Flush(ctx); err != nil {
			return err
		}
		err := s.DB.MarkPublished(ctx, b.ID, sent)
		sent = sent[:0]
		return err
	}
	_, err := s.decode(ctx, b, func(p *pipeline.Part) error {
		if attempts != nil {
			attempt, wanted := attempts[p.Number]
			if !wanted {
				return nil
			}
			p.Attempt = attempt
		}
		if err := out.Publish(ctx, p); err != nil {
			return err
		}
		sent = append(sent, p.Number)
		if len(sent) < flushParts {
			return nil
		}
		return flush()
	}, func(pipeline.SetAside) error { return nil })
	if err == nil {
		err = flush()
	}
	if err != nil {
		return fmt.Errorf("publish batch %d: %w", b.ID, err)
	}
	return nil
}

// decode reads a batch from the archive by the layout kept with it.
func (s *Service) decode(ctx context.Context, b *store.Batch, part func(*pipeline.Part) error, aside func(pipeline.SetAside) error) (pipeline.Counts, error) {
	plan, err := csvfeed.Compile(b.Layout)
	if err != nil {
		return pipeline.Counts{}, fmt.Errorf("compile layout %s: %w", b.Layout.Name, err)
	}
	r, err := s.Archive.Open(b.ArchivePath)
	if err != nil {
		return pipeline.Counts{}, err
	}
	defer r.Close()
	text, err := unpack.Reader(r, b.Layout.Encoding, unpack.Limits{})
	if err != nil {
		return pipeline.Counts{}, asHold(err)
	}
	defer text.Close()
	p := newParts(b.ID, b.Feed, plan.Series(), part)
	counts, err := s.decodeFrom(ctx, b, plan, text, sink{p, aside})
	if err != nil {
		return counts, asHold(err)
	}
	return counts, p.end()
}

// asHold makes a reason to hold the batch back of a fault of its bytes.
func asHold(err error) error {
	if f, ok := errors.AsType[*unpack.FaultError](err); ok {
		return &csvfeed.HoldError{Text: f.Error()}
	}
	return err
}

// decodeFrom reads a batch's bytes, with the beginning of its file where they are
// only what that has grown by.
func (s *Service) decodeFrom(ctx context.Context, b *store.Batch, plan *csvfeed.Plan, r io.Reader, to csvfeed.Sink) (pipeline.Counts, error) {
	if b.HeadPath == "" {
		return plan.Decode(ctx, r, b.Name, to)
	}
	head, err := s.Archive.Open(b.HeadPath)
	if err != nil {
		return pipeline.Counts{}, err
	}
	defer head.Close()
	return plan.DecodeRest(ctx, head, b.LinesBefore, r, b.Name, to)
}

// sink takes what decoding finds.
type sink struct {
	parts *parts
	aside func(pipeline.SetAside) error
}

func (s sink) Reading(station string, column int, r pipeline.Reading) error {
	r.Series = uint16(column)
	return s.parts.add(station, r)
}

func (s sink) SetAside(row pipeline.SetAside) error { return s.aside(row) }
