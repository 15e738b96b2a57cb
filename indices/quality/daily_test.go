package quality

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// Masks are stored: a test's bit and name never change.
func TestBitsAndNames(t *testing.T) {
	want := []string{
		"range", "consistency", "step", "spike", "persistence", "streak", "naught", "gap", "climatology", "lagged_range", "neighbour",
	}
	tests := []Test{Range, Consistency, Step, Spike, Persistence, Streak, Naught, Gap, Climatology, LaggedRange, Neighbour}
	for i, test := range tests {
		if int(test) != i || test.String() != want[i] || MaskOf(test) != 1<<i {
			t.Errorf("%s has number %d and bit %b; want %s with %d", test, test, MaskOf(test), want[i], i)
		}
	}
	m := MaskOf(tests...)
	if Count != len(tests) || m != 0x7ff || !slices.Equal(m.Tests(), tests) || m.String() != strings.Join(want, ",") || MaskOf(Gap).Has(Range) {
		t.Errorf("all: %x, %s, %v", uint32(m), m, m.Tests())
	}
	if s := Test(31).String(); s != "test 31" {
		t.Error(s)
	}
}

// An invented station without faults: nothing wrong, nothing inconsistent, and
// almost nothing doubtful.
func TestCleanRecord(t *testing.T) {
	for seed := range uint64(4) {
		rec := invented(seed, 30)
		doubtful := 0
		for i, o := range Daily(rec, Options{}) {
			switch o.Mark {
			case pipeline.QualityGood:
			case pipeline.QualityDoubtful:
				doubtful++
			default:
				t.Errorf("seed %d: %+v of %+v", seed, o, rec[i])
			}
		}
		if doubtful > len(rec)/1000 {
			t.Errorf("seed %d: %d of %d days doubtful", seed, doubtful, len(rec))
		}
	}
}

// 3 degC is the guidelines' limit for values a minute apart. Days that differ by
// that are most days.
func TestThreeDegreesAreNoStepOfDays(t *testing.T) {
	rec := invented(1, 30)
	more, failed := 0, 0
	for i, o := range Daily(rec, Options{}) {
		if i > 0 && math.Abs(rec[i].MeanC-rec[i-1].MeanC) > 3 {
			more++
		}
		if o.Failed.Has(Step) {
			failed++
		}
	}
	if more < len(rec)/4 || failed > len(rec)/2000 {
		t.Errorf("%d of %d days differ by more than 3 degC from the day before; %d fail", more, len(rec), failed)
	}
}

// Around zero ground and its surface rest for weeks: water freezes. Air that
// does so is doubtful; so is ground that rests elsewhere.
func TestZeroCurtain(t *testing.T) {
	at := func(c float64, m Medium) Mask {
		rec := invented(1, 1)
		first := pipeline.DayOf(1996, time.September, 20)
		for d := first; d < first+25; d++ {
			rec.set(d, c, c)
		}
		return of(Daily(rec, Options{Medium: m}), first+12).Failed
	}
	for _, c := range []struct {
		c    float64
		m    Medium
		want Mask
	}{
		{0, Air, MaskOf(Persistence, Streak, Naught)},
		{-0.1, Air, MaskOf(Persistence, Streak)},
		{0, Surface, 0},
		{-0.2, Surface, 0},
		{0.3, Surface, MaskOf(Persistence, Streak)},
		{-17.8, Surface, MaskOf(Persistence, Streak, Naught)},
		{0, Soil, 0},
		{-4.3, Soil, 0},
	} {
		if got := at(c.c, c.m); got != c.want {
			t.Errorf("25 days at %v degC, medium %d: failed %q; want %q", c.c, c.m, got, c.want)
		}
	}
}

