package indices

import (
	"context"
	"slices"
	"time"

	"thawledger/indices/daily"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// bringIntoLine makes the daily values of days anew from the readings, and with
// them everything that follows: filled days and bounds around gaps, the indices
// of every season touched, and a line in changes. days is sorted.
func (s *Service) bringIntoLine(ctx context.Context, t *store.Take, st *pipeline.Station, days []pipeline.Day) error {
	stored, err := t.Days(ctx)
	if err != nil {
		return err
	}
	edits, err := editsOf(ctx, t, st)
	if err != nil {
		return err
	}
	values, err := makeDays(ctx, t, st, edits, beyond(stored, reached(edits, days)))
	if err != nil {
		return err
	}
	return s.write(ctx, t, st, stored, merge(stored, values), true, false)
}

// begun returns the first observed day of stored days, or the last day if none is.
func begun(stored []store.DayRow) pipeline.Day {
	for i := range stored {
		if stored[i].Origin == pipeline.Observed {
			return stored[i].Day
		}
	}
	return stored[len(stored)-1].Day
}

// whole says whether there is nothing to be filled in a record, and nothing in it
// to do without: its indices follow from the days as they are stored.
func whole(st *pipeline.Station, stored []store.DayRow) bool {
	first := slices.IndexFunc(stored, func(d store.DayRow) bool { return d.Origin == pipeline.Observed })
	if first < 0 || len(st.Neighbours) > 0 || stored[0].Day != firstSeasonStart(st, stored[first].Day) {
		return false
	}
	for i := first; i < len(stored); i++ {
		if stored[i].Origin != pipeline.Observed || isDoubtful(&stored[i]) {
			return false
		}
	}
	return true
}

// beyond adds to days those that lie between them and the stored record. A day
// past its end that had too little for a mean was not stored, and may be inside
// the record now.
func beyond(stored []store.DayRow, days []pipeline.Day) []pipeline.Day {
	out := slices.Clone(days)
	add := func(from, to pipeline.Day) {
		for d := from; d <= to; d++ {
			out = append(out, d)
		}
	}
	first, last := days[0], days[len(days)-1]
	observed := func(d store.DayRow) bool { return d.Origin == pipeline.Observed }
	if i := slices.IndexFunc(stored, observed); i < 0 {
		add(first, last)
	} else {
		end := len(stored) - 1
		for !observed(stored[end]) {
			end-- // filled from neighbours
		}
		add(first, stored[i].Day-1)
		add(stored[end].Day+1, last)
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// makeAnew makes a station's whole record anew.
func (s *Service) makeAnew(ctx context.Context, t *store.Take, st *pipeline.Station) error {
	stored, err := t.Days(ctx)
	if err != nil {
		return err
	}
	if len(st.Joined) > 0 {
		values, err := joined(ctx, t, st)
		if err != nil {
			return err
		}
		return s.write(ctx, t, st, stored, values, true, true)
	}
	first, last, ok, err := t.Span(ctx)
	if err != nil {
		return err
	}
	edits, err := editsOf(ctx, t, st)
	if err != nil {
		return err
	}
	var days []pipeline.Day
	if ok {
		for d := st.DayAt(first); d <= st.DayAt(last); d++ {
			days = append(days, d)
		}
	}
	for i := range edits {
		if edits[i].Kind == pipeline.EditReplace {
			days = append(days, st.DayAt(time.Unix(edits[i].FromS, 0)))
		}
	}
	var values []daily.Value
	if len(days) > 0 {
		if values, err = makeDays(ctx, t, st, edits, reached(edits, days)); err != nil {
			return err
		}
	}
	return s.write(ctx, t, st, stored, values, true, true)
}

// reached adds to days those that edits may have moved their readings to, and
// sorts them.
func reached(edits []daily.Edit, days []pipeline.Day) []pipeline.Day {
	reach := pipeline.Day((daily.Reach(edits) + daySeconds - 1) / daySeconds)
	out := slices.Clone(days)
	for _, d := range days {
		for n := pipeline.Day(1); n <= reach; n++ {
			out = append(out, d-n, d+n)
		}
	}
	slices.Sort(out)
	return slices.Compact(out)
}

const daySeconds = 86400

// merge puts newly made values in the place of the stored ones. Stored days that
// hold nothing of their own (filled, or never seen) are left out: they follow
// from the others.
func merge(stored []store.DayRow, made []daily.Value) []daily.Value {
	out := make([]daily.Value, 0, len(stored)+len(made))
	i := 0
	for k := range stored {
		for i < len(made) && made[i].Day < stored[k].Day {
			out = append(out, made[i])
			i++
		}
		if i < len(made) && made[i].Day == stored[k].Day {
			continue // taken from made in its turn
		}
		if v := fromRow(&stored[k]); v.Own() {
			out = append(out, v)
		}
	}
	return append(out, made[i:]...)
}

// write completes the record, writes the days that differ from the
// stored ones and the indices that follow from them, and leaves a line in
// changes. fresh says that some of the values are not stored yet, so that all are
// to be tested again. With all, every index is worked out again, whether its days
// have changed or not: the rules may have.
func (s *Service) write(ctx context.Context, t *store.Take, st *pipeline.Station, stored []store.DayRow, values []daily.Value, fresh, all bool) error {
	f, err := s.fill(ctx, t, st, values, !fresh)
	if err != nil {
		return err
	}
	var rows []store.DayRow
	if len(f.days) > 0 {
		begin := f.days[0].Day
		start := firstSeasonStart(st, begin)
		rows = make([]store.DayRow, 0, int(begin-start)+len(f.days))
		for d := start; d < begin; d++ {
			low, high := f.extremes.Bounds(d)
			rows = append(rows, store.DayRow{Day: d, LowC: low, HighC: high, Quality: pipeline.QualityMissing, Rule: st.Mean})
		}
		for i := range f.days {
			rows = append(rows, toRow(&f.days[i]))
		}
	}
	d := differences(stored, rows)
	if err := t.WriteDays(ctx, rows, d.days); err != nil {
		return err
	}
	if d.observed {
		t.ObservedChanged()
	}
	if err := index(ctx, t, st, f, stored, rows, d.indexed, all); err != nil || len(d.days) == 0 {
		return err
	}
	return t.MarkJoined(ctx)
}

// index works the indices of changed days out, or with all those of the whole
// record, and leaves a line in changes. stored are the days whose indices the
// tables hold, rows those of which they should.
func index(ctx context.Context, t *store.Take, st *pipeline.Station, f *filled, stored, rows []store.DayRow, changed []pipeline.Day, all bool) error {
	if len(rows) == 0 {
		// Nothing usable is left, or came yet.
		if len(stored) == 0 {
			return nil
		}
		if err := t.DropRecord(ctx); err != nil {
			return err
		}
		return t.AddChange(ctx, stored[0].Day)
	}
	r := newRecord(st, f, rows)
	var err error
	if r.breaks, err = t.Breaks(ctx); err != nil {
		return err
	}
	stretches := r.touched(changed)
	if all {
		stretches = []stretch{{r.begin, r.end()}}
	}
	if len(stretches) == 0 {
		return nil
	}
	from := stretches[0].first
	if all || len(stored) > 0 && (stored[0].Day < r.first() || stored[len(stored)-1].Day > r.end() || begun(stored) < r.begin) {
		if err := r.dropOthers(ctx, t); err != nil {
			return err
		}
		if len(stored) > 0 {
			from = min(from, stored[0].Day) // seasons that are gone have standings
		}
	}
	if err := r.writeIndices(ctx, t, stretches); err != nil {
		return err
	}
	return t.AddChange(ctx, from)
}

// difference is how stored days differ from those that should be. Days are sorted.
type difference struct {
	days []pipeline.Day // whose rows are not what they should be
	// indexed are those of them whose indices have to be worked out again because
	// the mean, its bounds or error, its rule, or whether it is doubtful is not
	// what it was.
	indexed  []pipeline.Day
	observed bool // whether one of them is, or was, observed
}

// differences compares the stored days with those that should be.
func differences(stored, rows []store.DayRow) difference {
	var d difference
	add := func(x *store.DayRow, observed bool) {
		d.days, d.indexed = append(d.days, x.Day), append(d.indexed, x.Day)
		d.observed = d.observed || observed
	}
	isObserved := func(x *store.DayRow) bool { return x.Origin == pipeline.Observed }
	i := 0
	for k := range rows {
		n := &rows[k]
		for ; i < len(stored) && stored[i].Day < n.Day; i++ {
			add(&stored[i], isObserved(&stored[i]))
		}
		if i == len(stored) || stored[i].Day > n.Day {
			add(n, isObserved(n))
			continue
		}
		o := &stored[i]
		i++
		mean := o.LowC != n.LowC || o.HighC != n.HighC || o.Origin != n.Origin
		if mean || !equal(o.ErrorC, n.ErrorC) || o.Rule != n.Rule || isDoubtful(o) != isDoubtful(n) {
			add(n, mean && (isObserved(o) || isObserved(n)))
		} else if !same(o, n) {
			d.days = append(d.days, n.Day)
		}
	}
	for ; i < len(stored); i++ {
		add(&stored[i], isObserved(&stored[i]))
	}
	return d
}

func equal(x, y *float64) bool { return x == nil && y == nil || x != nil && y != nil && *x == *y }

// same says whether two rows of one day agree in everything.
func same(a, b *store.DayRow) bool {
	x, y := *a, *b
	x.MeanC, x.MaxC, x.MinC, x.ErrorC, y.MeanC, y.MaxC, y.MinC, y.ErrorC = nil, nil, nil, nil, nil, nil, nil, nil
	return x == y && equal(a.MeanC, b.MeanC) && equal(a.MaxC, b.MaxC) && equal(a.MinC, b.MinC) && equal(a.ErrorC, b.ErrorC)
}

func fromRow(d *store.DayRow) daily.Value {
	v := daily.Value{Day: d.Day, Origin: d.Origin, LowC: d.LowC, HighC: d.HighC, Rule: d.Rule, Hours: d.Hours,
		LongestHole: d.LongestHole, Quality: d.Quality, From: d.FilledFrom, TestsMade: uint32(d.TestsMade), TestsFailed: uint32(d.TestsFailed)}
	if d.MeanC != nil {
		v.MeanC = *d.MeanC
	}
	if d.ErrorC != nil {
		v.ErrorC, v.HasError = *d.ErrorC, true
	}
	if d.MaxC != nil {
		v.MaxC, v.HasMax = *d.MaxC, true
	}
	if d.MinC != nil {
		v.MinC, v.HasMin = *d.MinC, true
	}
	return v
}

func toRow(v *daily.Value) store.DayRow {
	d := store.DayRow{Day: v.Day, Origin: v.Origin, LowC: v.LowC, HighC: v.HighC, Rule: v.Rule, Hours: v.Hours,
		LongestHole: v.LongestHole, Quality: v.Quality, FilledFrom: v.From, TestsMade: int32(v.TestsMade), TestsFailed: int32(v.TestsFailed)}
	if v.HasError {
		d.ErrorC = &v.ErrorC
	}
	if v.Origin != pipeline.Missing {
		d.MeanC = &v.MeanC
	}
	if v.HasMax {
		d.MaxC = &v.MaxC
	}
	if v.HasMin {
		d.MinC = &v.MinC
	}
	return d
}
