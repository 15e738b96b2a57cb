package heat

import (
	"fmt"
	"math"

	"thawledger/indices/compensated"
)

const secondsPerDay = 86400

// Moment is the state at the end of one step of a series.
type Moment struct {
	ThawM  float64 // thawed ground from the surface down without a break of a cell, m
	FrostM float64 // frozen ground likewise, m
	// FrontM is the top of the ground that is frozen from there to the base, m:
	// the depth of thaw, and in autumn, under frost from above, the base of what
	// is left to freeze back; 0 where less than half a cell is. Where the base of the
	// column is thawed there is no such ground, and it is ThawM.
	FrontM float64
}

// Track is what a run has left behind.
type Track struct {
	Moments   []Moment // one a value of the series
	DeepestM  float64  // largest FrontM
	DeepestAt int      // its place in the series, from 0; -1 if nothing has thawed
}

// Run puts the surface at each temperature of a series in degC for stepS seconds,
// one after another, in as many equal steps of time as stability asks for.
func (c *Column) Run(surfaceC []float64, stepS float64) (Track, error) {
	if !(stepS >= 1 && stepS <= 366*secondsPerDay) {
		return Track{}, fmt.Errorf("values %g s apart; it has to be from 1 s to a year", stepS)
	}
	for i, t := range surfaceC {
		if !isTemperature(t) {
			return Track{}, fmt.Errorf("surface temperature %g degC at place %d", t, i)
		}
	}
	n := int(math.Ceil(stepS / c.maxStepS))
	out := Track{Moments: make([]Moment, len(surfaceC)), DeepestAt: -1}
	w := c.workspace()
	for i, t := range surfaceC {
		for range n {
			c.step(w, t, stepS/float64(n))
		}
		m := c.moment()
		out.Moments[i] = m
		if m.FrontM > out.DeepestM {
			out.DeepestM, out.DeepestAt = m.FrontM, i
		}
	}
	return out, nil
}

// workspace is what a step makes anew each time.
type workspace struct {
	tempC, thawed []float64
	up, down      []float64 // resistance from a cell's centre, or its front, to its top and base, m2 K/W
}

func (c *Column) workspace() *workspace {
	n := len(c.cells)
	all := make([]float64, 4*n)
	return &workspace{all[:n], all[n : 2*n], all[2*n : 3*n], all[3*n:]}
}

// step moves the column on by s seconds with the surface at a temperature.
func (c *Column) step(w *workspace, surfaceC, s float64) {
	n := len(c.cells)
	for i := range c.cells {
		w.tempC[i], w.thawed[i] = c.cells[i].state(c.h[i], c.rangeK)
	}
	for i := range c.cells {
		l, f := &c.cells[i], w.thawed[i]
		if f == 0 || f == 1 || c.rangeK > 0 {
			k := l.KFrozenWMK + f*(l.KThawedWMK-l.KFrozenWMK)
			w.up[i], w.down[i] = l.dx/(2*k), l.dx/(2*k)
			continue
		}
		above, below := surfaceC, c.belowC()
		if i > 0 {
			above = w.tempC[i-1]
		}
		if i < n-1 {
			below = w.tempC[i+1]
		}
		var edgeUp, edgeDown float64
		if i == 0 {
			edgeUp = s
		}
		if i == n-1 && c.bottom.kind == fixed {
			edgeDown = s
		}
		w.up[i], w.down[i] = l.toFront(f, above, below, edgeUp), l.toFront(f, below, above, edgeDown)
	}
	c.q[0] = s * (surfaceC - w.tempC[0]) / w.up[0]
	for i := 1; i < n; i++ {
		c.q[i] = s * (w.tempC[i-1] - w.tempC[i]) / (w.down[i-1] + w.up[i])
	}
	fromBase := c.base(w, s)
	c.q[n] = -fromBase
	for i := range c.cells {
		c.h[i] += (c.q[i] - c.q[i+1]) / c.cells[i].dx
	}
	c.in.Add(c.q[0])
	c.in.Add(fromBase)
}

// belowC is a temperature below the base: which side of 0 degC it is on is all that
// counts.
func (c *Column) belowC() float64 {
	switch c.bottom.kind {
	case fixed:
		return c.bottom.v
	case gradient:
		return 1 // heat comes from there
	}
	return 0
}

// leastShare keeps the front off the very edge of a cell, where nothing would
// resist. A hundredth of a cell is nothing that a grid can tell.
const leastShare = 0.01

// toFront is the resistance from one side of a partly thawed cell to its front, in
// m2 K/W: of the thawed ground if it is warm on that side, of the frozen ground if
// cold. If it is warm (cold) on both sides, there are two fronts, and each side has
// half of the thawed (frozen) ground.
//
// edgeS is not 0 at the surface, where a temperature is given at the cell's very
// edge: there the front moves, in these s seconds, by a multiple of what it has
// gone, and the mean resistance on the way is taken, which is exact for Stefan's
// problem: the front goes from f to sqrt(f2 + 2 k T s / (L dx2)).
func (l *cell) toFront(thawed, side, other, edgeS float64) float64 {
	share, k := thawed, l.KThawedWMK
	if side < 0 {
		share, k = 1-thawed, l.KFrozenWMK
	}
	if side != 0 && side > 0 == (other > 0) && other != 0 {
		share /= 2
	}
	if edgeS > 0 {
		share = (share + math.Sqrt(share*share+2*k*math.Abs(side)*edgeS/(l.LatentJM3*l.dx*l.dx))) / 2
	}
	return max(share, leastShare) * l.dx / k
}

