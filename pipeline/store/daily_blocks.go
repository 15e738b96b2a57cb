package store

import (
	"context"
	"fmt"
	"time"

	"github.com/jackc/pgx/v5"
	"github.com/jackc/pgx/v5/pgtype"

	"thawledger/pipeline"
)

// DayRow is a row of daily_values. MeanC, MaxC and MinC are nil where there is
// no value, ErrorC where the mean is not filled.
type DayRow struct {
	Day               pipeline.Day
	MeanC, MaxC, MinC *float64
	LowC, HighC       float64
	Origin            pipeline.Origin
	Hours             int16
	LongestHole       int16
	Quality           pipeline.Quality
	Rule              pipeline.MeanRule
	ErrorC            *float64
	FilledFrom        string
	TestsMade         int32 // a bit a quality test
	TestsFailed       int32
}

// floats is an array column whose elements, or which itself, may be null.
type floats = pgtype.FlatArray[pgtype.Float8]

// Days returns the station's daily values in order of date.
func (t *Take) Days(ctx context.Context) ([]DayRow, error) { return t.DaysOf(ctx, t.station) }

// DaysOf returns the daily values of any station in order of date.
func (t *Take) DaysOf(ctx context.Context, station string) ([]DayRow, error) {
	var n int
	err := t.tx.QueryRow(ctx, `select coalesce(max(last_day) - min(first_day) + 1, 0) from thaw.daily_blocks where station = $1`, station).Scan(&n)
	if err != nil {
		return nil, fmt.Errorf("count daily values of %s: %w", station, err)
	}
	rows, err := t.tx.Query(ctx, `select first_day, last_day, mean_rule, mean_rules, mean_c, max_c, min_c, low_c, high_c, origin, hours,
			longest_hole, quality, error_c, filled_from, tests_made, tests_failed
		from thaw.daily_blocks where station = $1 order by month`, station)
	if err != nil {
		return nil, fmt.Errorf("read daily values of %s: %w", station, err)
	}
	var (
		out                                    = make([]DayRow, 0, n)
		first, last                            time.Time
		rule                                   string
		rules                                  []string
		mean, highest, lowest, low, high, errC floats
		origin, hours, hole, quality           []int16
		from                                   pgtype.FlatArray[pgtype.Text]
		made, failed                           []int32
	)
	_, err = pgx.ForEachRow(rows, []any{&first, &last, &rule, &rules, &mean, &highest, &lowest, &low, &high, &origin, &hours, &hole, &quality,
		&errC, &from, &made, &failed}, func() error {
		for i := range mean {
			d := DayRow{Day: dayOf(first) + pipeline.Day(i), Origin: pipeline.Observed, Rule: pipeline.MeanRule(rule),
				MeanC: at(mean, i), MaxC: at(highest, i), MinC: at(lowest, i), ErrorC: at(errC, i)}
			if low != nil {
				d.LowC, d.HighC = low[i].Float64, high[i].Float64
			} else {
				d.LowC, d.HighC = mean[i].Float64, mean[i].Float64
			}
			if rules != nil {
				d.Rule = pipeline.MeanRule(rules[i])
			}
			if origin != nil {
				d.Origin = pipeline.Origin(origin[i])
			}
			if hours != nil {
				d.Hours = hours[i]
			}
			if hole != nil {
				d.LongestHole = hole[i]
			}
			if quality != nil {
				d.Quality = pipeline.Quality(quality[i])
			}
			if from != nil {
				d.FilledFrom = from[i].String
			}
			if made != nil {
				d.TestsMade, d.TestsFailed = made[i], failed[i]
			}
			out = append(out, d)
		}
		// The next block gets arrays of its own: pointers go into these.
		mean, highest, lowest, errC = nil, nil, nil, nil
		return nil
	})
	if err != nil {
		return nil, fmt.Errorf("read daily values of %s: %w", station, err)
	}
	return out, nil
}

// at returns an element; nil if it, or the array, is null.
func at(a floats, i int) *float64 {
	if a == nil || !a[i].Valid {
		return nil
	}
	return &a[i].Float64
}

// monthOf returns the first day of a day's month.
func monthOf(d pipeline.Day) pipeline.Day {
	year, month, _ := d.Date()
	return pipeline.DayOf(year, month, 1)
}

