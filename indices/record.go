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
func bringIntoLine(ctx context.Context, t *store.Take, st *pipeline.Station, days []pipeline.Day) error {
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
	return write(ctx, t, st, stored, merge(stored, values), false)
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
	if i := slices.IndexFunc(stored, func(d store.DayRow) bool { return d.Origin == pipeline.Observed }); i < 0 {
		add(first, last)
	} else {
		add(first, stored[i].Day-1)
		add(stored[len(stored)-1].Day+1, last)
	}
	slices.Sort(out)
	return slices.Compact(out)
}

// makeAnew makes a station's whole record anew.
func makeAnew(ctx context.Context, t *store.Take, st *pipeline.Station) error {
	stored, err := t.Days(ctx)
	if err != nil {
		return err
	}
	if len(st.Joined) > 0 {
		values, err := joined(ctx, t, st)
		if err != nil {
			return err
		}
		return write(ctx, t, st, stored, values, true)
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
	return write(ctx, t, st, stored, values, true)
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

// write completes the record, writes the days that differ from the stored ones
// and the indices that follow from them, and leaves a line in changes. With all,
// every index is worked out again, whether its days have changed or not: the
// rules may have.
func write(ctx context.Context, t *store.Take, st *pipeline.Station, stored []store.DayRow, values []daily.Value, all bool) error {
	complete, extremes := daily.Complete(values, st.FillDays)
	var rows []store.DayRow
	if len(complete) > 0 {
		begin := complete[0].Day
		start := firstSeasonStart(st, begin)
		rows = make([]store.DayRow, 0, int(begin-start)+len(complete))
		for d := start; d < begin; d++ {
			low, high := extremes.Bounds(d)
			rows = append(rows, store.DayRow{Day: d, LowC: low, HighC: high, Quality: pipeline.QualityMissing, Rule: st.Mean})
		}
		for i := range complete {
			rows = append(rows, toRow(&complete[i]))
		}
	}
	differing, changed := differences(stored, rows)
	if err := t.WriteDays(ctx, rows, differing); err != nil {
		return err
	}
	return index(ctx, t, st, stored, rows, changed, all)
}

// index works the indices of changed days out, or with all those of the whole
// record, and leaves a line in changes. stored are the days whose indices the
// tables hold, rows those of which they should.
func index(ctx context.Context, t *store.Take, st *pipeline.Station, stored, rows []store.DayRow, changed []pipeline.Day, all bool) error {
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
	r := newRecord(st, rows)
	stretches := r.touched(changed)
	if all {
		stretches = []stretch{{r.begin, r.end()}}
	}
	if len(stretches) == 0 {
		return nil
	}
	from := stretches[0].first
	if all || len(stored) > 0 && (stored[0].Day < r.first() || stored[len(stored)-1].Day > r.end()) {
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

// differences compares the stored days with those that should be: differing are
// the days whose rows are not what they should be, changed those of them whose
// indices have to be worked out again because their means, or bounds, are not
// what they were. Both are sorted.
func differences(stored, rows []store.DayRow) (differing, changed []pipeline.Day) {
	both := func(d pipeline.Day) { differing, changed = append(differing, d), append(changed, d) }
	i := 0
	for k := range rows {
		n := &rows[k]
		for ; i < len(stored) && stored[i].Day < n.Day; i++ {
			both(stored[i].Day)
		}
		if i == len(stored) || stored[i].Day > n.Day {
			both(n.Day)
			continue
		}
		o := &stored[i]
		i++
		if o.LowC != n.LowC || o.HighC != n.HighC || o.Origin != n.Origin {
			both(n.Day)
		} else if !same(o, n) {
			differing = append(differing, n.Day)
		}
	}
	for ; i < len(stored); i++ {
		both(stored[i].Day)
	}
	return differing, changed
}

// same says whether two rows of one day agree in everything.
func same(a, b *store.DayRow) bool {
	equal := func(x, y *float64) bool { return x == nil && y == nil || x != nil && y != nil && *x == *y }
	x, y := *a, *b
	x.MeanC, x.MaxC, x.MinC, x.ErrorC, y.MeanC, y.MaxC, y.MinC, y.ErrorC = nil, nil, nil, nil, nil, nil, nil, nil
	return x == y && equal(a.MeanC, b.MeanC) && equal(a.MaxC, b.MaxC) && equal(a.MinC, b.MinC) && equal(a.ErrorC, b.ErrorC)
}

func fromRow(d *store.DayRow) daily.Value {
	v := daily.Value{Day: d.Day, Origin: d.Origin, LowC: d.LowC, HighC: d.HighC, Rule: d.Rule, Hours: d.Hours,
		LongestHole: d.LongestHole, Quality: d.Quality}
	if d.MeanC != nil {
		v.MeanC = *d.MeanC
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
		LongestHole: v.LongestHole, Quality: v.Quality}
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
