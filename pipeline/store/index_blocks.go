package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgtype"

	"thawledger/pipeline"
)

// Indices is one kind's columns of a day in air_index_daily.
type Indices struct {
	Season              pipeline.Day // first day of the thaw or freeze year
	RunningC            *float64     // nil where a gap leaves it open
	CurveLow, CurveHigh float64
	SumLow, SumHigh     float64
}

// known returns the index if its bounds agree.
func known(low, high float64) *float64 {
	if low == high {
		return &low
	}
	return nil
}

// IndexRow is a row of air_index_daily.
type IndexRow struct {
	Day          pipeline.Day
	Thaw, Freeze Indices
}

// BlockStart returns the first day of the block of air_index_daily that holds d,
// in a record that begins on first and whose seasons begin on the days that
// seasonStarts gives for d.
func BlockStart(d, first pipeline.Day, seasonStarts ...pipeline.Day) pipeline.Day {
	start := max(monthOf(d), first)
	for _, s := range seasonStarts {
		start = max(start, s)
	}
	return start
}

var indexColumns = func() []string {
	columns := []string{"station", "month", "first_day", "last_day", "thaw_season", "freeze_season"}
	for _, kind := range []string{"thaw", "freeze"} {
		for _, name := range []string{"running", "running_all", "curve_low", "curve_low_all", "curve_high", "sum_low", "sum_low_all", "sum_high"} {
			columns = append(columns, kind+"_"+name+"_c_days")
		}
	}
	return columns
}()

// WriteIndexDays puts rows, consecutive in time, in the place of all blocks that
// hold one of their days. The rows must begin and end with blocks.
func (t *Take) WriteIndexDays(ctx context.Context, rows []IndexRow) error {
	if len(rows) == 0 {
		return nil
	}
	_, err := t.tx.Exec(ctx, `delete from thaw.index_blocks where station = $1 and first_day <= $3 and last_day >= $2`,
		t.station, rows[0].Day.Time(), rows[len(rows)-1].Day.Time())
	if err != nil {
		return fmt.Errorf("clear indices of %s: %w", t.station, err)
	}
	from := 0
	_, err = t.tx.CopyFrom(ctx, pgx.Identifier{"thaw", "index_blocks"}, indexColumns, pgx.CopyFromFunc(func() ([]any, error) {
		if from == len(rows) {
			return nil, nil
		}
		begin, month := from, monthOf(rows[from].Day)
		year, m, _ := month.Date()
		next := pipeline.DayOf(year, m+1, 1)
		for from < len(rows) && rows[from].Day < next && rows[from].Thaw.Season == rows[begin].Thaw.Season &&
			rows[from].Freeze.Season == rows[begin].Freeze.Season {
			from++
		}
		return t.indexBlock(month, rows[begin:from]), nil
	}))
	if err != nil {
		return fmt.Errorf("write indices of %s: %w", t.station, err)
	}
	return nil
}

func (t *Take) indexBlock(month pipeline.Day, rows []IndexRow) []any {
	n := len(rows)
	out := make([]any, 0, len(indexColumns))
	out = append(out, t.station, month.Time(), rows[0].Day.Time(), rows[n-1].Day.Time(), rows[0].Thaw.Season.Time(), rows[0].Freeze.Season.Time())
	for _, of := range []func(*IndexRow) *Indices{
		func(r *IndexRow) *Indices { return &r.Thaw }, func(r *IndexRow) *Indices { return &r.Freeze },
	} {
		running, numbers := make([]pgtype.Float8, n), make([]float64, 4*n)
		curveLow, curveHigh, sumLow, sumHigh := numbers[:n:n], numbers[n:2*n:2*n], numbers[2*n:3*n:3*n], numbers[3*n:]
		open := false
		for i := range rows {
			x := of(&rows[i])
			if x.RunningC != nil {
				running[i] = pgtype.Float8{Float64: *x.RunningC, Valid: true}
			}
			curveLow[i], curveHigh[i], sumLow[i], sumHigh[i] = x.CurveLow, x.CurveHigh, x.SumLow, x.SumHigh
			open = open || x.CurveLow != x.CurveHigh || x.SumLow != x.SumHigh
		}
		out = appendArray(out, running)
		out = append(appendArray(out, curveLow), nil)
		out = append(appendArray(out, sumLow), nil)
		if open {
			out[len(out)-4], out[len(out)-1] = curveHigh, sumHigh
		}
	}
	return out
}

// appendArray appends an array and no number or, where all elements are the same,
// no array and that number.
func appendArray[E comparable](out []any, a []E) []any {
	for i := range a {
		if a[i] != a[0] {
			return append(out, a, nil)
		}
	}
	return append(out, nil, a[0])
}

// DropIndexDays removes all blocks of air_index_daily that hold a day of the
// station before first or after last.
func (t *Take) DropIndexDays(ctx context.Context, first, last pipeline.Day) error {
	_, err := t.tx.Exec(ctx, `delete from thaw.index_blocks where station = $1 and (first_day < $2 or last_day > $3)`, t.station, first.Time(), last.Time())
	if err != nil {
		return fmt.Errorf("clear indices of %s: %w", t.station, err)
	}
	return nil
}

// IndexDay is a day's air indices of one kind to date.
type IndexDay struct {
	Day                 pipeline.Day
	Season              pipeline.Day
	CurveLow, CurveHigh float64
	SumLow, SumHigh     float64
}

// IndexDays returns the station's indices of a kind from a day on, in order.
func (j *Judging) IndexDays(ctx context.Context, kind pipeline.Kind, from pipeline.Day) ([]IndexDay, error) {
	k := string(kind)
	rows, err := j.tx.Query(ctx, `select first_day, last_day, `+k+`_season, `+k+`_curve_low_c_days, `+k+`_curve_low_all_c_days, `+k+`_curve_high_c_days,
			`+k+`_sum_low_c_days, `+k+`_sum_low_all_c_days, `+k+`_sum_high_c_days
		from thaw.index_blocks where station = $1 and last_day >= $2 order by first_day`, j.station, from.Time())
	if err != nil {
		return nil, fmt.Errorf("read indices of %s: %w", j.station, err)
	}
	var (
		out                                  []IndexDay
		first, last, season                  time.Time
		curveLow, curveHigh, sumLow, sumHigh []float64
		curveAll, sumAll                     *float64
	)
	_, err = pgx.ForEachRow(rows, []any{&first, &last, &season, &curveLow, &curveAll, &curveHigh, &sumLow, &sumAll, &sumHigh}, func() error {
		begin := dayOf(first)
		for day := max(begin, from); day <= dayOf(last); day++ {
			i := int(day - begin)
			d := IndexDay{Day: day, Season: dayOf(season), CurveLow: element(curveLow, curveAll, i), SumLow: element(sumLow, sumAll, i)}
			d.CurveHigh, d.SumHigh = d.CurveLow, d.SumLow
			if curveHigh != nil {
				d.CurveHigh, d.SumHigh = curveHigh[i], sumHigh[i]
			}
			out = append(out, d)
		}
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read indices of %s: %w", j.station, err)
	}
	return out, nil
}

// element returns the element of an array, or the number that stands for all.
func element(a []float64, all *float64, i int) float64 {
	if all != nil {
		return *all
	}
	return a[i]
}
