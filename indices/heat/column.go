package heat

import (
	"fmt"
	"math"

	"thawledger/indices/compensated"
	"thawledger/pipeline"
)

// Grid says how the ground is cut into cells. The zero Grid stands for Usual.
type Grid struct {
	CellM  float64 // thickness of cells near the surface, m
	FineM  float64 // depth down to which they are as thick, m
	Growth float64 // below, each cell is thicker than the one above by this factor
	DepthM float64 // of the whole, m; layers that go deeper are cut off there
}

// Usual returns the grid that is used where none is asked for: cells of 0.05 m down
// to 3 m, then growing by an eighth from one to the next, down to 15 m.
func Usual() Grid { return Grid{CellM: 0.05, FineM: 3, Growth: 1.125, DepthM: 15} }

// Bottom is what happens at the base of the column.
type Bottom struct {
	kind bottomKind
	v    float64
}

type bottomKind uint8

const (
	noFlux bottomKind = iota
	fixed
	gradient
)

// NoFlux lets no heat through the base.
func NoFlux() Bottom { return Bottom{} }

// FixedC keeps the base at a temperature in degC.
func FixedC(c float64) Bottom { return Bottom{fixed, c} }

// GradientKM lets the heat in that a geothermal gradient in K/m, warmer with
// depth, drives through the lowest cell. Usual values: 0.01 to 0.05.
func GradientKM(kPerM float64) Bottom { return Bottom{gradient, kPerM} }

// Column is ground with a state. It is not safe for concurrent use.
type Column struct {
	bottom   Bottom
	rangeK   float64 // 0: the front is sharp
	cells    []cell
	h        []float64 // enthalpy of each cell, J/m3
	q        []float64 // heat through the top of each cell in the step, J/m2; the last is of the base
	maxStepS float64
	in       compensated.Sum // heat let in since New or Reset, J/m2
}

// cell is what stays the same of a cell.
type cell struct {
	dx, top float64 // thickness and depth of the top, m
	pipeline.Thermal
}

// maxCells and maxStepsPerDay bound the work that a grid can ask for.
const (
	maxCells       = 20000
	maxStepsPerDay = 50000
)

// Options are what seldom differs.
type Options struct {
	// RangeK spreads the latent heat over so many K below 0 degC; 0: all of it
	// is at 0 degC. From 0.05 to 5.
	RangeK float64
}

// New returns a column at one temperature in degC, all layers thawed where that is
// above 0 and frozen where it is 0 or below. layers are from the top; a last layer
// without a thickness goes down to the base of the grid, one with a thickness is
// continued there by the same ground. Cells never straddle layers: each layer is
// cut into a whole number of them.
func New(layers []pipeline.ThermalLayer, g Grid, b Bottom, startC float64, o Options) (*Column, error) {
	if g == (Grid{}) {
		g = Usual()
	}
	switch {
	case !(g.CellM >= 0.001 && g.CellM <= 10), !(g.FineM >= 0 && g.FineM <= 1e4), !(g.Growth >= 1 && g.Growth <= 2), !(g.DepthM >= 4*g.CellM && g.DepthM <= 1e4):
		return nil, fmt.Errorf("grid %+v: it has to have cells of 0.001 to 10 m, grow by a factor of 1 to 2, and have a depth of 4 cells at least", g)
	case !isTemperature(startC):
		return nil, fmt.Errorf("%g degC is no temperature to begin with", startC)
	case b.kind == fixed && !isTemperature(b.v):
		return nil, fmt.Errorf("%g degC is no temperature of a base", b.v)
	case b.kind == gradient && !(b.v >= 0 && b.v <= 1):
		return nil, fmt.Errorf("%g K/m is no geothermal gradient; it has to be from 0 to 1", b.v)
	case !(o.RangeK == 0 || o.RangeK >= 0.05 && o.RangeK <= 5):
		return nil, fmt.Errorf("a freezing range of %g K; it has to be 0, or from 0.05 to 5", o.RangeK)
	}
	cells, err := cut(layers, g)
	if err != nil {
		return nil, err
	}
	c := &Column{bottom: b, rangeK: o.RangeK, cells: cells, h: make([]float64, len(cells)), q: make([]float64, len(cells)+1)}
	c.maxStepS = c.stable()
	if c.maxStepS < secondsPerDay/maxStepsPerDay {
		return nil, fmt.Errorf("a time step of %.3g s: cells are too thin for what the ground conducts; choose thicker cells, or join thin layers", c.maxStepS)
	}
	c.Reset(startC)
	return c, nil
}

// Reset puts the whole column at one temperature in degC.
func (c *Column) Reset(startC float64) {
	if !isTemperature(startC) {
		panic(fmt.Sprintf("heat: %v degC is no temperature to begin with", startC))
	}
	for i := range c.cells {
		c.h[i] = c.cells[i].enthalpy(startC, c.rangeK)
	}
	c.in = compensated.Sum{}
}

