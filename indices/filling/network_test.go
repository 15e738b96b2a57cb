package filling

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// invented returns an invented network of two stations over some years from 1 July
// 2000: the neighbour's departures are first-order autoregressive (sd 4 degC, 0.7
// from day to day); the target's are slope times them and errors of their own (sd
// s, 0.6 from day to day, and a bias a season of sd b).
func invented(seed uint64, years int, slope, s, b float64) (target, neighbour []Point) {
	random := rand.New(rand.NewPCG(seed, 1))
	first, last := pipeline.DayOf(2000, 7, 1), pipeline.DayOf(2000+years, 6, 30)
	x, e, bias := 4*random.NormFloat64(), s*random.NormFloat64(), 0.0
	for d := first; d <= last; d++ {
		_, month, day := d.Date()
		if month == time.January && day == 1 || d == first {
			bias = b * random.NormFloat64()
		}
		normal := -5 + 17*math.Cos(2*math.Pi*float64(d-first-20)/365.25)
		target = append(target, Point{d, normal + slope*x + e + bias})
		neighbour = append(neighbour, Point{d, normal - 3 + x})
		x = 0.7*x + 4*math.Sqrt(1-0.49)*random.NormFloat64()
		e = 0.6*e + s*math.Sqrt(1-0.36)*random.NormFloat64()
	}
	return target, neighbour
}

// What Fit finds in a network is what the network was made with.
func TestFitFindsTheNetwork(t *testing.T) {
	const slope, s, b = 0.8, 1.5, 0.6
	target, neighbour := invented(11, 40, slope, s, b)
	opt := Usual()
	opt.LeastR = 0.8
	m := Fit(target, []Neighbour{{"N", neighbour}}, opt)
	months, ok := m.Months("N")
	if !ok {
		t.Fatal("neighbour not known")
	}
	var bias, sd, biasSD, r1, r3, mean float64
	for _, month := range months {
		if !month.Usable || month.Years < 39 {
			t.Errorf("month %+v is not usable", month)
		}
		near(t, "slope", month.Slope, slope, 0.06)
		bias += month.Spread.BiasC / 12
		sd, biasSD = sd+square(month.Spread.SDC)/12, biasSD+square(month.Spread.BiasSDC)/12
		r1, r3 = r1+month.Spread.R[1]/12, r3+month.Spread.R[3]/12
		mean += square(month.Spread.SEC()) / 12
	}
	near(t, "bias", bias, 0, 0.05)
	near(t, "s", math.Sqrt(sd), s, 0.08)
	near(t, "bias of years", math.Sqrt(biasSD), b, 0.15)
	near(t, "error of a day", math.Sqrt(mean), math.Hypot(s, b), 0.08)
	near(t, "r_1", r1, 0.6, 0.04)
	near(t, "r_3", r3, 0.216, 0.05)
	for _, month := range m.ClimateMonths() {
		// departures of the target itself
		near(t, "climate", month.Spread.SEC(), math.Sqrt(square(slope*4)+s*s+b*b), 0.6)
	}
}