// Hard bounds: WMO guidelines (Zahumensky, 2004, second-hand).
func TestBounds(t *testing.T) {
	one := func(c float64, opt Options) pipeline.Quality {
		return Daily(Record{{Day: summer, MeanC: c, Observed: true}}, opt)[0].Mark
	}
	for _, c := range []struct {
		m         Medium
		low, high float64
	}{{Air, -80, 60}, {Surface, -80, 80}, {Soil, -50, 50}} {
		opt := Options{Medium: c.m}
		if one(c.low, opt) != pipeline.QualityGood || one(c.high, opt) != pipeline.QualityGood ||
			one(c.low-0.1, opt) != pipeline.QualityWrong || one(c.high+0.1, opt) != pipeline.QualityWrong {
			t.Errorf("medium %d: bounds are not %v to %v", c.m, c.low, c.high)
		}
	}
	if own := (Options{Bounds: &Bounds{-95, 40}}); one(-89.2, own) != pipeline.QualityGood || one(41, own) != pipeline.QualityWrong {
		t.Error("bounds of the caller's own do not hold")
	}
}

// A value beyond the hard bounds changes no other day's statistics: it counts as
// if it were not there.
func TestWrongValuesStayOut(t *testing.T) {
	rec := invented(1, 30)
	spoiled, without := slices.Clone(rec), slices.Clone(rec)
	for i := 3; i < len(rec); i += 40 {
		spoiled[i].MeanC, spoiled[i].MaxC, spoiled[i].MinC = 999, 999, -999
		without[i] = DayValue{Day: rec[i].Day}
	}
	a, b := Daily(spoiled, Options{}), Daily(without, Options{})
	for i := range a {
		if (i-3)%40 == 0 {
			if a[i].Mark != pipeline.QualityWrong || b[i].Mark != pipeline.QualityMissing || a[i].Failed != MaskOf(Range) {
				t.Fatalf("%+v, %+v", a[i], b[i])
			}
		} else if a[i] != b[i] {
			t.Fatalf("%+v beside wrong values, %+v beside none", a[i], b[i])
		}
	}
}

// A shift of all values leaves every test as it is that is one of differences.
func TestShiftedRecord(t *testing.T) {
	differences := MaskOf(Consistency, Step, Spike, Persistence, Streak, Gap, Climatology, LaggedRange, Neighbour)
	rapid.Check(t, func(t *rapid.T) {
		rec := faulty(t)
		by := float64(rapid.IntRange(-80, 80).Draw(t, "by")) / 8
		moved := slices.Clone(rec)
		for i := range moved {
			moved[i].MeanC += by
			moved[i].MaxC += by
			moved[i].MinC += by
		}
		opt := Options{Neighbours: []Record{near(rec, 1), near(rec, 2), near(rec, 3)}, Bounds: &Bounds{-500, 500}}
		a, b := Daily(rec, opt), Daily(moved, opt)
		for i := range a {
			if a[i].Tested != b[i].Tested || a[i].Failed&differences != b[i].Failed&differences {
				t.Fatalf("%s: %+v, moved by %v %+v", a[i].Day, a[i], by, b[i])
			}
		}
	})
}

// faulty draws a record of eights of a degree (exact in binary) with faults and holes.
func faulty(t *rapid.T) Record {
	rec := invented(rapid.Uint64Range(0, 3).Draw(t, "seed"), rapid.IntRange(1, 6).Draw(t, "years"))
	eights := func(c float64) float64 { return math.Round(c*8) / 8 }
	for range rapid.IntRange(0, 10).Draw(t, "faults") {
		i := rapid.IntRange(0, len(rec)-1).Draw(t, "day")
		by := float64(rapid.IntRange(-40, 40).Draw(t, "fault"))
		for j := i; j < min(len(rec), i+rapid.SampledFrom([]int{1, 2, 22}).Draw(t, "days")); j++ {
			rec[j].MeanC, rec[j].MaxC = rec[i].MeanC+by, rec[i].MaxC+by
			rec[j].Observed = rec[j].Observed && by != 0
		}
	}
	for i := range rec {
		rec[i].MeanC, rec[i].MaxC, rec[i].MinC = eights(rec[i].MeanC), eights(rec[i].MaxC), eights(rec[i].MinC)
	}
	return rec
}

