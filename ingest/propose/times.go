package propose

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"regexp"
	"slices"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// timing is a way to read the times of a table.
type timing struct {
	form
	columns []*column

	at       []int64 // civil seconds of each row since 1970; noTime where they cannot be read
	stepS    int64   // the commonest step between rows; 0 for none
	read     float64 // share of the rows that can be read
	onward   float64 // share of the steps that go on, the others go back or stand
	regular  float64 // share of the steps that are the commonest
	distinct int     // different times
	clockS   int32   // of the day, of the first row that can be read
	steady   bool    // it is that of all rows
	score    float64

	rivals []*timing // other orders of year, month and day that fit as well
	second *timing   // other columns, with other times
}

const noTime = math.MinInt64

// Bounds of judgement; no source.
const (
	firstYear, lastYear = 1700, 2200
	leastRead           = 0.9  // share of rows that a way must read
	mostBack            = 0.25 // share of steps that may go back
	tried               = 48   // rows by which most ways are dropped
	mostWays            = 24   // that all rows are held against
	named               = 0.2  // for a name that says that there is a time
	many                = 60   // rows from which regular steps prove something
)

// findTime returns the best way to read the rows' times.
func (t *table) findTime() (*timing, error) {
	single := t.singleColumns()
	// Of ways that are as good the finer one is taken, so it comes first.
	var good []*timing
	for _, w := range slices.Concat(t.withClocks(single), single, t.fromFields()) {
		if len(good) < mostWays && w.try(t.rows) {
			good = append(good, w)
		}
	}
	if len(good) == 0 {
		return nil, t.noTime()
	}
	slices.SortStableFunc(good, func(a, b *timing) int { return cmp.Compare(b.score, a.score) })
	best := good[0]
	for _, w := range good[1:] {
		shared := slices.ContainsFunc(w.columns, func(c *column) bool { return slices.Contains(best.columns, c) })
		switch {
		case shared && w.order != best.order && w.isRivalOf(best):
			best.rivals = append(best.rivals, w)
		case !shared && best.second == nil && !slices.Equal(w.at, best.at):
			best.second = w
		}
	}
	return best, nil
}

// isRivalOf reports whether a way that reads the rows as well may be the right one.
func (w *timing) isRivalOf(best *timing) bool {
	switch {
	case w.distinct*10 < best.distinct*9: // different times become one
		return false
	case w.order == "YDM" && best.order == "YMD":
		return w.regular > best.regular+0.1
	case len(w.at) >= many && best.regular > 0.95 && w.regular < 0.9*best.regular:
		// Year and day exchanged; day and month are never told apart by steps.
		return w.order[0] != 'Y' && best.order[0] != 'Y' || w.order == "YMD" && best.order == "YDM"
	}
	return true
}

// text is what the format reads of a row.
func (w *timing) text(row int, into []byte) []byte {
	into = append(into[:0], w.columns[0].cells[row]...)
	for _, c := range w.columns[1:] {
		into = append(append(into, ' '), c.cells[row]...)
	}
	return into
}

// try reads all rows, and reports whether the way is a good one.
func (w *timing) try(rows int) bool {
	format, err := normal.CompileTime(w.format)
	if err != nil {
		return false
	}
	var text []byte
	w.clockS, w.steady = -1, true
	parse := func(row int) int64 {
		text = w.text(row, text)
		c, err := format.Parse(text)
		if err != nil {
			return noTime
		}
		if y, _, _ := c.Day.Date(); y < firstYear || y > lastYear {
			return noTime
		}
		if w.clockS < 0 {
			w.clockS = c.SecondS
		}
		w.steady = w.steady && c.SecondS == w.clockS
		return c.UnixS()
	}
	if rows > 4*tried {
		n := 0
		for i := range tried {
			if parse(i*rows/tried) != noTime {
				n++
			}
		}
		if n*5 < tried*4 {
			return false
		}
	}
	w.at = make([]int64, rows)
	n := 0
	for i := range rows {
		if w.at[i] = parse(i); w.at[i] != noTime {
			n++
		}
	}
	w.read = float64(n) / float64(rows)
	return w.read >= leastRead && w.weigh()
}

// weigh looks at the steps from row to row; false if too many go back.
func (w *timing) weigh() bool {
	steps := map[int64]int{}
	seen := map[int64]struct{}{}
	up, down, pairs := 0, 0, 0
	last := int64(noTime)
	for _, at := range w.at {
		if at == noTime {
			continue
		}
		seen[at] = struct{}{}
		if last != noTime {
			pairs++
			switch d := at - last; {
			case d > 0:
				up++
				steps[d]++
			case d < 0:
				down++
				steps[-d]++
			}
		}
		last = at
	}
	w.distinct = len(seen)
	if up < down {
		up, down = down, up // the newest comes first
	}
	most := 0
	for d, n := range steps {
		if n > most || n == most && d < w.stepS {
			w.stepS, most = d, n
		}
	}
	if up+down > 0 {
		w.regular = float64(most) / float64(up+down)
		w.onward = float64(up) / float64(pairs)
	}
	w.score = w.read + w.onward/2 + w.regular/2
	if slices.ContainsFunc(w.columns, func(c *column) bool { return c.has("date", "time", "datetime", "timestamp", "day", "year", "doy") }) {
		w.score += named
	}
	return float64(down) <= mostBack*float64(pairs)
}

// day returns the civil day of a row; ok is false if it has none.
func (w *timing) day(row int) (d pipeline.Day, ok bool) {
	at := w.at[row]
	if at == noTime {
		return 0, false
	}
	return pipeline.Day(floorDiv(at, dayS)), true
}

const dayS = 86400

func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b < 0 {
		q--
	}
	return q
}

var offsetAtEnd = regexp.MustCompile(`^[0-9]+[-/.].*[0-9]:[0-9]{2}.*([+-][0-9]{2}:?[0-9]{2})$`)

// offsetsOf returns the offsets that times end with.
func offsetsOf(cells []string) []string {
	ends := map[string]int{}
	for _, cell := range cells {
		if m := offsetAtEnd.FindStringSubmatch(cell); m != nil && len(cell) <= 40 {
			ends[m[1]]++
		}
	}
	return sortedKeys(ends)
}

// noTime says why there is no time to be found.
func (t *table) noTime() error {
	for _, c := range t.columns {
		if ends := offsetsOf(c.cells); len(ends) > 1 {
			return fmt.Errorf("column %s holds times with several offsets from UTC (%s), which no layout reads: write them all with one", c.called(), listed(ends))
		}
		odd := map[string]int{}
		for _, cell := range c.cells {
			if why := unreadable(cell); why != "" {
				odd[why]++
			}
		}
		for _, why := range sortedKeys(odd) {
			if odd[why]*2 > c.filled {
				return fmt.Errorf("column %s holds times with %s, such as %s, which no layout reads: write them as 2031-07-20 14:00",
					c.called(), why, shown(c.cells[slices.IndexFunc(c.cells, func(s string) bool { return unreadable(s) == why })]))
			}
		}
	}
	what := fmt.Sprintf("a table of %d columns and %d rows was found, and no column of it that holds dates", len(t.columns), t.rows)
	if t.namesLine > 0 {
		what += fmt.Sprintf(" (its names are in line %d)", t.namesLine)
	}
	return errors.New(what + ": a table of readings has one date, or date and time, in each row")
}
