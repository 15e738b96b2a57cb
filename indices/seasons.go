package indices

import (
	"context"
	"slices"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// stretch is a run of days, both ends included.
type stretch struct{ first, last pipeline.Day }

// record is a station's daily values as the index arithmetic wants them, every
// day once from the start of the first season to the last observed day.
type record struct {
	st    *pipeline.Station
	means []degreeday.DayMean
	// begin is the first observed day: days before it are there only so that the
	// seasons which it falls into are whole.
	begin pipeline.Day
}

func (r *record) first() pipeline.Day { return r.means[0].Day }
func (r *record) end() pipeline.Day   { return r.means[len(r.means)-1].Day }

var kinds = []pipeline.Kind{pipeline.Thaw, pipeline.Freeze}

func (r *record) window(kind pipeline.Kind, d pipeline.Day) degreeday.Window {
	if kind == pipeline.Freeze {
		return degreeday.WindowAt(r.st.FreezeYear, d)
	}
	return degreeday.WindowAt(r.st.ThawYear, d)
}

// build works the season of a kind out that a day, not before begin, is in.
func (r *record) build(kind pipeline.Kind, d pipeline.Day) degreeday.Season {
	w := r.window(kind, d)
	last := min(w.Last, r.end())
	return degreeday.Build(kind, w, w.Label(), r.st.BaseC, r.means[w.First-r.first():last-r.first()+1], r.end())
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
	seasons := map[pipeline.Kind]map[pipeline.Day]degreeday.Season{pipeline.Thaw: {}, pipeline.Freeze: {}}
	var rows []store.SeasonRow
	for _, s := range stretches {
		s.first = store.BlockStart(s.first, r.begin, r.window(pipeline.Thaw, s.first).First, r.window(pipeline.Freeze, s.first).First)
		days := make([]store.IndexRow, 0, s.last-s.first+1)
		for d := s.first; d <= s.last; d++ {
			row := store.IndexRow{Day: d}
			for _, kind := range kinds {
				start := r.window(kind, d).First
				season, ok := seasons[kind][start]
				if !ok {
					season = r.build(kind, d)
					seasons[kind][start] = season
					rows = append(rows, r.seasonRows(&season)...)
				}
				into := &row.Thaw
				if kind == pipeline.Freeze {
					into = &row.Freeze
				}
				*into = indicesOf(start, season.Days[d-start])
			}
			days = append(days, row)
		}
		if err := t.WriteIndexDays(ctx, days); err != nil {
			return err
		}
	}
	return t.WriteSeasons(ctx, rows)
}

func indicesOf(season pipeline.Day, x degreeday.DayIndex) store.Indices {
	out := store.Indices{Season: season, CurveLow: x.CurveToDate.Low, CurveHigh: x.CurveToDate.High, SumLow: x.Sum.Low, SumHigh: x.Sum.High}
	if x.Running.Known() {
		out.RunningC = &x.Running.Low
	}
	return out
}

// seasonRows returns a season's rows, one a definition.
func (r *record) seasonRows(s *degreeday.Season) []store.SeasonRow {
	rows := make([]store.SeasonRow, 0, 2)
	for _, d := range []struct {
		definition pipeline.Definition
		result     *degreeday.Result
	}{{pipeline.Curve, &s.Curve}, {pipeline.Sum, &s.Sum}} {
		row := store.SeasonRow{
			Kind: s.Kind, Definition: d.definition, Start: s.Window.First, Label: s.Label,
			Low: d.result.Index.Low, High: d.result.Index.High, Through: s.Through, Over: s.Over, Complete: s.Complete(),
			NoSeason: d.result.NoSeason, EdgeProvisional: d.result.EdgeProvisional, OnsetProvisional: d.result.OnsetProvisional,
			Observed: s.Observed, Interpolated: s.Interpolated, Missing: s.Missing, LongestGap: s.LongestGap,
			Rule: r.st.Mean, BaseC: r.st.BaseC,
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
