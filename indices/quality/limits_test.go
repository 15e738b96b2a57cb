package quality

import (
	"math/rand/v2"
	"testing"
	"time"

	"thawledger/pipeline"
)

// calm returns years of means that hardly change, 4 degC and a little more.
func calm(years int) Record {
	r := rand.New(rand.NewPCG(5, 5))
	first, end := pipeline.DayOf(2001, time.January, 1), pipeline.DayOf(2001+years, time.January, 1)
	var rec Record
	for d := first; d < end; d++ {
		rec = append(rec, DayValue{Day: d, MeanC: 4 + float64(r.IntN(17))/16, Observed: true})
	}
	return rec
}

// Where a record hardly changes, a change of 15 degC fails and one of less does
// not; a spike from 0.75 x 15 = 11.25 degC on both sides on. The day after a
// spike is not held to have stepped.
func TestLeastStep(t *testing.T) {
	rec := calm(6)
	at := func(d pipeline.Day, c float64) { rec.at(d).MeanC = c }
	step, small := pipeline.DayOf(2003, time.May, 10), pipeline.DayOf(2003, time.June, 10)
	for d := step - 1; d < step+1; d++ {
		at(d, 4)
	}
	at(step, 19)
	at(step+1, 11)
	at(small-1, 4)
	at(small, 18.9375)
	at(small+1, 11)
	spike, notQuite, great := pipeline.DayOf(2003, time.July, 10), pipeline.DayOf(2003, time.August, 10), pipeline.DayOf(2003, time.September, 10)
	for d, c := range map[pipeline.Day]float64{spike: 15.25, notQuite: 15.1875, great: -16} {
		at(d-1, 4)
		at(d, c)
		at(d+1, 4)
	}
	out := Daily(rec, Options{})
	for d, want := range map[pipeline.Day]Mask{
		step: MaskOf(Step), small: 0, spike: MaskOf(Spike), notQuite: 0, great: MaskOf(Step, Spike), great + 1: 0,
	} {
		if got := of(out, d).Failed & MaskOf(Step, Spike); got != want {
			t.Errorf("%s: failed %q; want %q", d, got, want)
		}
	}
	if of(out, great+1).Tested.Has(Step) || !of(out, great+2).Tested.Has(Step) {
		t.Error("the step back from a spike is tested")
	}
	// without a distribution: 25 degC
	short := Record{{Day: 0, Observed: true}, {Day: 1, MeanC: 24.9375, Observed: true}, {Day: 2, MeanC: -0.0625, Observed: true}}
	for i, want := range []Mask{0, 0, MaskOf(Step)} {
		if got := Daily(short, Options{})[i].Failed & MaskOf(Step); got != want {
			t.Errorf("short record, day %d: failed %q; want %q", i, got, want)
		}
	}
}

// A tenth between maximum and minimum is not flat; 40 degC are not lagged across
// a hole.
func TestFlatAndLagged(t *testing.T) {
	both := func(d pipeline.Day, minC, maxC float64) DayValue {
		return DayValue{Day: d, MinC: minC, MaxC: maxC, HasMin: true, HasMax: true}
	}
	for _, c := range []struct {
		minC, maxC float64
		want       Mask
	}{
		{2.2, 2.3, 0}, {-31.3, -31.2, 0}, {2.2, 2.25, MaskOf(Persistence)}, {-10, 29.9, 0}, {-10, 30, MaskOf(LaggedRange)},
	} {
		if got := Daily(Record{both(0, c.minC, c.maxC)}, Options{})[0].Failed; got != c.want {
			t.Errorf("%v to %v degC: failed %q; want %q", c.minC, c.maxC, got, c.want)
		}
	}
	hole := Record{{Day: 1, MinC: -35, HasMin: true}, {Day: 5, MaxC: 20, HasMax: true}}
	for _, o := range Daily(hole, Options{}) {
		if o.Tested.Has(LaggedRange) {
			t.Errorf("%+v", o)
		}
	}
	// a warm minimum on the day after: the end of an inversion
	if o := Daily(Record{both(1, -48, -40), both(2, -47, -5), both(3, -15, -6)}, Options{})[1]; o.Failed.Has(LaggedRange) {
		t.Errorf("%+v", o)
	}
	if o := Daily(Record{both(1, -48, -40), both(2, -47, -5), both(3, -46, -40)}, Options{})[1]; !o.Failed.Has(LaggedRange) {
		t.Errorf("%+v", o)
	}
}

// without takes days out of a record.
func without(rec Record, days ...pipeline.Day) Record {
	var out Record
next:
	for _, v := range rec {
		for _, d := range days {
			if v.Day == d {
				continue next
			}
		}
		out = append(out, v)
	}
	return out
}

// keep leaves of a record the days that ok accepts.
func keep(rec Record, ok func(d pipeline.Day) bool) Record {
	var out Record
	for _, v := range rec {
		if ok(v.Day) {
			out = append(out, v)
		}
	}
	return out
}

