package indices

import (
	"context"
	"slices"

	"thawledger/indices/degreeday"
	"thawledger/indices/filling"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// stretch is a run of days, both ends included.
type stretch struct{ first, last pipeline.Day }

// record is a station's daily values as the index arithmetic wants them, every
// day once from the start of the first season to the last observed or filled day.
type record struct {
	st     *pipeline.Station
	filled *filled
	means  []degreeday.DayMean // less the base, where that changes within the year
	baseC  float64             // 0 there
	begin  pipeline.Day
	rules  []pipeline.MeanRule // of the days in means
	// doubtful are days of which the indices are also worked out without, and the
	// means that these days then have: none, with bounds.
	doubtful map[pipeline.Day]degreeday.DayMean
	breaks   []pipeline.Day
}

func (r *record) first() pipeline.Day { return r.means[0].Day }
func (r *record) end() pipeline.Day   { return r.means[len(r.means)-1].Day }

var kinds = []pipeline.Kind{pipeline.Thaw, pipeline.Freeze}

// newRecord takes a station's daily values, every day once in order, at least
// one of them observed. Days before the first observed one, begin, are there only
// so that the seasons which it falls into are whole.
func newRecord(st *pipeline.Station, f *filled, rows []store.DayRow) *record {
	r := &record{st: st, filled: f, means: make([]degreeday.DayMean, len(rows)), baseC: st.BaseC, rules: make([]pipeline.MeanRule, len(rows)),
		doubtful: map[pipeline.Day]degreeday.DayMean{}}
	if len(st.Bases) > 0 {
		r.baseC = 0
	}
	began := false
	for i := range rows {
		d := &rows[i]
		shift := 0.0
		if len(st.Bases) > 0 {
			shift = st.BaseOn(d.Day)
		}
		m := degreeday.DayMean{Day: d.Day, Origin: d.Origin, LowC: d.LowC - shift, HighC: d.HighC - shift}
		if d.MeanC != nil {
			m.MeanC = *d.MeanC - shift
		}
		if d.ErrorC != nil {
			m.HasError = true
			m.AboveC, _ = filling.Positive(m.MeanC-r.baseC, *d.ErrorC)
			m.BelowC, _ = filling.Positive(r.baseC-m.MeanC, *d.ErrorC)
		}
		r.means[i], r.rules[i] = m, d.Rule
		if !began && d.Origin == pipeline.Observed {
			r.begin, began = d.Day, true
		}
		if isDoubtful(d) {
			low, high := f.extremes.Bounds(d.Day)
			r.doubtful[d.Day] = degreeday.DayMean{Day: d.Day, Origin: pipeline.Missing, LowC: low - shift, HighC: high - shift}
		}
	}
	return r
}

// firstSeasonStart returns the start of the earlier of the two seasons that a
// day is in.
func firstSeasonStart(st *pipeline.Station, d pipeline.Day) pipeline.Day {
	return min(degreeday.WindowAt(st.ThawYear, d).First, degreeday.WindowAt(st.FreezeYear, d).First)
}

func (r *record) window(kind pipeline.Kind, d pipeline.Day) degreeday.Window {
	if kind == pipeline.Freeze {
		return degreeday.WindowAt(r.st.FreezeYear, d)
	}
	return degreeday.WindowAt(r.st.ThawYear, d)
}

// build works the season of a kind in a window out; the record has a day of it.
func (r *record) build(kind pipeline.Kind, w degreeday.Window) *degreeday.Season {
	s := degreeday.Build(kind, w, w.Label(), r.baseC, r.within(w), r.end())
	if !s.Over {
		s.Settle(r.relapses(&s))
	}
	return &s
}

// relapses returns the largest relapses that past seasons without missing days
// have met with after the date that a season has come to.
func (r *record) relapses(open *degreeday.Season) (out []float64) {
	var s degreeday.Season
	var excess []float64
	for d := r.begin; d < open.Window.First; {
		w := r.window(open.Kind, d)
		d = w.Last + 1
		if w.First < r.first() || w.First >= open.Window.First {
			continue
		}
		days := r.within(w)
		s.Build(open.Kind, w, "", r.baseC, days, r.end())
		if !s.Complete() {
			continue
		}
		excess = excess[:0]
		for i := range days {
			x := days[i].MeanC - r.baseC
			if open.Kind == pipeline.Freeze {
				x = -x
			}
			excess = append(excess, x)
		}
		fall := 0.0
		if s.Curve.Began {
			fall = degreeday.LargestFall(excess, int(open.Through-open.Window.First), int(s.Curve.Last-w.First))
		}
		out = append(out, fall)
	}
	return out
}

// within returns the record's days in a window.
func (r *record) within(w degreeday.Window) []degreeday.DayMean {
	return r.means[w.First-r.first() : min(w.Last, r.end())-r.first()+1]
}

// withoutDoubtful works a season out with its doubtful days taken for missing,
// and counts them; nil if it has none.
func (r *record) withoutDoubtful(s *degreeday.Season) (without *degreeday.Season, n int) {
	if len(r.doubtful) == 0 {
		return nil, 0
	}
	means := slices.Clone(r.within(s.Window))
	for i := range means {
		if m, ok := r.doubtful[means[i].Day]; ok {
			means[i] = m
			n++
		}
	}
	if n == 0 {
		return nil, 0
	}
	out := degreeday.Build(s.Kind, s.Window, s.Label, r.baseC, means, r.end())
	return &out, n
}

// homogeneous says whether a season's days are made by one rule, that of the
// record's last day, and no break of the record lies within them.
func (r *record) homogeneous(w degreeday.Window) bool {
	last := min(w.Last, r.end())
	for d := max(w.First, r.begin); d <= last; d++ {
		if r.rules[d-r.first()] != r.rules[len(r.rules)-1] {
			return false
		}
	}
	return !slices.ContainsFunc(r.breaks, func(d pipeline.Day) bool { return w.First < d && d <= last })
}

// touched returns the days whose indices follow from changed days: in every
// season with a changed day, those from the first changed day to its end or the
// record's. A day that the record has lost, or has only to make a season whole,
// stands for the nearest that it has. changed is sorted. The stretches are
// sorted and do not touch.
func (r *record) touched(changed []pipeline.Day) []stretch {
	within := make([]pipeline.Day, len(changed))
	for i, d := range changed {
		within[i] = min(max(d, r.begin), r.end())
	}
	var all []stretch
	for _, kind := range kinds {
		for i := 0; i < len(within); {
			w := r.window(kind, within[i])
			all = append(all, stretch{within[i], min(w.Last, r.end())})
			for i < len(within) && within[i] <= w.Last {
				i++
			}
		}
	}
	slices.SortFunc(all, func(a, b stretch) int { return int(a.first - b.first) })
	var out []stretch
	for _, s := range all {
		if n := len(out); n > 0 && s.first <= out[n-1].last+1 {
			out[n-1].last = max(out[n-1].last, s.last)
			continue
		}
		out = append(out, s)
	}
	return out
}

// writeIndices works the indices of the given stretches out and writes them,
// with the seasons that they are in.
func (r *record) writeIndices(ctx context.Context, t *store.Take, stretches []stretch) error {
	built := map[pipeline.Kind]map[pipeline.Day]*degreeday.Season{pipeline.Thaw: {}, pipeline.Freeze: {}}
	var rows []store.SeasonRow
	season := func(kind pipeline.Kind, d pipeline.Day) *degreeday.Season {
		w := r.window(kind, d)
		s := built[kind][w.First]
		if s == nil {
			s = r.build(kind, w)
			built[kind][w.First] = s
			rows = append(rows, r.seasonRows(s)...)
		}
		return s
	}
	for _, s := range stretches {
		thaw, freeze := season(pipeline.Thaw, s.first), season(pipeline.Freeze, s.first)
		s.first = store.BlockStart(s.first, r.begin, thaw.Window.First, freeze.Window.First)
		days := make([]store.IndexRow, s.last-s.first+1)
		for i := range days {
			d := s.first + pipeline.Day(i)
			if d > thaw.Window.Last {
				thaw = season(pipeline.Thaw, d)
			}
			if d > freeze.Window.Last {
				freeze = season(pipeline.Freeze, d)
			}
			days[i] = store.IndexRow{Day: d, Thaw: indicesOf(thaw, d), Freeze: indicesOf(freeze, d)}
		}
		if err := t.WriteIndexDays(ctx, days); err != nil {
			return err
		}
	}
	// What past seasons were decides when the onset of those at the end holds; what
	// other years were bounds doubtful days that are left out.
	for _, kind := range kinds {
		season(kind, r.end())
		for d := range r.doubtful {
			season(kind, d)
		}
	}
	return t.WriteSeasons(ctx, rows)
}

func indicesOf(s *degreeday.Season, d pipeline.Day) store.Indices {
	x := &s.Days[d-s.Window.First]
	out := store.Indices{Season: s.Window.First, CurveLow: x.CurveToDate.Low, CurveHigh: x.CurveToDate.High, SumLow: x.Sum.Low, SumHigh: x.Sum.High}
	if x.Running.Known() {
		out.RunningC = &x.Running.Low
	}
	return out
}

// seasonRows returns a season's rows, one a definition.
func (r *record) seasonRows(s *degreeday.Season) []store.SeasonRow {
	rows := make([]store.SeasonRow, 0, 2)
	without, doubtful := r.withoutDoubtful(s)
	curveError, sumError, hasError := r.filled.standardErrors(s, r.baseC, r.within(s.Window))
	homogeneous := r.homogeneous(s.Window)
	for _, d := range []struct {
		definition pipeline.Definition
		result     *degreeday.Result
	}{{pipeline.Curve, &s.Curve}, {pipeline.Sum, &s.Sum}} {
		row := store.SeasonRow{
			Kind: s.Kind, Definition: d.definition, Start: s.Window.First, Label: s.Label,
			Low: d.result.Index.Low, High: d.result.Index.High, Through: s.Through, Over: s.Over, Complete: s.Complete(),
			NoSeason: d.result.NoSeason, EdgeProvisional: d.result.EdgeProvisional, OnsetProvisional: d.result.OnsetProvisional,
			Observed: s.Observed, Interpolated: s.Interpolated, Missing: s.Missing, LongestGap: s.LongestGap,
			Rule: r.st.Mean, BaseC: r.st.BaseC, Neighbour: s.ByNeighbour, Climate: s.ByClimate, Doubtful: doubtful, Homogeneous: homogeneous,
		}
		of, e := func(s *degreeday.Season) degreeday.Bounds { return s.Curve.Index }, curveError
		if d.definition == pipeline.Sum {
			of, e = func(s *degreeday.Season) degreeday.Bounds { return s.Sum.Index }, sumError
		}
		if hasError {
			row.ErrorC = &e
		}
		if without != nil {
			row.Without = &[2]float64{of(without).Low, of(without).High}
		}
		if d.result.Began {
			row.FirstDay, row.LastDay = &d.result.First, &d.result.Last
		}
		rows = append(rows, row)
	}
	return rows
}

// dropOthers removes seasons and days that the record no longer has.
func (r *record) dropOthers(ctx context.Context, t *store.Take) error {
	for _, kind := range kinds {
		var starts []pipeline.Day
		for d := r.begin; d <= r.end(); {
			w := r.window(kind, d)
			starts = append(starts, w.First)
			d = w.Last + 1
		}
		if err := t.DropSeasons(ctx, kind, starts); err != nil {
			return err
		}
	}
	return t.DropIndexDays(ctx, r.begin, r.end())
}
