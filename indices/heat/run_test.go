package heat

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"thawledger/indices/ground"
	"thawledger/pipeline"
)

var silt = pipeline.Thermal{KThawedWMK: 1.2, KFrozenWMK: 2.0, CThawedJM3K: 2.8e6, CFrozenJM3K: 2.0e6, LatentJM3: 9e7}

func sinus(mean, amplitude float64) []float64 {
	out := make([]float64, 365)
	for i := range out {
		out[i] = mean + amplitude*math.Cos(2*math.Pi*(float64(i)+0.5-200)/365)
	}
	return out
}

func drawLayers(t *rapid.T) []pipeline.ThermalLayer {
	out := make([]pipeline.ThermalLayer, rapid.IntRange(1, 4).Draw(t, "layers"))
	for i := range out {
		out[i] = pipeline.ThermalLayer{ThicknessM: rapid.Float64Range(0.02, 1.5).Draw(t, "thickness"), Thermal: pipeline.Thermal{
			KThawedWMK: rapid.Float64Range(0.2, 3).Draw(t, "kt"), KFrozenWMK: rapid.Float64Range(0.2, 3).Draw(t, "kf"),
			CThawedJM3K: rapid.Float64Range(1e6, 4e6).Draw(t, "ct"), CFrozenJM3K: rapid.Float64Range(1e6, 4e6).Draw(t, "cf"),
			LatentJM3: rapid.SampledFrom([]float64{0, 1e4, 1e7, 1e8, 3e8}).Draw(t, "latent")}}
	}
	out[len(out)-1].ThicknessM = 0
	return out
}

func drawOptions(t *rapid.T) Options {
	return Options{RangeK: rapid.SampledFrom([]float64{0, 0, 0.1, 1}).Draw(t, "range")}
}

// The heat in the column rises by what was let in, and by nothing else; no
// temperature leaves the range of those that were put in; fronts are in the ground.
func TestEnergyCloses(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		start := rapid.Float64Range(-10, 5).Draw(t, "start")
		bottom := rapid.SampledFrom([]Bottom{NoFlux(), FixedC(start), GradientKM(0.03)}).Draw(t, "bottom")
		c, err := New(drawLayers(t), Grid{CellM: rapid.Float64Range(0.08, 0.3).Draw(t, "cell"), FineM: 1, Growth: 1.2, DepthM: 4}, bottom, start, drawOptions(t))
		if err != nil {
			t.Fatal(err)
		}
		surface := rapid.SliceOfN(rapid.Float64Range(-25, 20), 1, 30).Draw(t, "surface")
		before := c.HeatJM2()
		got, err := c.Run(surface, rapid.SampledFrom([]float64{3600, 86400, 5 * 86400}).Draw(t, "step"))
		if err != nil {
			t.Fatal(err)
		}
		if off := c.HeatJM2() - before - c.LetInJM2(); math.Abs(off) > 1e-10*4*4e8 {
			t.Fatalf("%g J/m2 are lost or found", off)
		}
		low, high := start, start
		for _, s := range surface {
			low, high = min(low, s), max(high, s)
		}
		if bottom == GradientKM(0.03) {
			high = math.Inf(1)
		}
		for i := range c.cells {
			if v, f := c.cells[i].state(c.h[i], c.rangeK); !(v >= low-1e-9 && v <= high+1e-9 && f >= 0 && f <= 1) {
				t.Fatalf("cell %d is at %g degC, from %g to %g were put in; thawed share %g", i, v, low, high, f)
			}
		}
		for _, m := range got.Moments {
			for _, v := range []float64{m.ThawM, m.FrostM, m.FrontM} {
				if !(v >= 0 && v <= 4+1e-9) {
					t.Fatalf("fronts %+v", m)
				}
			}
		}
	})
}

