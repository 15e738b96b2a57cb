package quality

import (
	"math"
	"slices"
	"testing"
	"time"

	"thawledger/pipeline"
)

var (
	winter = pipeline.DayOf(2010, time.January, 20)
	summer = pipeline.DayOf(2010, time.July, 20)
)

// near returns a record like rec, a little apart from it each day.
func near(rec Record, seed int) Record {
	out := slices.Clone(rec)
	for i := range out {
		off := 2 + 1.5*math.Sin(float64(i*(7+seed)))
		out[i].MeanC += off
		out[i].MaxC += off
		out[i].MinC += off
	}
	return out
}

// Faults put into an invented record: the test for them finds them, on their
// days and no others, and by it alone they are doubtful, in contradiction, or
// (beyond the hard bounds only) wrong.
func TestPlantedFaults(t *testing.T) {
	base := invented(1, 30)
	neighbours := []Record{near(base, 1), near(base, 2), near(base, 3)}
	type fault struct {
		name  string
		test  Test
		plant func(rec Record) []pipeline.Day // returns the days that are to fail
		mark  pipeline.Quality
	}
	on := func(days ...pipeline.Day) []pipeline.Day { return days }
	for _, f := range []fault{
		{"sentinel", Range, func(rec Record) []pipeline.Day {
			rec.set(summer, -99.9, -99.9)
			return on(summer)
		}, pipeline.QualityWrong},
		{"above 60 degC", Range, func(rec Record) []pipeline.Day {
			rec.at(summer).MaxC = 60.1
			return on(summer)
		}, pipeline.QualityWrong},
		{"maximum below minimum", Consistency, func(rec Record) []pipeline.Day {
			rec.at(summer).MaxC = rec.at(summer).MinC - 1.1
			return on(summer)
		}, pipeline.QualityInconsistent},
		{"mean above maximum", Consistency, func(rec Record) []pipeline.Day {
			rec.at(summer).MeanC = rec.at(summer).MaxC + 1.1
			return on(summer)
		}, pipeline.QualityInconsistent},
		{"mean below minimum", Consistency, func(rec Record) []pipeline.Day {
			rec.at(summer).MeanC = rec.at(summer).MinC - 1.1
			return on(summer)
		}, pipeline.QualityInconsistent},
		{"one day 17 degC too warm", Spike, func(rec Record) []pipeline.Day {
			v := rec.at(summer)
			rec.set(summer, v.MinC+17, v.MaxC+17)
			return on(summer)
		}, pipeline.QualityDoubtful},
		{"from one day on 17 degC too warm", Step, func(rec Record) []pipeline.Day {
			for d := summer; d < summer+3; d++ {
				v := rec.at(d)
				rec.set(d, v.MinC+17, v.MaxC+17)
			}
			return on(summer, summer+3)
		}, pipeline.QualityDoubtful},
		{"iced: no range all day", Persistence, func(rec Record) []pipeline.Day {
			c := tenth(rec.at(winter).MeanC)
			rec.set(winter, c, c)
			return on(winter)
		}, pipeline.QualityDoubtful},
		{"stuck for 20 days", Streak, func(rec Record) []pipeline.Day {
			var days []pipeline.Day
			for d := summer; d < summer+20; d++ {
				rec.set(d, 4, 11)
				days = append(days, d)
			}
			return days
		}, pipeline.QualityDoubtful},
		{"0 degC for missing", Naught, func(rec Record) []pipeline.Day {
			d := pipeline.DayOf(2010, time.September, 20)
			rec.set(d, 0, 0)
			return on(d)
		}, pipeline.QualityDoubtful},
		{"0 degF for missing", Naught, func(rec Record) []pipeline.Day {
			rec.set(winter, -17.8, -17.8)
			return on(winter)
		}, pipeline.QualityDoubtful},
		{"apart from its month", Gap, func(rec Record) []pipeline.Day {
			v := rec.at(summer)
			rec.set(summer, v.MinC+28, v.MaxC+28)
			return on(summer)
		}, pipeline.QualityDoubtful},
		{"apart from its month, below", Gap, func(rec Record) []pipeline.Day {
			v := rec.at(summer)
			rec.set(summer, v.MinC-28, v.MaxC-28)
			return on(summer)
		}, pipeline.QualityDoubtful},
		{"far from its date", Climatology, func(rec Record) []pipeline.Day {
			v := rec.at(summer)
			rec.set(summer, v.MinC+20, v.MaxC+20)
			return on(summer)
		}, pipeline.QualityDoubtful},
		{"maximum with the sign lost", LaggedRange, func(rec Record) []pipeline.Day {
			for d := winter - 1; d <= winter+1; d++ {
				rec.set(d, -38, -30)
			}
			rec.set(winter, -38, 30)
			return on(winter)
		}, pipeline.QualityDoubtful},
		{"ten days 14 degC too cold", Neighbour, func(rec Record) []pipeline.Day {
			var days []pipeline.Day
			for d := summer; d < summer+10; d++ {
				v := rec.at(d)
				rec.set(d, v.MinC-14, v.MaxC-14)
				days = append(days, d)
			}
			return days
		}, pipeline.QualityDoubtful},
	} {
		t.Run(f.name, func(t *testing.T) {
			rec := slices.Clone(base)
			days := f.plant(rec)
			before, after := Daily(base, Options{Neighbours: neighbours}), Daily(rec, Options{Neighbours: neighbours})
			for i, o := range after {
				want := slices.Contains(days, o.Day) || before[i].Failed.Has(f.test)
				if o.Failed.Has(f.test) != want {
					t.Errorf("%s: %s failed %t; want %t (%+v)", o.Day, f.test, !want, want, rec[i])
				}
			}
			if o := of(after, days[0]); o.Mark != f.mark {
				t.Errorf("%s is %s (%s); want %s", o.Day, o.Mark, o.Failed, f.mark)
			}
		})
	}
}

// The end of an inversion and a warm spell are true: 25 degC from one winter day
// to the next, 40 in a day, a fortnight of July 11 degC above the season. Nothing
// of it is wrong or inconsistent, and most not even doubtful.
func TestTrueWarmSpellsStay(t *testing.T) {
	rec := invented(1, 30)
	for d := winter - 5; d < winter; d++ {
		rec.set(d, -46, -42)
	}
	rec.set(winter, -44, -12) // breaks up in the afternoon
	rec.set(winter+1, -20, -16)
	rec.set(winter+2, -24, -18)
	for d := summer; d < summer+14; d++ {
		rec.set(d, 13+float64(d%3), 25-float64(d%2))
	}
	out := Daily(rec, Options{})
	for d := winter - 5; d < winter+3; d++ {
		if o := of(out, d); o.Mark != pipeline.QualityGood {
			t.Errorf("%s, end of an inversion: %s, %s", d, o.Mark, o.Failed)
		}
	}
	doubtful := 0
	for d := summer; d < summer+14; d++ {
		switch o := of(out, d); o.Mark {
		case pipeline.QualityGood:
		case pipeline.QualityDoubtful:
			doubtful++
		default:
			t.Errorf("%s, warm spell: %s, %s", d, o.Mark, o.Failed)
		}
	}
	if doubtful > 1 {
		t.Errorf("%d days of a true warm spell are doubtful", doubtful)
	}
}