// isTemperature is false for NaN too.
func isTemperature(c float64) bool { return math.Abs(c) <= 200 }

// cut makes the cells.
func cut(layers []pipeline.ThermalLayer, g Grid) ([]cell, error) {
	if len(layers) == 0 {
		return nil, fmt.Errorf("there are no layers")
	}
	var out []cell
	top, next := 0.0, g.CellM
	for i, l := range layers {
		t := l.Thermal
		for _, v := range []float64{t.KThawedWMK, t.KFrozenWMK, t.CThawedJM3K, t.CFrozenJM3K} {
			if !(v > 0 && v <= 1e9) {
				return nil, fmt.Errorf("layer %d: conductivities and heat capacities have to be above 0: %+v", i+1, t)
			}
		}
		if !(t.LatentJM3 >= 0 && t.LatentJM3 <= 1e9) {
			return nil, fmt.Errorf("layer %d: a latent heat of %g J/m3", i+1, t.LatentJM3)
		}
		last := i == len(layers)-1
		if !(l.ThicknessM > 0 && l.ThicknessM <= 1e4) && !(last && l.ThicknessM == 0) {
			return nil, fmt.Errorf("layer %d: a thickness of %g m", i+1, l.ThicknessM)
		}
		base := top + l.ThicknessM
		if last || base > g.DepthM-next/2 { // and no sliver of a layer at the base
			base = g.DepthM
		}
		begin := len(out)
		for z := top; z < base-1e-9; { // as thick as the grid wants them
			if z >= g.FineM-1e-9 {
				next *= g.Growth
			}
			out = append(out, cell{dx: next, Thermal: t})
			if z += next; len(out) > maxCells {
				return nil, fmt.Errorf("more than %d cells", maxCells)
			}
		}
		fit(out[begin:], top, base)
		if top = base; base >= g.DepthM {
			break
		}
	}
	return out, nil
}

// fit makes cells, which reach too far by a part of the last, fill a layer.
func fit(cells []cell, top, base float64) {
	var sum float64
	for _, c := range cells {
		sum += c.dx
	}
	z := top
	for i := range cells {
		cells[i].dx *= (base - top) / sum
		cells[i].top = z
		z += cells[i].dx
	}
}

// stable returns the longest time step in s for which no state of the cells makes
// the scheme overshoot: a cell must not pass on, in one step, more heat than makes
// it as warm as its neighbours. Resistances to both sides are the least that there
// can be: half of the cell itself, and nothing of a neighbour in which the front is
// at the near edge.
func (c *Column) stable() float64 {
	least := math.Inf(1)
	for i := range c.cells {
		l := &c.cells[i]
		k := max(l.KThawedWMK, l.KFrozenWMK)
		heat := min(l.CThawedJM3K, l.CFrozenJM3K) * l.dx
		least = min(least, heat*l.dx/(4*k)) // conductance 2k/dx to each side
	}
	return 0.9 * least
}

// StepS returns the longest time step in s that Run takes.
func (c *Column) StepS() float64 { return c.maxStepS }

// Cells returns how many cells there are.
func (c *Column) Cells() int { return len(c.cells) }

// enthalpy is 0 for frozen ground at 0 degC (at the lower end of the range, if
// there is one).
func (l *cell) enthalpy(tempC, rangeK float64) float64 {
	if rangeK > 0 && l.LatentJM3 > 0 {
		switch {
		case tempC <= -rangeK:
			return l.CFrozenJM3K * (tempC + rangeK)
		case tempC < 0:
			return l.thawing(rangeK) * (tempC + rangeK) / rangeK
		}
		return l.thawing(rangeK) + l.CThawedJM3K*tempC
	}
	if tempC <= 0 {
		return l.CFrozenJM3K * tempC
	}
	return l.LatentJM3 + l.CThawedJM3K*tempC
}

// thawing is the heat that takes a cell through its range: latent, and that of the
// mean heat capacity.
func (l *cell) thawing(rangeK float64) float64 {
	return l.LatentJM3 + (l.CThawedJM3K+l.CFrozenJM3K)/2*rangeK
}

// state returns a cell's temperature in degC and its thawed share.
func (l *cell) state(h, rangeK float64) (tempC, thawed float64) {
	most := l.LatentJM3
	if rangeK > 0 && most > 0 {
		most = l.thawing(rangeK)
	} else {
		rangeK = 0
	}
	switch {
	case h <= 0:
		return h/l.CFrozenJM3K - rangeK, 0
	case h < most:
		return -rangeK * (1 - h/most), h / most
	}
	return (h - most) / l.CThawedJM3K, 1
}