// What MayChange rules out does not change, whatever a day's values become.
func TestMayChange(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		rec := faulty(t)
		opt := Options{Neighbours: []Record{near(rec, 1)}, LeastNeighbours: 1}
		i := rapid.IntRange(0, len(rec)-1).Draw(t, "changed")
		other := slices.Clone(rec)
		other[i] = DayValue{Day: rec[i].Day}
		if rapid.Bool().Draw(t, "value") {
			c := float64(rapid.IntRange(-100, 100).Draw(t, "c"))
			other[i] = DayValue{Day: rec[i].Day, MeanC: c, MaxC: c + 3, MinC: c - 3, HasMax: true, HasMin: true, Observed: true}
		}
		a, b := Daily(rec, opt), Daily(other, opt)
		for j := range a {
			if a[j] != b[j] && !MayChange(rec[i].Day, rec[j].Day) {
				t.Fatalf("%s changed with %s: %+v, was %+v", rec[j].Day, rec[i].Day, b[j], a[j])
			}
		}
	})
	june, march := pipeline.DayOf(2010, time.June, 15), pipeline.DayOf(2003, time.March, 3)
	if MayChange(june, march) || MayChange(march, june) {
		t.Error("March and June have nothing to do with one another")
	}
}

// The climatology of a date by the definition: all values within 7 dates of it
// in the calendar with a 29 February, over the turn of the year too.
func TestClimatologyByDefinition(t *testing.T) {
	rec := invented(3, 12)
	rec.set(pipeline.DayOf(2000, time.February, 29), 10, 16)
	rec.set(pipeline.DayOf(2001, time.January, 2), 9, 15)
	rec.set(pipeline.DayOf(2003, time.March, 1), -75, -68)
	places := map[pipeline.Day]int{}
	for _, v := range rec {
		_, m, day := v.Day.Date()
		places[v.Day] = time.Date(2000, m, day, 0, 0, 0, 0, time.UTC).YearDay()
	}
	calendar := func(d pipeline.Day) int { return places[d] }
	failed := 0
	for i, o := range Daily(rec, Options{}) {
		if i%29 != 0 && !o.Failed.Has(Climatology) {
			continue // a sample of the others is enough
		}
		want := false
		for _, of := range []func(v DayValue) float64{
			func(v DayValue) float64 { return v.MeanC }, func(v DayValue) float64 { return v.MaxC }, func(v DayValue) float64 { return v.MinC },
		} {
			var v []float64
			for _, r := range rec {
				apart := (calendar(r.Day) - calendar(o.Day) + 366) % 366
				if apart <= 7 || apart >= 366-7 {
					v = append(v, of(r))
				}
			}
			mean, sd, ok := biweight(sorted(v))
			want = want || ok && math.Abs(of(rec[i])-mean) >= 6*sd
		}
		if o.Failed.Has(Climatology) != want {
			t.Errorf("%s: failed %t; by the definition %t", o.Day, !want, want)
		}
		if want {
			failed++
		}
	}
	if failed != 3 {
		t.Errorf("%d failed; three were planted", failed)
	}
}

func TestMarks(t *testing.T) {
	for _, c := range []struct {
		name string
		v    DayValue
		want pipeline.Quality
	}{
		{"nothing", DayValue{}, pipeline.QualityMissing},
		{"interpolated", DayValue{MeanC: 4}, pipeline.QualityMissing},
		{"only a maximum", DayValue{MaxC: 4, HasMax: true}, pipeline.QualityGood},
		{"only a minimum, beyond", DayValue{MinC: -81, HasMin: true}, pipeline.QualityWrong},
		{"flat", DayValue{MeanC: 4, Observed: true, MaxC: 4, HasMax: true, MinC: 4, HasMin: true}, pipeline.QualityDoubtful},
		{"within tolerance", DayValue{MeanC: 4, Observed: true, MaxC: 4, HasMax: true, MinC: 5, HasMin: true}, pipeline.QualityGood},
		{"beyond tolerance", DayValue{MeanC: 4, Observed: true, MaxC: 4, HasMax: true, MinC: 5.25, HasMin: true}, pipeline.QualityInconsistent},
	} {
		c.v.Day = summer
		if got := Daily(Record{c.v}, Options{})[0]; got.Mark != c.want || got.Day != summer || got.Failed&^got.Tested != 0 {
			t.Errorf("%s: %+v; want %s", c.name, got, c.want)
		}
	}
	if out := Daily(nil, Options{}); len(out) != 0 {
		t.Error(out)
	}
}