// Without water a yearly wave dies away by exp(-z/d) and lags, d = sqrt(a P/pi), and
// the mean stays (Carslaw and Jaeger, 1959, "Conduction of heat in solids", 2.6).
func TestYearlyWave(t *testing.T) {
	dry := pipeline.Thermal{KThawedWMK: 1.5, KFrozenWMK: 1.5, CThawedJM3K: 2e6, CFrozenJM3K: 2e6}
	c, err := New([]pipeline.ThermalLayer{{Thermal: dry}}, Grid{CellM: 0.1, FineM: 5, Growth: 1.1, DepthM: 30}, NoFlux(), -4, Options{})
	if err != nil {
		t.Fatal(err)
	}
	year := sinus(-4, 15)
	if _, err := c.SpinUp(year, secondsPerDay, 1e-3, 60); err != nil {
		t.Fatal(err)
	}
	const z = 3.0
	d := math.Sqrt(1.5 / 2e6 * 365 * secondsPerDay / math.Pi)
	for i := range year {
		if _, err := c.Run(year[i:i+1], secondsPerDay); err != nil {
			t.Fatal(err)
		}
		want := -4 + 15*math.Exp(-z/d)*math.Cos(2*math.Pi*(float64(i)+1-200)/365-z/d)
		if got := c.TemperatureC(z); math.Abs(got-want) > 0.05 {
			t.Fatalf("day %d: %.4f degC at %g m; want %.4f", i, got, z, want)
		}
	}
}

// Where a year repeats itself no heat is left over at any depth, so that the mean of
// k T is the same at all: at the top of permafrost kf TTOP = (kt I_thaw - kf I_freeze)/P.
// The formula of TTOP follows from conduction alone, and both find it.
func TestSettledYearHasTTOP(t *testing.T) {
	c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Grid{CellM: 0.1, FineM: 3, Growth: 1.125, DepthM: 15}, NoFlux(), -5, Options{})
	if err != nil {
		t.Fatal(err)
	}
	year := sinus(-4, 14)
	got, err := c.SpinUp(year, secondsPerDay, 0.002, 200)
	if err != nil || !got.Settled {
		t.Fatalf("%+v, %v", got.Years, err)
	}
	var thaw, freeze, mean float64
	for i, v := range year {
		thaw, freeze = thaw+max(0, v), freeze+max(0, -v)
		if _, err := c.Run(year[i:i+1], secondsPerDay); err != nil {
			t.Fatal(err)
		}
		mean += c.TemperatureC(got.Track.DeepestM+0.3) / 365
	}
	want, frozen, err := ground.TTOP(thaw, freeze, silt.KThawedWMK, silt.KFrozenWMK)
	if err != nil || !frozen || math.Abs(mean-want) > 0.03 {
		t.Errorf("mean %.4f degC below thaw of %.2f m after %d years; TTOP %.4f, %v", mean, got.Track.DeepestM, got.Years, want, err)
	}
	t.Logf("%d years; mean %.4f degC, TTOP %.4f degC; thaw to %.3f m", got.Years, mean, want, got.Track.DeepestM)
}

// A geothermal gradient: in the end T(z) = Ts + g z, by hand.
func TestGradient(t *testing.T) {
	c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Grid{CellM: 0.5, FineM: 2, Growth: 1.3, DepthM: 10}, GradientKM(0.05), -5, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if got, err := c.SpinUp(constant(-5, 12), 30*secondsPerDay, 1e-6, 200); err != nil || !got.Settled {
		t.Fatal(got.Years, err)
	}
	for _, z := range []float64{1, 4, 8} {
		if got := c.TemperatureC(z); math.Abs(got-(-5+0.05*z)) > 1e-3 {
			t.Errorf("at %g m %g degC; want %g", z, got, -5+0.05*z)
		}
	}
}

// A summer, and the winter that freezes it back from above: the front stays where
// it is while frost comes down, and is gone when both meet.
func TestFreezeBack(t *testing.T) {
	c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Usual(), NoFlux(), -3, Options{})
	if err != nil {
		t.Fatal(err)
	}
	summer, err := c.Run(constant(8, 90), secondsPerDay)
	if err != nil || summer.DeepestAt != 89 || summer.DeepestM < 0.8 {
		t.Fatalf("%g m on day %d, %v", summer.DeepestM, summer.DeepestAt, err)
	}
	winter, err := c.Run(constant(-15, 120), secondsPerDay)
	if err != nil {
		t.Fatal(err)
	}
	m := winter.Moments[5]
	if m.ThawM != 0 || m.FrostM <= 0 || m.FrostM >= m.FrontM || math.Abs(m.FrontM-summer.DeepestM) > 0.1 {
		t.Errorf("after six days of frost %+v; the summer had thawed %g m", m, summer.DeepestM)
	}
	// the last of it, before both fronts meet, lies near the base of the thaw
	for i, m := range winter.Moments {
		if m.FrontM > 0 && m.FrontM < 0.6*summer.DeepestM {
			t.Errorf("day %d: %+v", i, m)
		}
	}
	if m := winter.Moments[119]; m.FrontM != 0 || m.FrostM < 14.9 {
		t.Errorf("after the winter %+v", m)
	}
}

