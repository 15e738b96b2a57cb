package indices

import (
	"context"
	"encoding/binary"
	"errors"
	"hash/fnv"
	"math"
	"sync"

	"go.uber.org/zap"

	"thawledger/indices/degreeday"
	"thawledger/indices/outlook"
	"thawledger/pipeline"
)

// hindcasts keeps what was last made for each index, as long as the past seasons
// that it was made of are the same: it costs a second or so, and an outlook
// a few milliseconds.
type hindcasts struct {
	mu   sync.Mutex
	kept map[hindcastKey]keptHindcast
}

type hindcastKey struct {
	station string
	of      OutlookIndex
}

type keptHindcast struct {
	hash     uint64
	hindcast *outlook.Hindcast
}

// of returns the hindcast of a record whose days before the present season are past.
func (k *hindcasts) of(key hindcastKey, record *outlook.Record, past []degreeday.DayMean, q outlook.Question, thresholds []float64) *outlook.Hindcast {
	h := fnv.New64a()
	var b [8]byte
	add := func(v uint64) {
		binary.LittleEndian.PutUint64(b[:], v)
		h.Write(b[:])
	}
	for i := range past {
		d := &past[i]
		add(uint64(d.Day)<<8 | uint64(d.Origin))
		add(math.Float64bits(d.LowC))
		add(math.Float64bits(d.HighC))
	}
	for _, t := range thresholds {
		add(math.Float64bits(t))
	}
	add(math.Float64bits(q.BaseC))
	add(uint64(q.Starts.Month)<<8 | uint64(q.Starts.Day))
	sum := h.Sum64()
	k.mu.Lock()
	old := k.kept[key]
	k.mu.Unlock()
	if old.hindcast != nil && old.hash == sum {
		return old.hindcast
	}
	made := record.Hindcast(q, outlook.HindcastOptions{Thresholds: thresholds, Seed: bootstrapSeed})
	k.mu.Lock()
	defer k.mu.Unlock()
	if k.kept == nil {
		k.kept = map[hindcastKey]keptHindcast{}
	}
	k.kept[key] = keptHindcast{sum, made}
	return made
}

// lastOfAll is after every record.
const lastOfAll = pipeline.Day(math.MaxInt32)

// makeOutlooks makes the outlooks of stations whose indices have changed and for
// which nothing more is on its way, and leaves a line for the judge.
func (s *Service) makeOutlooks(intake, work context.Context) error {
	stations, err := s.DB.OutlooksDue(work)
	failed := []error{err}
	for i := range stations {
		if intake.Err() != nil {
			break
		}
		failed = append(failed, s.makeOutlook(work, stations[i]))
	}
	return errors.Join(failed...)
}

func (s *Service) makeOutlook(ctx context.Context, station string) error {
	st, wanted, err := s.DB.BeginOutlook(ctx, station)
	if err != nil {
		return err
	}
	m, err := s.Outlooks(ctx, st, lastOfAll)
	if err != nil {
		return err
	}
	if err := m.keepScores(ctx, s.DB); err != nil {
		return err
	}
	after := m.through + 1 // the seasons that this day is in are open
	err = s.DB.OutlookMade(ctx, station, wanted, m.through, degreeday.WindowAt(st.ThawYear, after).First, degreeday.WindowAt(st.FreezeYear, after).First, m.rows())
	if err != nil {
		return err
	}
	if len(m.Outlooks) > 0 {
		s.Log.Info("outlook made", zap.String("station", station), zap.Int("design_values", len(m.Outlooks)))
	}
	return s.Nudge()
}
