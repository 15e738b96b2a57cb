package filling

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// alike returns a model whose climate errors have a standard deviation s and
// correlations r^k up to MostLag, about a bias between years of standard
// deviation b, all year.
func alike(s, r, b float64) *Model {
	m := &Model{climate: &regression{}, lines: &lines{}}
	for i := range m.climate.spreads.months {
		p := &m.climate.spreads.months[i]
		p.SDC, p.BiasSDC = s, b
		for k := range p.R {
			p.R[k] = math.Pow(r, float64(k))
		}
	}
	for i := range m.climate.spreads.se {
		m.climate.spreads.se[i] = math.Sqrt(s*s + b*b)
	}
	return m
}

// season returns a year of means: warmC from day 120 to 270, coldC otherwise.
func season(warmC, coldC float64) []float64 {
	out := make([]float64, 365)
	for i := range out {
		out[i] = coldC
		if 120 <= i && i < 270 {
			out[i] = warmC
		}
	}
	return out
}

var firstDay = pipeline.DayOf(2031, 1, 15)

func byClimate(from, n int) []Filled {
	out := make([]Filled, n)
	for i := range out {
		out[i] = Filled{Day: firstDay + pipeline.Day(from+i), Rung: ByClimate}
	}
	return out
}

// s^2 [m + 2 sum (m-k) r^k] in closed form is s^2 [m (1+r)/(1-r) - 2 r (1-r^m)/(1-r)^2].
func closedForm(s, r float64, m int) float64 {
	f := float64(m)
	return s * s * (f*(1+r)/(1-r) - 2*r*(1-math.Pow(r, f))/square(1-r))
}

// With a correlation of 0.7 from day to day, ten days are off by 2.04 times what
// ten independent errors would give.
func TestErrorOfOneGap(t *testing.T) {
	near(t, "ratio by hand", math.Sqrt(closedForm(1, 0.7, 10)/10), 2.038, 0.001)
	days := season(12, -15)
	for _, c := range []struct {
		s, r, b float64
		m       int
	}{{1, 0, 0, 10}, {1, 0.7, 0, 10}, {3, 0.7, 0, 30}, {3, 0.5, 1, 20}, {2, 0, 0.5, 3}} {
		got := alike(c.s, c.r, c.b).IndexError(pipeline.Thaw, 0, firstDay, days, byClimate(180, c.m))
		want := math.Sqrt(closedForm(c.s, c.r, c.m) + square(float64(c.m)*c.b))
		near(t, fmt.Sprintf("%+v: curve", c), got.CurveSEC, want, 1e-9)
		near(t, fmt.Sprintf("%+v: sum", c), got.SumSEC, want, 0.03*want) // 12 degC is 4 standard errors from 0
		near(t, "index", got.CurveC, 150*12, 1e-9)
	}
}

// Two gaps have their bias in common, and what correlation their distance leaves.
func TestErrorOfTwoGaps(t *testing.T) {
	got := alike(2, 0.7, 0.5).IndexError(pipeline.Thaw, 0, firstDay, season(15, -15), append(byClimate(130, 5), byClimate(200, 5)...))
	near(t, "curve", got.CurveSEC, math.Sqrt(2*closedForm(2, 0.7, 5)+square(10*0.5)), 1e-9)
}

// A freezing index is the thawing index of the mirrored temperatures, error included.
func TestErrorMirrored(t *testing.T) {
	m := alike(4, 0.7, 1)
	days := season(9, -11)
	mirrored := make([]float64, len(days))
	for i, c := range days {
		mirrored[i] = -c
	}
	fills := byClimate(110, 20)
	a, b := m.IndexError(pipeline.Thaw, 0, firstDay, days, fills), m.IndexError(pipeline.Freeze, 0, firstDay, mirrored, fills)
	if a != b {
		t.Errorf("thaw %+v, freeze of the mirror %+v", a, b)
	}
}