// A front that has only just gone in lets no more heat through than the surface has:
// a breath of thaw, then heat, one time step each; and the same of frost.
func TestNoOvershootAtTheSurface(t *testing.T) {
	for _, sign := range []float64{1, -1} {
		c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Grid{CellM: 0.1, FineM: 1, Growth: 1.2, DepthM: 4}, NoFlux(), 0.001*-sign, Options{})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := c.Run([]float64{0.05 * sign, 0.05 * sign, 20 * sign}, c.StepS()); err != nil {
			t.Fatal(err)
		}
		if got := c.TemperatureC(0) * sign; got > 1 {
			t.Errorf("the first cell is at %g degC after one step", got*sign)
		}
	}
}

// Ground that has not settled says so.
func TestNotSettled(t *testing.T) {
	c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Grid{CellM: 0.1, FineM: 3, Growth: 1.125, DepthM: 15}, NoFlux(), -3, Options{})
	if err != nil {
		t.Fatal(err)
	}
	got, err := c.SpinUp(sinus(1, 10), secondsPerDay, 0.01, 3) // permafrost that is going
	if err != nil || got.Settled || got.Years != 3 {
		t.Errorf("%d years, settled %v, %v", got.Years, got.Settled, err)
	}
}

func TestRefused(t *testing.T) {
	one := []pipeline.ThermalLayer{{Thermal: silt}}
	bad := silt
	bad.KFrozenWMK = math.NaN()
	build := func(l []pipeline.ThermalLayer, g Grid, b Bottom, start float64, o Options) error {
		_, err := New(l, g, b, start, o)
		return err
	}
	c, err := New(one, Usual(), NoFlux(), -1, Options{})
	if err != nil {
		t.Fatal(err)
	}
	for name, err := range map[string]error{
		"no layers":             build(nil, Grid{}, NoFlux(), 0, Options{}),
		"NaN in a layer":        build([]pipeline.ThermalLayer{{Thermal: bad}}, Grid{}, NoFlux(), 0, Options{}),
		"no thickness":          build([]pipeline.ThermalLayer{{Thermal: silt}, {Thermal: silt}}, Grid{}, NoFlux(), 0, Options{}),
		"start":                 build(one, Grid{}, NoFlux(), math.NaN(), Options{}),
		"base":                  build(one, Grid{}, FixedC(math.Inf(1)), 0, Options{}),
		"gradient":              build(one, Grid{}, GradientKM(-1), 0, Options{}),
		"range":                 build(one, Grid{}, NoFlux(), 0, Options{RangeK: 0.001}),
		"grid":                  build(one, Grid{CellM: 0.1, FineM: 1, Growth: 0.5, DepthM: 10}, NoFlux(), 0, Options{}),
		"step":                  build(one, Grid{CellM: 0.001, FineM: 1, Growth: 1.1, DepthM: 10}, NoFlux(), 0, Options{}),
		"surface":               func() error { _, err := c.Run([]float64{math.NaN()}, 86400); return err }(),
		"values too close":      func() error { _, err := c.Run([]float64{1}, 0); return err }(),
		"spin-up without years": func() error { _, err := c.SpinUp([]float64{1}, 86400, 0.1, 0); return err }(),
	} {
		if err == nil {
			t.Errorf("%s: taken", name)
		}
	}
}

// A year of daily values on the usual grid.
func BenchmarkYear(b *testing.B) {
	c, err := New([]pipeline.ThermalLayer{{Thermal: silt}}, Usual(), NoFlux(), -3, Options{})
	if err != nil {
		b.Fatal(err)
	}
	year := sinus(-4, 14)
	for b.Loop() {
		if _, err := c.Run(year, secondsPerDay); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(float64(c.Cells()), "cells")
}