// Holes in the record are nobody's fault: neither steps nor streaks go across.
func TestHoles(t *testing.T) {
	var rec Record
	for i := range 30 {
		rec = append(rec, DayValue{Day: summer + pipeline.Day(2*i), MeanC: 5, Observed: true})
	}
	rec = append(rec, DayValue{Day: summer + 400, MeanC: -40, Observed: true})
	for _, o := range Daily(rec, Options{}) {
		if o.Mark != pipeline.QualityGood || o.Tested.Has(Step) {
			t.Errorf("%+v", o)
		}
	}
}

// With fewer neighbours than it takes the test is not made.
func TestFewNeighbours(t *testing.T) {
	rec := invented(1, 10)
	two := []Record{near(rec, 1), near(rec, 2)}
	v := rec.at(pipeline.DayOf(2004, time.July, 3))
	rec.set(v.Day, v.MinC-14, v.MaxC-14)
	if o := of(Daily(rec, Options{Neighbours: two}), v.Day); o.Tested.Has(Neighbour) {
		t.Error("tested with two")
	}
	if o := of(Daily(rec, Options{Neighbours: two, LeastNeighbours: 2}), v.Day); !o.Failed.Has(Neighbour) {
		t.Error("not tested with two that were allowed")
	}
	strange := []Record{invented(7, 10), invented(8, 10), invented(9, 10)}
	tested := 0
	for _, o := range Daily(rec, Options{Neighbours: strange}) {
		if o.Tested.Has(Neighbour) {
			tested++
		}
	}
	if tested != 0 {
		t.Errorf("tested %d days against stations that have nothing to do with it", tested)
	}
	// a front that comes a day later there
	late := make([]Record, 3)
	for k := range late {
		late[k] = near(rec, k)
		for i := len(rec) - 1; i > 0; i-- {
			late[k][i].MeanC = late[k][i-1].MeanC
		}
	}
	for _, o := range Daily(invented(1, 10), Options{Neighbours: late}) {
		if o.Failed.Has(Neighbour) {
			t.Errorf("%s fails since its neighbours have it a day later", o.Day)
		}
	}
}

func mustPanic(t *testing.T, text string, f func()) {
	t.Helper()
	defer func() {
		t.Helper()
		if got := fmt.Sprint(recover()); !strings.Contains(got, text) || !strings.HasPrefix(got, "quality: ") {
			t.Errorf("panic %q; want one of this package with %q", got, text)
		}
	}()
	f()
}

func TestDailyRefuses(t *testing.T) {
	day := func(d pipeline.Day, c float64) DayValue { return DayValue{Day: d, MeanC: c, Observed: true} }
	mustPanic(t, "in order", func() { Daily(Record{day(2, 1), day(2, 1)}, Options{}) })
	mustPanic(t, "not a temperature", func() { Daily(Record{day(2, math.NaN())}, Options{}) })
	mustPanic(t, "not a temperature", func() { Daily(Record{day(2, math.Inf(1))}, Options{}) })
	mustPanic(t, "medium", func() { Daily(nil, Options{Medium: 9}) })
	mustPanic(t, "no bounds", func() { Daily(nil, Options{Bounds: &Bounds{5, 5}}) })
	mustPanic(t, "the least", func() { Daily(nil, Options{LeastNeighbours: -1}) })
	bad := Options{Neighbours: []Record{{day(2, 1), day(1, 1)}}, LeastNeighbours: 1}
	mustPanic(t, "neighbour 1", func() { Daily(Record{day(5, 1)}, bad) })
}