// base returns the heat that comes in through the base in s seconds, J/m2.
func (c *Column) base(w *workspace, s float64) float64 {
	n := len(c.cells) - 1
	switch c.bottom.kind {
	case fixed:
		return s * (c.bottom.v - w.tempC[n]) / w.down[n]
	case gradient:
		l := &c.cells[n]
		return s * c.bottom.v * (l.KFrozenWMK + w.thawed[n]*(l.KThawedWMK-l.KFrozenWMK))
	}
	return 0
}

// moment finds the fronts, by the thawed shares of cells.
func (c *Column) moment() Moment {
	var m Moment
	thawed := func(i int) float64 {
		_, f := c.cells[i].state(c.h[i], c.rangeK)
		return f
	}
	n := len(c.cells)
	for i := 0; i < n && thawed(i) > 0; i++ {
		m.ThawM += thawed(i) * c.cells[i].dx
	}
	for i := 0; i < n && thawed(i) < 1; i++ {
		m.FrostM += (1 - thawed(i)) * c.cells[i].dx
	}
	low := n - 1 // lowest cell that is thawed for the most part
	for low >= 0 && thawed(low) < 0.5 {
		low--
	}
	switch low {
	case n - 1:
		m.FrontM = m.ThawM
		return m
	case -1:
		return m
	}
	m.FrontM = c.cells[low+1].top
	for i := low; i >= 0 && 0 < thawed(i) && thawed(i) < 1; i-- {
		m.FrontM -= (1 - thawed(i)) * c.cells[i].dx
	}
	for i := low + 1; i < n && thawed(i) > 0; i++ {
		m.FrontM += thawed(i) * c.cells[i].dx
	}
	return m
}

// Now returns the fronts as they are.
func (c *Column) Now() Moment { return c.moment() }

// TemperatureC returns the temperature at a depth in degC, on a straight line
// between the centres of cells; above the first and below the last centre it is
// that of the cell.
func (c *Column) TemperatureC(depthM float64) float64 {
	lastZ, lastT := math.Inf(-1), 0.0
	for i := range c.cells {
		l := &c.cells[i]
		z := l.top + l.dx/2
		t, _ := l.state(c.h[i], c.rangeK)
		if depthM <= z {
			if math.IsInf(lastZ, -1) {
				return t
			}
			return lastT + (t-lastT)*(depthM-lastZ)/(z-lastZ)
		}
		lastZ, lastT = z, t
	}
	return lastT
}

// HeatJM2 returns the heat of the column in J/m2, latent heat included.
func (c *Column) HeatJM2() float64 {
	var sum compensated.Sum
	for i := range c.cells {
		sum.Add(c.h[i] * c.cells[i].dx)
	}
	return sum.Value()
}

// LetInJM2 returns the heat let in through the surface and the base since New or
// Reset, J/m2: what HeatJM2 has risen by.
func (c *Column) LetInJM2() float64 { return c.in.Value() }

// SpunUp is how a spin-up ended.
type SpunUp struct {
	Years   int     // that were run
	ChangeK float64 // largest change of any cell's temperature from the last year's end to the one before
	MovedM  float64 // change of FrontM likewise, m
	Settled bool    // whether both are within the tolerance
	Track   Track   // of the last year
}

// SpinUp repeats a year of surface temperatures until the column's yearly change is
// below a tolerance: of no cell's temperature more than toleranceK, and of the front
// no more than a millimetre; or until maxYears are over. A column that is losing or
// making permafrost may take centuries: then it has not settled, and says so.
func (c *Column) SpinUp(yearC []float64, stepS, toleranceK float64, maxYears int) (SpunUp, error) {
	if len(yearC) == 0 || maxYears < 1 || !(toleranceK > 0 && toleranceK <= 10) {
		return SpunUp{}, fmt.Errorf("a spin-up wants a year of temperatures, a tolerance above 0 K and a year at least")
	}
	before := make([]float64, len(c.cells))
	var out SpunUp
	for out.Years < maxYears && !out.Settled {
		for i := range c.cells {
			before[i], _ = c.cells[i].state(c.h[i], c.rangeK)
		}
		was := c.moment()
		track, err := c.Run(yearC, stepS)
		if err != nil {
			return SpunUp{}, err
		}
		out.Years++
		out.Track, out.ChangeK = track, 0
		for i := range c.cells {
			now, _ := c.cells[i].state(c.h[i], c.rangeK)
			out.ChangeK = max(out.ChangeK, math.Abs(now-before[i]))
		}
		out.MovedM = math.Abs(c.moment().FrontM - was.FrontM)
		out.Settled = out.ChangeK <= toleranceK && out.MovedM <= 0.001
	}
	return out, nil
}