// A date's window is 15 days, of which 100 values are enough and 99 are not.
func TestWindowOfADate(t *testing.T) {
	for _, centre := range []pipeline.MonthDay{{Month: time.July, Day: 15}, {Month: time.January, Day: 3}, {Month: time.December, Day: 28}, {Month: time.March, Day: 1}} {
		tested := func(rec Record) (n int) {
			for _, o := range Daily(rec, Options{}) {
				if o.Tested.Has(Climatology) {
					n++
				}
			}
			return n
		}
		place := func(d pipeline.Day) int { _, p := dateOf(d); return int(p) }
		_, c := dateOf(centre.In(2004))
		apart := func(d pipeline.Day) int { return (place(d) - int(c) + 366 + 180) % 366 }
		rec := keep(calm(8), func(d pipeline.Day) bool { return 180-7 <= apart(d) && apart(d) <= 180+7 })
		rec = rec[len(rec)-100:] // exactly enough: for the centre and no other date
		if n := tested(rec); n < 6 || n > 7 {
			t.Errorf("%s: %d days tested; want the centre's of 6 or 7 years", centre, n)
		}
		for _, d := range []pipeline.Day{rec[0].Day, rec[50].Day, rec[99].Day} {
			if n := tested(without(rec, d)); n != 0 {
				t.Errorf("%s: %d days tested with 99 values", centre, n)
			}
		}
	}
}

// Each way in which one day's values reach another's outcome: it does change,
// and MayChange says so.
func TestMayChangeReaches(t *testing.T) {
	day := func(y int, m time.Month, d int) pipeline.Day { return pipeline.DayOf(y, m, d) }
	month := func(rec Record, m time.Month, values int) Record { // leaves the last so many of a month
		left := 0
		for _, v := range rec {
			if _, mm, _ := v.Day.Date(); mm == m {
				left++
			}
		}
		return keep(rec, func(d pipeline.Day) bool {
			if _, mm, _ := d.Date(); mm == m {
				left--
				return left < values
			}
			return true
		})
	}
	// 6 years of calm; in September 2006 changes of 20 degC on the 1st and the
	// 20th, and a spike of 20 on the last day
	stepped := func() Record {
		rec := calm(6)
		for d := day(2006, time.September, 20); d < day(2006, time.September, 25); d++ {
			rec.at(d).MeanC += 20
		}
		for d := day(2006, time.September, 1); d < day(2006, time.September, 5); d++ {
			rec.at(d).MeanC += 20
		}
		rec.at(day(2006, time.September, 30)).MeanC += 20
		return rec
	}
	// exactly 100 changes into days of September, that from 31 August 2004 among them
	hundred := month(stepped(), time.September, 101)
	stuck := calm(1)
	for d := day(2001, time.July, 15); d < day(2001, time.July, 15)+20; d++ {
		stuck.at(d).MeanC = 9
	}
	turn := keep(calm(7), func(d pipeline.Day) bool {
		_, m, n := d.Date()
		return m == time.December && n >= 22 || m == time.January && n <= 5
	})
	turn = turn[len(turn)-100:]
	for _, c := range []struct {
		name         string
		rec          Record
		changed, day pipeline.Day
	}{
		{"streak", stuck, day(2001, time.July, 15) + 19, day(2001, time.July, 15)},
		{"streak, backwards", stuck, day(2001, time.July, 15), day(2001, time.July, 15) + 19},
		{"date, over the turn of the year", turn, day(2005, time.January, 5), day(2006, time.December, 29)},
		{"month", month(calm(6), time.September, 100), day(2005, time.September, 2), day(2006, time.September, 28)},
		{"month, its first day", month(calm(6), time.September, 100), day(2005, time.September, 30), day(2006, time.September, 1)},
		{"changes of the next month, its first day", hundred, day(2004, time.August, 31), day(2006, time.September, 1)},
		{"changes of the next month", hundred, day(2004, time.August, 31), day(2006, time.September, 20)},
		{"spike on the last day of such a month", hundred, day(2004, time.August, 31), day(2006, time.October, 1)},
		{"spike on the last day of the month", hundred, day(2005, time.September, 12), day(2006, time.October, 1)},
	} {
		rec := c.rec
		before := Daily(rec, Options{})
		after := Daily(without(rec, c.changed), Options{})
		find := func(out []Outcome) Outcome {
			for _, o := range out {
				if o.Day == c.day {
					return o
				}
			}
			t.Errorf("%s: %s is not in the record", c.name, c.day)
			return Outcome{}
		}
		if len(before) != len(after)+1 {
			t.Errorf("%s: %s is not in the record", c.name, c.changed)
		}
		if a, b := find(before), find(after); a == b {
			t.Errorf("%s: %s does not change with %s: %s", c.name, c.day, c.changed, a.Failed)
		}
		if !MayChange(c.changed, c.day) {
			t.Errorf("%s: %s may change with %s", c.name, c.day, c.changed)
		}
	}
}

// A front reaches the neighbours a day later, or a day earlier.
func TestFrontAtTheNeighbours(t *testing.T) {
	for _, lag := range []int{-1, 1} {
		rec := calm(6)
		warm := 0.0
		for i := range rec {
			if i%11 == 0 {
				warm = 12 - warm
			}
			rec[i].MeanC += warm
		}
		late := make(Record, len(rec))
		for i := range rec {
			late[i] = rec[i]
			late[i].MeanC = rec[min(max(i-lag, 0), len(rec)-1)].MeanC
		}
		failed, tested := 0, 0
		opt := Options{Neighbours: []Record{late, late, late}}
		opt.Neighbours[1] = late[3:] // begins later
		for _, o := range Daily(rec, opt) {
			if o.Tested.Has(Neighbour) {
				tested++
			}
			if o.Failed.Has(Neighbour) {
				failed++
			}
		}
		if tested < len(rec)-10 || failed > 0 {
			t.Errorf("lag %d: %d of %d days tested, %d fail", lag, tested, len(rec), failed)
		}
	}
}