// Filled days in the depth of winter do not touch the index; without filled days
// it is that of package degreeday.
func TestErrorOutsideTheSeason(t *testing.T) {
	days := season(12, -15)
	want := degreeday.Rise(days)
	m := alike(3, 0.7, 0.5)
	for _, fills := range [][]Filled{nil, byClimate(10, 20)} {
		got := m.IndexError(pipeline.Thaw, 0, firstDay, days, fills)
		near(t, "curve", got.CurveC, want.ToDate[364], 1e-9)
		near(t, "its error", got.CurveSEC, 0, 1e-9)
		near(t, "sum", got.SumC, want.Sum[364], 1e-3)
		near(t, "its error", got.SumSEC, 0, 0.01)
	}
}

// Where low or high lie in the gap, index and error against 20,000 drawn years
// that are worked out by package degreeday, with errors drawn otherwise: one after
// the other.
func TestErrorAtTheEdges(t *testing.T) {
	const s, r, b = 4.5, 0.75, 1.0
	m := alike(s, r, b)
	days := make([]float64, 365)
	for i := range days {
		days[i] = -5 + 17*math.Cos(2*math.Pi*float64(i-180)/365)
	}
	for _, from := range []int{75, 100, 245, 265} {
		fills := byClimate(from, 30)
		got := m.IndexError(pipeline.Thaw, 0, firstDay, days, fills)
		random := rand.New(rand.NewPCG(7, uint64(from)))
		var track degreeday.Track
		x := make([]float64, len(days))
		n, sum, squares, sumS, squaresS := 20000.0, 0.0, 0.0, 0.0, 0.0
		base := degreeday.Rise(days)
		for range int(n) {
			copy(x, days)
			e, bias := s*random.NormFloat64(), b*random.NormFloat64()
			for i := range 30 {
				if i > 0 {
					e = r*e + s*math.Sqrt(1-r*r)*random.NormFloat64()
				}
				x[from+i] += e + bias
			}
			track.Rise(x)
			d, dS := track.ToDate[364]-base.ToDate[364], track.Sum[364]-base.Sum[364]
			sum, squares, sumS, squaresS = sum+d, squares+d*d, sumS+dS, squaresS+dS*dS
		}
		sd, sdS := math.Sqrt(squares/n-square(sum/n)), math.Sqrt(squaresS/n-square(sumS/n))
		name := fmt.Sprintf("gap from %d: ", from)
		near(t, name+"curve", got.CurveC, base.ToDate[364]+sum/n, 0.05*sd)
		// from 265 on few years touch the index, and far: less well known
		near(t, name+"curve's error", got.CurveSEC, sd, max(0.05*sd, 1))
		near(t, name+"sum", got.SumC, base.Sum[364]+sumS/n, 0.03*sdS)
		near(t, name+"sum's error", got.SumSEC, sdS, 0.03*sdS)
	}
}

func TestIndexErrorRefuses(t *testing.T) {
	m := alike(1, 0, 0)
	mustPanic(t, "neither thaw nor freeze", func() { m.IndexError("melt", 0, firstDay, season(1, -1), nil) })
	mustPanic(t, "in order", func() {
		m.IndexError(pipeline.Thaw, 0, firstDay, season(1, -1), append(byClimate(9, 1), byClimate(8, 1)...))
	})
	mustPanic(t, "place 0 of a gap", func() {
		m.IndexError(pipeline.Thaw, 0, firstDay, season(1, -1), []Filled{{Day: firstDay, Rung: ByLine}})
	})
	mustPanic(t, "does not have", func() {
		m.IndexError(pipeline.Thaw, 0, firstDay, season(1, -1), []Filled{{Day: firstDay, Rung: ByNeighbour, Neighbour: "X"}})
	})
}

func mustPanic(t *testing.T, text string, f func()) {
	t.Helper()
	defer func() {
		t.Helper()
		if got := fmt.Sprint(recover()); !strings.Contains(got, text) || !strings.HasPrefix(got, "filling: ") {
			t.Errorf("panic %q; want one of this package with %q", got, text)
		}
	}()
	f()
}
