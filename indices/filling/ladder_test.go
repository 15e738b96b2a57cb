package filling

import (
	"math"
	"testing"
	"time"

	"thawledger/pipeline"
)

// without returns a series less the days from first through last.
func without(points []Point, first, last pipeline.Day) []Point {
	var out []Point
	for _, p := range points {
		if p.Day < first || p.Day > last {
			out = append(out, p)
		}
	}
	return out
}

// Short gaps go on a line, longer ones to the neighbour, and what it lacks to the
// climate if that is allowed.
func TestLadder(t *testing.T) {
	target, neighbour := invented(3, 6, 0.9, 1, 0.3)
	short, long := pipeline.DayOf(2003, 7, 10), pipeline.DayOf(2003, 8, 1)
	target = without(without(target, short, short+1), long, long+4)
	neighbour = without(neighbour, long+3, long+3)
	neighbours := []Neighbour{{"N", neighbour}}
	m := Fit(target, neighbours, Usual())
	all := m.Ladder(short-10, long+20, target, neighbours, true)
	want := []struct {
		day        pipeline.Day
		rung       Rung
		gap, place int
	}{
		{short, ByLine, 2, 1}, {short + 1, ByLine, 2, 2}, {long, ByNeighbour, 5, 1}, {long + 1, ByNeighbour, 5, 2},
		{long + 2, ByNeighbour, 5, 3}, {long + 3, ByClimate, 5, 4}, {long + 4, ByNeighbour, 5, 5},
	}
	if len(all) != len(want) {
		t.Fatalf("%+v", all)
	}
	for i, w := range want {
		f := all[i]
		if f.Day != w.day || f.Rung != w.rung || f.Gap != w.gap || f.Place != w.place || f.SEC <= 0 || (f.Neighbour == "N") != (w.rung == ByNeighbour) {
			t.Errorf("%+v; want %+v", f, w)
		}
	}
	i, _ := at(target, short)
	near(t, "a third of the way", all[0].MeanC, target[i-1].MeanC+(target[i].MeanC-target[i-1].MeanC)/3, 1e-12)
	if n := len(m.Ladder(short-10, long+20, target, neighbours, false)); n != 6 {
		t.Errorf("%d days filled without the climate; want 6", n)
	}
	// after the record's end there is nothing to draw a line to
	end := target[len(target)-1].Day
	if f := m.Ladder(end+1, end+1, target, nil, true); len(f) != 1 || f[0].Rung != ByClimate || f[0].Gap != 0 {
		t.Errorf("after the end: %+v", f)
	}
}

// A day on a line between two others misses by half the second difference: for
// independent days of standard deviation s the mean square is 1.5 s^2. For gaps
// of two the errors are e1 = (2 a + d)/3 - b and e2 = (a + 2 d)/3 - c: mean squares
// (4 + 1 + 9)/9 s^2, mean product (2 + 2)/9 s^2.
func TestLineErrors(t *testing.T) {
	target, _ := invented(8, 30, 0, 2, 0)
	random := normals(8)
	for i := range target {
		target[i].MeanC = 2 * random()
	}
	l := linesOf(target, 2)
	for m := range l {
		near(t, "one day", l[m][0].C[0][0], 6, 0.6)
		near(t, "first of two", l[m][1].C[0][0], 4*14.0/9, 0.6)
		near(t, "both of two", l[m][1].C[0][1], 4*4.0/9, 0.5)
	}
	// a gap of two as a whole, through the model
	model := Fit(target, nil, Usual())
	days := season(12, -15)
	f := []Filled{{Day: firstDay + 200, Rung: ByLine, Gap: 2, Place: 1}, {Day: firstDay + 201, Rung: ByLine, Gap: 2, Place: 2}}
	near(t, "sum of two", model.IndexError(pipeline.Thaw, 0, firstDay, days, f).CurveSEC, 2*math.Sqrt(2*14.0/9+2*4.0/9), 0.25)
	if _, _, ok := model.FillLine(target[0], target[4], target[2].Day); ok {
		t.Error("a line over three days")
	}
}

// A normal is the mean within 15 days of the month and day, whatever the year's
// length: 1 March lies as far from 14 February in leap years as in others.
func TestNormalByMonthAndDay(t *testing.T) {
	var points []Point
	for y := 2001; y <= 2012; y++ {
		for d := pipeline.DayOf(y, 1, 1); d <= pipeline.DayOf(y, 12, 31); d++ {
			_, month, day := d.Date()
			c := 0.0
			if month == time.March && day == 16 {
				c = 31
			}
			points = append(points, Point{d, c})
		}
	}
	m := Fit(points, nil, Usual())
	for _, y := range []int{2003, 2004} {
		for date, want := range map[pipeline.Day]float64{
			pipeline.DayOf(y, 3, 16): 1, pipeline.DayOf(y, 3, 1): 1, pipeline.DayOf(y, 3, 31): 1, pipeline.DayOf(y, 4, 1): 0, pipeline.DayOf(y, 2, 28): 0,
		} {
			got, _, ok := m.FillClimate(date)
			// three leap days in twelve years make dates before 16 March count some days less
			if !ok || math.Abs(got-want) > 0.03*want {
				t.Errorf("%s: %v, %v; want %v", date, got, ok, want)
			}
		}
	}
}

// The value of the interval at 8 of 10 is that of the formula's closed form,
// computed independently in Python.
func TestWilson(t *testing.T) {
	low, high := Wilson(0.8, 10)
	near(t, "low", low, 0.490162, 1e-6)
	near(t, "high", high, 0.943318, 1e-6)
	if low, high := Wilson(0, 0); low != 0 || high != 1 {
		t.Errorf("of nothing: %v to %v", low, high)
	}
	if low, high := Wilson(1, 50); high != 1 || low < 0.9 {
		t.Errorf("all of 50: %v to %v", low, high)
	}
}