// On a network whose errors are as the method takes them, 95.45 % of indices lie
// within two standard errors; the tolerances are three standard errors for the
// number of tries that can be called independent: 23 seasons of three parts, in each
// of which errors of ten days reach as far as leaves room for two, or for one gap of 30.
func TestExperimentOnInventedNetwork(t *testing.T) {
	within, tried := map[string]float64{}, map[string]float64{}
	squares, variance := map[string]float64{}, map[string]float64{}
	target, neighbour := invented(20, 24, 0.8, 1.5, 0.5)
	o := Experiment(target, []Neighbour{{"N", neighbour}}, Trial{Kind: pipeline.Thaw, Starts: pipeline.MonthDay{Month: 1, Day: 15},
		Options: Usual(), Blocks: []int{2, 10, 30}, Repeats: 46, Seed: 1})
	if len(o.Seasons) != 23 || o.Removed == 0 {
		t.Fatalf("%d seasons, %d days removed", len(o.Seasons), o.Removed)
	}
	for i := range o.Cells {
		c := &o.Cells[i]
		if c.Part == Winter {
			continue
		}
		name, n := fmt.Sprintf("%s, gaps of %d", c.Rung, c.Block), float64(c.Tried())
		within[name], tried[name] = within[name]+float64(c.Within), tried[name]+n
		squares[name], variance[name] = squares[name]+n*square(c.RMSEC), variance[name]+n*square(c.SEC)
	}
	for name, separate := range map[string]float64{
		"line, gaps of 2": 138, "neighbour, gaps of 2": 138, "climate, gaps of 2": 138,
		"neighbour, gaps of 10": 138, "climate, gaps of 10": 138, "neighbour, gaps of 30": 69, "climate, gaps of 30": 69,
	} {
		ratio := math.Sqrt(squares[name] / variance[name])
		near(t, name+": coverage", within[name]/tried[name], 0.9545, 3*math.Sqrt(0.9545*0.0455/separate))
		near(t, name+": error over standard error", ratio, 1, 3/math.Sqrt(2*separate))
		t.Logf("%s: %.0f of %.0f, error over standard error %.3f", name, within[name], tried[name], ratio)
		delete(tried, name)
	}
	if len(tried) > 0 {
		t.Errorf("also tried: %v", tried)
	}
}

// A tally counts what is within two standard errors, and leaves out what weighs nothing.
func TestTally(t *testing.T) {
	var sum tally
	for _, v := range [][2]float64{{1.9, 1}, {-2.1, 1}, {0, 1}, {0.01, 0.01}, {3, 0}} {
		sum.add(v[0], v[1])
	}
	c := sum.cell(cellKey{block: 10}, [places]Part{}, 2)
	if c.Repeats != 5 || c.Untouched != 1 || c.Within != 2 || c.Tried() != 4 || c.Weighs() || !c.Outside() {
		t.Errorf("%+v", c)
	}
	near(t, "bias", c.BiasC, 2.8/4, 1e-12)
	near(t, "rmse", c.RMSEC, math.Sqrt((1.9*1.9+2.1*2.1+9)/4), 1e-12)
	near(t, "width", c.WidthC, 3, 1e-12)
}

// The same seed gives the same outcome; another chooses other days.
func TestExperimentIsRepeatable(t *testing.T) {
	target, _ := invented(5, 8, 1, 2, 0.5)
	trial := Trial{Kind: pipeline.Freeze, Starts: pipeline.MonthDay{Month: 7, Day: 15}, Options: Usual(), Blocks: []int{3}, Repeats: 20, Seed: 1}
	a, b := Experiment(target, nil, trial), Experiment(target, nil, trial)
	if d := cmp.Diff(a, b); d != "" {
		t.Errorf("(-first +second):\n%s", d)
	}
	trial.Seed = 2
	if cmp.Diff(a, Experiment(target, nil, trial)) == "" {
		t.Error("another seed gave the same outcome")
	}
	if a.Removed == 0 || len(a.Seasons) != 7 || a.Seasons[0] != "2000-01" {
		t.Errorf("%d days removed, seasons %v", a.Removed, a.Seasons)
	}
}

// Adding a constant to a neighbour changes nothing; nor does multiplying its
// values. Multiplying the target's multiplies estimate and error.
func TestFillProperties(t *testing.T) {
	target, neighbour := invented(3, 5, 0.9, 1, 0.3)
	opt := Usual()
	plain := Fit(target, []Neighbour{{"N", neighbour}}, opt)
	changed := func(points []Point, by, plus float64) []Point {
		out := make([]Point, len(points))
		for i, p := range points {
			out[i] = Point{p.Day, by*p.MeanC + plus}
		}
		return out
	}
	rapid.Check(t, func(t *rapid.T) {
		by, plus := rapid.Float64Range(0.2, 5).Draw(t, "by"), rapid.Float64Range(-30, 30).Draw(t, "plus")
		d := target[rapid.IntRange(0, len(target)-1).Draw(t, "day")].Day
		x := rapid.Float64Range(-40, 30).Draw(t, "mean")
		want, wantSE, _, ok := plain.Fill(d, []NeighbourMean{{"N", x}})
		if !ok {
			t.Fatal("not filled")
		}
		same := func(what string, m *Model, x, by float64) {
			got, se, name, ok := m.Fill(d, []NeighbourMean{{"N", x}})
			if !ok || name != "N" || math.Abs(got-by*want) > 1e-8*(1+math.Abs(by*want)) || math.Abs(se-by*wantSE) > 1e-8*by {
				t.Fatalf("%s: %v (%v), %v %q; want %v (%v)", what, got, se, ok, name, by*want, by*wantSE)
			}
		}
		same("neighbour changed", Fit(target, []Neighbour{{"N", changed(neighbour, by, plus)}}, opt), by*x+plus, 1)
		same("target scaled", Fit(changed(target, by, 0), []Neighbour{{"N", neighbour}}, opt), x, by)
	})
}

