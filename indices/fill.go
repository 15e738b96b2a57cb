package indices

import (
	"context"
	"encoding/binary"
	"hash/fnv"
	"math"
	"sync"
	"time"

	"thawledger/indices/daily"
	"thawledger/indices/degreeday"
	"thawledger/indices/filling"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// filled is a record whose gaps have been filled as far as they can be.
type filled struct {
	days     []daily.Value // every day from the first observed on
	extremes *daily.Extremes
	model    *filling.Model   // nil if no day is filled
	fills    []filling.Filled // those whose error is known
}

// mostTail is for how many days past its last observed one neighbours carry a
// record on: after a year a station is closed (common practice, no source).
const mostTail = 366

// fill tests the days of a record, unless they are tested, and completes it: a straight line over short gaps, then regression on
// the station's neighbours, then, where the settings allow it, the mean of the
// date. Neighbours carry the record on past its last observed day. What nothing
// fills stays missing, with bounds.
//
// The regressions are learned from whole calendar years up to the year before
// the record's last observed day, so that filled days change when a year ends or
// readings of earlier years are corrected, and not with every new day.
func (s *Service) fill(ctx context.Context, t *store.Take, st *pipeline.Station, values []daily.Value, tested bool) (*filled, error) {
	days, extremes := daily.Complete(values, st.FillDays)
	if !tested {
		test(st, days)
	}
	f := &filled{days: days, extremes: extremes}
	if len(days) == 0 {
		return f, nil
	}
	last := days[len(days)-1].Day
	around, err := neighbourDays(ctx, t, st)
	if err != nil {
		return nil, err
	}
	tail := last
	for _, n := range around {
		if k := len(n.Points); k > 0 {
			tail = max(tail, n.Points[k-1].Day)
		}
	}
	tail = min(tail, last+mostTail)
	full := tail == last
	for i := range days {
		full = full && days[i].Origin == pipeline.Observed
	}
	if full {
		return f, nil
	}
	year, _, _ := last.Date()
	f.model = s.models.of(st, observed(days), around, pipeline.DayOf(year, time.January, 1))
	for d := last + 1; d <= tail; d++ {
		v := daily.Value{Day: d, Rule: st.Mean, Quality: pipeline.QualityMissing}
		v.LowC, v.HighC = extremes.Bounds(d)
		f.days = append(f.days, v)
	}
	f.fillEach(st, around)
	for n := len(f.days); n > 0 && (f.days[n-1].Origin == pipeline.Missing || f.days[n-1].Origin == pipeline.ByClimate); n-- {
		f.days = f.days[:n-1] // the climate alone carries nothing on
	}
	return f, nil
}

// fillEach fills day by day.
func (f *filled) fillEach(st *pipeline.Station, around []filling.Neighbour) {
	at := make([]int, len(around))
	var means []filling.NeighbourMean
	for i := 0; i < len(f.days); {
		if f.days[i].Origin == pipeline.Observed {
			i++
			continue
		}
		end := i
		for end < len(f.days) && f.days[end].Origin != pipeline.Observed {
			end++
		}
		for k := i; k < end; k++ {
			v := &f.days[k]
			one := filling.Filled{Day: v.Day}
			if i > 0 && end < len(f.days) {
				one.Gap, one.Place = end-i, k-i+1
			}
			known := false
			if v.Origin == pipeline.Interpolated {
				one.Rung, one.MeanC = filling.ByLine, v.MeanC
				before, after := filling.Point{Day: f.days[i-1].Day, MeanC: f.days[i-1].MeanC}, filling.Point{Day: f.days[end].Day, MeanC: f.days[end].MeanC}
				_, one.SEC, known = f.model.FillLine(before, after, v.Day)
			} else {
				means = meansOn(v.Day, around, at, means[:0])
				if c, se, from, ok := f.model.Fill(v.Day, means); ok {
					one.Rung, one.MeanC, one.SEC, one.Neighbour, known = filling.ByNeighbour, c, se, from, true
					v.Origin, v.From = pipeline.ByNeighbour, from
				} else if st.ClimateFills {
					if c, se, ok := f.model.FillClimate(v.Day); ok {
						one.Rung, one.MeanC, one.SEC, known = filling.ByClimate, c, se, true
						v.Origin = pipeline.ByClimate
					}
				}
				if !known {
					continue
				}
				v.MeanC, v.LowC, v.HighC, v.Quality = one.MeanC, one.MeanC, one.MeanC, pipeline.QualityEstimated
			}
			if known {
				v.ErrorC, v.HasError = one.SEC, true
				f.fills = append(f.fills, one)
			}
		}
		i = end
	}
}

// meansOn gathers what neighbours measured on a day. at holds their places,
// which only move on.
func meansOn(d pipeline.Day, around []filling.Neighbour, at []int, out []filling.NeighbourMean) []filling.NeighbourMean {
	for n := range around {
		points := around[n].Points
		for at[n] < len(points) && points[at[n]].Day < d {
			at[n]++
		}
		if at[n] < len(points) && points[at[n]].Day == d {
			out = append(out, filling.NeighbourMean{Station: around[n].Station, MeanC: points[at[n]].MeanC})
		}
	}
	return out
}

func observed(days []daily.Value) []filling.Point {
	out := make([]filling.Point, 0, len(days))
	for i := range days {
		if days[i].Origin == pipeline.Observed {
			out = append(out, filling.Point{Day: days[i].Day, MeanC: days[i].MeanC})
		}
	}
	return out
}

// neighbourDays reads the observed days of a station's neighbours.
func neighbourDays(ctx context.Context, t *store.Take, st *pipeline.Station) ([]filling.Neighbour, error) {
	out := make([]filling.Neighbour, len(st.Neighbours))
	for i, name := range st.Neighbours {
		rows, err := t.DaysOf(ctx, name)
		if err != nil {
			return nil, err
		}
		out[i].Station = name
		for k := range rows {
			if rows[k].Origin == pipeline.Observed {
				out[i].Points = append(out[i].Points, filling.Point{Day: rows[k].Day, MeanC: *rows[k].MeanC})
			}
		}
	}
	return out, nil
}

// standardErrors returns the standard errors of a season's curve and sum index
// that its filled days give them; ok is false if it has none, or one whose error
// is not known.
func (f *filled) standardErrors(s *degreeday.Season, baseC float64, means []degreeday.DayMean) (curve, sum float64, ok bool) {
	n := s.Interpolated + s.ByNeighbour + s.ByClimate
	if f == nil || n == 0 {
		return 0, 0, false
	}
	meanC := make([]float64, len(means))
	for i := range means {
		meanC[i] = means[i].MeanC
		if means[i].Origin == pipeline.Missing {
			meanC[i] = (means[i].LowC + means[i].HighC) / 2
		}
		if means[i].HasError {
			n--
		}
	}
	if n > 0 {
		return 0, 0, false
	}
	e := f.model.IndexError(s.Kind, baseC, s.Window.First, meanC, f.fills)
	// Where errors may move the season's ends the index of the estimates lies
	// below what is to be expected; that goes into the error.
	shift := 0.0
	if s.Missing == 0 {
		shift = e.CurveC - s.Curve.Index.Low
	}
	return math.Hypot(e.CurveSEC, shift), e.SumSEC, true
}

// models keeps what was last learned for each station, as long as what it was
// learned from is the same.
type models struct {
	mu   sync.Mutex
	kept map[string]kept
}

type kept struct {
	hash  uint64
	model *filling.Model
}

// of returns the model of a station, learned from days before end.
func (m *models) of(st *pipeline.Station, target []filling.Point, around []filling.Neighbour, end pipeline.Day) *filling.Model {
	target = before(target, end)
	learned := make([]filling.Neighbour, len(around))
	h := fnv.New64a()
	var b [12]byte
	add := func(points []filling.Point) {
		for i := range points {
			binary.LittleEndian.PutUint32(b[:], uint32(points[i].Day))
			binary.LittleEndian.PutUint64(b[4:], math.Float64bits(points[i].MeanC))
			h.Write(b[:])
		}
	}
	opt := filling.Usual()
	opt.LineDays = min(st.FillDays, filling.MostLine)
	h.Write([]byte{byte(opt.LineDays)})
	add(target)
	for i, n := range around {
		learned[i] = filling.Neighbour{Station: n.Station, Points: before(n.Points, end)}
		h.Write([]byte(n.Station))
		add(learned[i].Points)
	}
	sum := h.Sum64()
	m.mu.Lock()
	old := m.kept[st.ID]
	m.mu.Unlock()
	if old.model != nil && old.hash == sum {
		return old.model
	}
	model := filling.Fit(target, learned, opt)
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.kept == nil {
		m.kept = map[string]kept{}
	}
	m.kept[st.ID] = kept{sum, model}
	return model
}

// before returns the points of days before end.
func before(points []filling.Point, end pipeline.Day) []filling.Point {
	n := len(points)
	for n > 0 && points[n-1].Day >= end {
		n--
	}
	return points[:n]
}
