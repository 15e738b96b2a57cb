package store

import (
	"cmp"
	"slices"
)

// fresh holds what a take has just written, where that is all that the table
// holds of the station in a span of time: a load of history need not read back
// what it has in hand.
type fresh struct {
	rows           []row // by start, then series
	fromS, beforeS int64 // the span that rows are complete for, half-open
}

// remember keeps new rows for EachReading if nothing else of the station can lie
// between the first and the last of them: the table held nothing of their series
// there, and the station has no other series. A row beside the first or the last
// may be in the table, so their instants are left out.
func (t *Take) remember(ids map[seriesKey]int32, v verdict, noneThere bool) {
	if !noneThere || len(v.fresh) == 0 {
		return
	}
	for _, id := range ids {
		if !slices.ContainsFunc(v.fresh, func(r row) bool { return r.series == id }) {
			return
		}
	}
	list := slices.Clone(v.fresh)
	slices.SortFunc(list, func(a, b row) int {
		return cmp.Or(cmp.Compare(a.startS, b.startS), cmp.Compare(a.series, b.series))
	})
	t.fresh = fresh{rows: list, fromS: list[0].startS + 1, beforeS: list[len(list)-1].startS}
}

// between returns the rows that start in [fromS, beforeS).
func (f *fresh) between(fromS, beforeS int64) []row {
	at := func(s int64) int {
		i, _ := slices.BinarySearchFunc(f.rows, s, func(r row, s int64) int { return cmp.Compare(r.startS, s) })
		return i
	}
	return f.rows[at(fromS):at(beforeS)]
}