// Nothing is filled from a neighbour without a value, without enough common days,
// without enough of a correlation, or that is unknown.
func TestFillSaysNo(t *testing.T) {
	target, neighbour := invented(3, 6, 0.9, 1, 0.3)
	other, _ := invented(99, 6, 1, 1, 0)
	d := pipeline.DayOf(2003, 7, 10)
	x := []NeighbourMean{{"N", 8}}
	for _, c := range []struct {
		name       string
		neighbours []Neighbour
		means      []NeighbourMean
		ok         bool
	}{
		{"as it should be", []Neighbour{{"N", neighbour}}, x, true},
		{"no mean", []Neighbour{{"N", neighbour}}, nil, false},
		{"no neighbour", nil, x, false},
		{"another's mean", []Neighbour{{"N", neighbour}}, []NeighbourMean{{"M", 8}}, false},
		{"no common day", []Neighbour{{"N", nil}}, x, false},
		{"too few years", []Neighbour{{"N", neighbour[:3*365]}}, x, false},
		{"nothing in common but the course of the year", []Neighbour{{"N", other}}, x, false},
	} {
		_, se, station, ok := Fit(target, c.neighbours, Usual()).Fill(d, c.means)
		if ok != c.ok || ok != (station == "N") || ok != (se > 0) {
			t.Errorf("%s: ok %v, station %q, error %v", c.name, ok, station, se)
		}
	}
	strict := Usual()
	strict.LeastR = 0.999
	if _, _, _, ok := Fit(target, []Neighbour{{"N", neighbour}}, strict).Fill(d, x); ok {
		t.Error("filled with too low a correlation")
	}
	if _, _, ok := Fit(target[:2*365], nil, Usual()).FillClimate(d); ok {
		t.Error("a climate of two years")
	}
	if _, _, ok := Fit(nil, nil, Usual()).FillClimate(d); ok {
		t.Error("a climate of nothing")
	}
}

// Each year is estimated without itself: four years of constant temperature, 3 and
// 1 degC below and above their mean, are each off by 4/3 of that, and all their
// error is the year's bias, of which no more than the share mostShare is said to be.
func TestYearsAreLeftOut(t *testing.T) {
	var points []Point
	for y := 2001; y <= 2004; y++ {
		for d := pipeline.DayOf(y, 4, 1); d < pipeline.DayOf(y, 10, 1); d++ {
			points = append(points, Point{d, float64(2*(y-2001) - 3)})
		}
	}
	m := Fit(points, nil, Usual())
	mean, se, ok := m.FillClimate(pipeline.DayOf(2003, 7, 10))
	if !ok {
		t.Fatal("not filled")
	}
	near(t, "mean", mean, 0, 1e-9)
	near(t, "error", se, 4.0/3*math.Sqrt(5), 1e-9)
	july := m.ClimateMonths()[6].Spread
	near(t, "bias of years", july.BiasSDC, math.Sqrt(0.9*5)*4/3, 1e-9)
	near(t, "bias", july.BiasC, 0, 1e-9)
}