// WriteDays brings the blocks of all months that have a day in changed, which is
// sorted, into line with rows: the station's daily values, every day once, in
// order.
func (t *Take) WriteDays(ctx context.Context, rows []DayRow, changed []pipeline.Day) error {
	if len(changed) == 0 {
		return nil
	}
	var months []time.Time
	var blocks [][]any
	for i := range changed {
		month := monthOf(changed[i])
		if n := len(months); n > 0 && months[n-1].Equal(month.Time()) {
			continue
		}
		months = append(months, month.Time())
		if block := daysOfMonth(rows, month); len(block) > 0 {
			blocks = append(blocks, dayBlock(t.station, month, block))
		}
	}
	if _, err := t.tx.Exec(ctx, `delete from thaw.daily_blocks where station = $1 and month = any($2)`, t.station, months); err != nil {
		return fmt.Errorf("clear daily values of %s: %w", t.station, err)
	}
	_, err := t.tx.CopyFrom(ctx, pgx.Identifier{"thaw", "daily_blocks"},
		[]string{"station", "month", "first_day", "last_day", "mean_rule", "mean_rules", "mean_c", "max_c", "min_c", "low_c", "high_c", "origin",
			"hours", "longest_hole", "quality", "error_c", "filled_from", "tests_made", "tests_failed"}, pgx.CopyFromRows(blocks))
	if err != nil {
		return fmt.Errorf("write daily values of %s: %w", t.station, err)
	}
	return nil
}

// daysOfMonth returns the part of consecutive rows that a month holds.
func daysOfMonth(rows []DayRow, month pipeline.Day) []DayRow {
	if len(rows) == 0 {
		return nil
	}
	year, m, _ := month.Date()
	from := max(0, int(month-rows[0].Day))
	to := min(len(rows), int(pipeline.DayOf(year, m+1, 1)-rows[0].Day))
	if from >= to {
		return nil
	}
	return rows[from:to]
}

// dayBlock returns a month's block; arrays that hold what is usual are left out.
func dayBlock(station string, month pipeline.Day, rows []DayRow) []any {
	n := len(rows)
	column := func(value func(*DayRow) *float64) floats {
		out, any := make(floats, n), false
		for i := range rows {
			if v := value(&rows[i]); v != nil {
				out[i], any = pgtype.Float8{Float64: *v, Valid: true}, true
			}
		}
		if !any {
			return nil
		}
		return out
	}
	small := func(usual int16, value func(*DayRow) int16) []int16 {
		out, other := make([]int16, n), false
		for i := range rows {
			out[i] = value(&rows[i])
			other = other || out[i] != usual
		}
		if !other {
			return nil
		}
		return out
	}
	mean := column(func(d *DayRow) *float64 { return d.MeanC })
	if mean == nil {
		mean = make(floats, n)
	}
	var low, high floats
	var rules []string
	var from pgtype.FlatArray[pgtype.Text]
	var made, failed []int32
	for i := range rows {
		d := &rows[i]
		if low == nil && (d.MeanC == nil || d.LowC != *d.MeanC || d.HighC != *d.MeanC) {
			low, high = column(func(d *DayRow) *float64 { return &d.LowC }), column(func(d *DayRow) *float64 { return &d.HighC })
		}
		if rules == nil && d.Rule != rows[0].Rule {
			rules = make([]string, n)
			for k := range rows {
				rules[k] = string(rows[k].Rule)
			}
		}
		if d.FilledFrom != "" {
			if from == nil {
				from = make(pgtype.FlatArray[pgtype.Text], n)
			}
			from[i] = pgtype.Text{String: d.FilledFrom, Valid: true}
		}
		if d.TestsMade != 0 {
			if made == nil {
				made, failed = make([]int32, n), make([]int32, n)
			}
			made[i], failed[i] = d.TestsMade, d.TestsFailed
		}
	}
	return []any{station, month.Time(), rows[0].Day.Time(), rows[n-1].Day.Time(), string(rows[0].Rule), rules, mean,
		column(func(d *DayRow) *float64 { return d.MaxC }), column(func(d *DayRow) *float64 { return d.MinC }), low, high,
		small(int16(pipeline.Observed), func(d *DayRow) int16 { return int16(d.Origin) }),
		small(0, func(d *DayRow) int16 { return d.Hours }), small(0, func(d *DayRow) int16 { return d.LongestHole }),
		small(0, func(d *DayRow) int16 { return int16(d.Quality) }), column(func(d *DayRow) *float64 { return d.ErrorC }), from, made, failed}
}