// Of two neighbours the nearer in its errors fills, and the other where it has no value.
func TestFillTakesTheBest(t *testing.T) {
	target, far := invented(3, 8, 0.9, 1.5, 0.3)
	random := rand.New(rand.NewPCG(1, 1))
	nearer := make([]Point, len(target))
	for i, p := range target {
		nearer[i] = Point{p.Day, p.MeanC + 0.5*random.NormFloat64()}
	}
	m := Fit(target, []Neighbour{{"FAR", far}, {"NEAR", nearer}}, Usual())
	d := pipeline.DayOf(2003, 7, 10)
	for _, c := range []struct {
		means []NeighbourMean
		want  string
	}{{[]NeighbourMean{{"FAR", 8}, {"NEAR", 9}}, "NEAR"}, {[]NeighbourMean{{"NEAR", 9}, {"FAR", 8}}, "NEAR"}, {[]NeighbourMean{{"FAR", 8}}, "FAR"}} {
		if _, _, got, ok := m.Fill(d, c.means); !ok || got != c.want {
			t.Errorf("%v: filled from %q; want %s", c.means, got, c.want)
		}
	}
}

// Whatever the record, no NaN and no infinity comes out.
func TestAlwaysFinite(t *testing.T) {
	opt := Options{LineDays: 3, LeastDays: 1, LeastYears: 2, LeastR: -1}
	rapid.Check(t, func(t *rapid.T) {
		series := func(name string) []Point {
			var out []Point
			values := rapid.SliceOfN(rapid.SampledFrom([]float64{-1e6, -20, 0, 0, 0.1, 1e6, 7}), 4, 12).Draw(t, name)
			step := rapid.IntRange(1, 40).Draw(t, name+" step")
			for i := range 120 {
				out = append(out, Point{pipeline.Day(i*step + i*i%step), values[i%len(values)]})
			}
			return out
		}
		target, neighbour := series("target"), []Neighbour{{"N", series("neighbour")}}
		m := Fit(target, neighbour, opt)
		first, meanC := pipeline.Day(300), make([]float64, 365)
		fills := m.Ladder(first, first+364, target, neighbour, true)
		for _, f := range fills {
			meanC[f.Day-first] = f.MeanC
		}
		e := m.IndexError(pipeline.Thaw, 0, first, meanC, fills)
		months, _ := m.Months("N")
		all := []float64{e.CurveC, e.CurveSEC, e.SumC, e.SumSEC}
		for _, month := range append(months[:], m.climate.months[:]...) {
			s := month.Spread
			all = append(append(all, month.R, month.RDepartures, month.Slope, month.InterceptC, s.BiasC, s.SDC, s.BiasSDC), s.R[:]...)
		}
		for _, f := range fills {
			all = append(all, f.MeanC, f.SEC)
		}
		for i, v := range all {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				t.Fatalf("value %d is %v", i, v)
			}
		}
	})
}

func TestFitRefuses(t *testing.T) {
	bad := func(points ...Point) func() {
		return func() { Fit(points, nil, Usual()) }
	}
	mustPanic(t, "in order", bad(Point{2, 1}, Point{1, 1}))
	mustPanic(t, "not a temperature", bad(Point{1, math.NaN()}))
	mustPanic(t, "twice", func() { Fit(nil, []Neighbour{{"A", nil}, {"A", nil}}, Usual()) })
	mustPanic(t, "limits", func() { Fit(nil, nil, Options{LineDays: 9}) })
}

func BenchmarkFit(b *testing.B) {
	target, neighbour := invented(3, 30, 0.9, 1, 0.3)
	for b.Loop() {
		Fit(target, []Neighbour{{"N", neighbour}}, Usual())
	}
}

func BenchmarkIndexErrorAtAnEdge(b *testing.B) {
	m, days, fills := alike(4, 0.7, 1), season(9, -11), byClimate(105, 30)
	for b.Loop() {
		m.IndexError(pipeline.Thaw, 0, firstDay, days, fills)
	}
}

// normals returns a generator of standard normal values.
func normals(seed uint64) func() float64 { return rand.New(rand.NewPCG(seed, 2)).NormFloat64 }
