package ground

import (
	"errors"
	"math"
	"testing"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// Factors from the units of US manuals, by the definitions of the international
// BTU, the foot and the pound.
const (
	footM     = 0.3048
	kUS       = 1.730734666 // BTU/(h ft degF) in W/(m K)
	latentUS  = 37.258946e3 // BTU/ft3 in J/m3
	heatUS    = 67.066102e3 // BTU/(ft3 degF) in J/(m3 K)
	densityUS = 16.01846337 // lb/ft3 in kg/m3
	btuIn     = 0.144227889 // BTU in/(h ft2 degF) in W/(m K)
	perDegF   = 1 / 1.8     // differences of temperature
)

// uniform is a layer with the same conductivity and heat capacity in both phases.
func uniform(thicknessM, k, c, latent float64) pipeline.ThermalLayer {
	return pipeline.ThermalLayer{ThicknessM: thicknessM, Thermal: pipeline.Thermal{KThawedWMK: k, KFrozenWMK: k, CThawedJM3K: c, CFrozenJM3K: c, LatentJM3: latent}}
}

// us is uniform in the units of US manuals.
func us(thicknessFt, k, c, latent float64) pipeline.ThermalLayer {
	return uniform(thicknessFt*footM, k*kUS, c*heatUS, latent*latentUS)
}

// Layered Stefan: computed independently with Python from the resistance sums.
func TestLayeredStefan(t *testing.T) {
	si := Profile{uniform(0.15, 1.5, 2e6, 0), uniform(0.85, 2.0, 2e6, 3.0e7), uniform(2.0, 1.2, 2e6, 1.1e8)}
	foot := Profile{us(0.4, 1.86, 28, 0), us(1.6, 1.80, 28, 972), us(3.0, 1.5, 28, 1500), us(10, 0.76, 28, 2160)}
	for _, c := range []struct {
		p             Profile
		cDays, depthM float64
	}{
		{si, 200, 1.144632}, {si, 600, 1.533654}, {si, 1200, 1.946434}, {si, 2000, 2.368304},
		{foot, 500 * perDegF, 5.214924 * footM}, {foot, 1500 * perDegF, 7.490123 * footM}, {foot, 3000 * perDegF, 9.630087 * footM},
	} {
		got, err := c.p.ThawDepth(c.cDays)
		if err != nil || math.Abs(got-c.depthM) > 1e-6 {
			t.Errorf("%g degC.d: %.7f m, %v; want %.6f", c.cDays, got, err, c.depthM)
		}
	}
	if got, err := si.IndexToThaw(1.0); err != nil || math.Abs(got-92.230903) > 1e-6 {
		t.Errorf("to the base of the second layer: %.7f degC.d, %v; want 92.230903", got, err)
	}
}

// Stefan's depth depends on the index only. Half a sine of 120 days with a peak of
// 8 K has an index of 611.120074 degC.d; depth and E computed independently.
func TestEdaphicAndPathIndependence(t *testing.T) {
	const k, latent = 1.2, 1e8
	if e, err := Edaphic(k, latent); err != nil || !near(e, 0.04553680, 1e-7) {
		t.Errorf("E = %.9f, %v; want 0.0455368", e, err)
	}
	if x, err := Stefan(k, latent, 611.120074); err != nil || math.Abs(x-1.125708038) > 1e-9 {
		t.Errorf("X = %.10f, %v; want 1.125708038", x, err)
	}
	// dX/dt = k T / (L X), day by day, by the exact solution for a constant T
	var x2 float64
	for day := range 120 {
		x2 += 2 * k * secondsPerDay * 8 * math.Sin(math.Pi*(float64(day)+0.5)/120) / latent
	}
	if math.Abs(math.Sqrt(x2)-1.125708038) > 1e-4 {
		t.Errorf("day by day %.9f m", math.Sqrt(x2))
	}
}

// The conductivity is that of the zone between surface and front: thawed for
// thaw, frozen for frost (UFC 3-130-05). By hand: sqrt(2 k 86400 500 / 1e8).
func TestEachFrontHasItsOwnConductivity(t *testing.T) {
	p := Profile{{Thermal: pipeline.Thermal{KThawedWMK: 1, KFrozenWMK: 2, CThawedJM3K: 2.8e6, CFrozenJM3K: 2e6, LatentJM3: 1e8}}}
	thaw, err := p.ThawDepth(500)
	frost, err2 := p.FrostDepth(500)
	if err := errors.Join(err, err2); err != nil || !near(thaw, math.Sqrt(0.864), 1e-12) || !near(frost, math.Sqrt(1.728), 1e-12) {
		t.Errorf("thaw %g, frost %g, %v; want %g, %g", thaw, frost, err, math.Sqrt(0.864), math.Sqrt(1.728))
	}
	if i, err := p.IndexToFreeze(thaw); err != nil || !near(i, 250, 1e-12) {
		t.Errorf("index to freeze it again %g, %v; want 250", i, err)
	}
}

func drawProfile(t *rapid.T) Profile {
	n := rapid.IntRange(1, 5).Draw(t, "layers")
	p := make(Profile, n)
	for i := range p {
		p[i] = pipeline.ThermalLayer{ThicknessM: rapid.Float64Range(0.05, 1).Draw(t, "thickness"), Thermal: pipeline.Thermal{
			KThawedWMK: rapid.Float64Range(0.03, 4).Draw(t, "thawed"), KFrozenWMK: rapid.Float64Range(0.03, 4).Draw(t, "frozen"),
			CThawedJM3K: rapid.Float64Range(1e6, 4e6).Draw(t, "ct"), CFrozenJM3K: rapid.Float64Range(1e6, 4e6).Draw(t, "cf"),
			LatentJM3: rapid.Float64Range(1e6, 3e8).Draw(t, "latent")}}
		if i < n-1 && rapid.IntRange(0, 3).Draw(t, "dry") == 0 {
			p[i].LatentJM3 = 0
		}
	}
	p[n-1].ThicknessM = 0
	return p
}

// Depth and index are inverse; a larger index never reaches less deep; a layer cut
// in two is the same ground.
func TestStefanProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := drawProfile(t)
		i := rapid.Float64Range(0.01, 5000).Draw(t, "index")
		for _, f := range []struct {
			depth, index func(float64) (float64, error)
		}{{p.ThawDepth, p.IndexToThaw}, {p.FrostDepth, p.IndexToFreeze}} {
			d, err := f.depth(i)
			back, err2 := f.index(d)
			more, err3 := f.depth(i * rapid.Float64Range(1, 3).Draw(t, "times"))
			if err := errors.Join(err, err2, err3); err != nil || !near(back, i, 1e-9) || more < d {
				t.Fatalf("%g degC.d reach %g m, which takes %g; more reach %g: %v", i, d, back, more, err)
			}
		}
		cut := append(Profile{p[0]}, p...)
		share := rapid.Float64Range(0.1, 0.9).Draw(t, "share")
		cut[0].ThicknessM = share * p[0].ThicknessM
		cut[1].ThicknessM -= cut[0].ThicknessM
		if len(p) == 1 {
			cut[0].ThicknessM, cut[1].ThicknessM = share, 0
		}
		whole, _ := p.ThawDepth(i)
		if got, err := cut.ThawDepth(i); err != nil || !near(got, whole, 1e-9) {
			t.Fatalf("cut in two %g m, whole %g m: %v", got, whole, err)
		}
	})
}

// Modified Berggren, one layer: computed independently (lambda with R 4.2 as well)
// for sandy silt 100 lb/ft3, 15 %, K 0.76, and others. The US Army's manual prints
// about 5.8 ft for the first, with lambda from a chart.
func TestBerggrenOneLayer(t *testing.T) {
	for _, c := range []struct {
		name                           string
		k, c, latent, fDays, days, v0F float64
		alpha, lambda, stefanFt, ft    float64
	}{
		{"sandy silt", 0.76, 28.25, 2160, 2500, 160, 5.2, 0.3328, 0.895589, 6.497863, 5.819416},
		{"silt", 0.8, 32, 2880, 2900, 150, 5, 0.258621, 0.907969, 6.218253, 5.645984},
		{"gravel", 1.7, 28.0125, 972, 3000, 180, 3, 0.18, 0.867987, 15.869841, 13.774814},
	} {
		p := Profile{us(0, c.k, c.c, c.latent)}
		for _, kind := range []pipeline.Kind{pipeline.Thaw, pipeline.Freeze} {
			mean := -c.v0F * perDegF // thaw: degrees BELOW freezing
			if kind == pipeline.Freeze {
				mean = -mean
			}
			got, err := p.Berggren(Season{kind, c.fDays * perDegF, c.days, mean})
			if err != nil || math.Abs(got.Alpha-c.alpha) > 1e-6 || math.Abs(got.Lambda-c.lambda) > 1e-6 || math.Abs(got.DepthM/footM-c.ft) > 2e-6 {
				t.Errorf("%s, %s: %+v (%.7f ft), %v; want alpha %g, lambda %g, %g ft", c.name, kind, got, got.DepthM/footM, err, c.alpha, c.lambda, c.ft)
			}
			if x, err := p.depth(kind, c.fDays*perDegF); err != nil || math.Abs(x/footM-c.stefanFt) > 2e-6 {
				t.Errorf("%s: Stefan %.7f ft, %v; want %g", c.name, x/footM, err, c.stefanFt)
			}
			// on the front's side of 0 degC nothing has to be warmed first
			if other, err := p.Berggren(Season{kind, c.fDays * perDegF, c.days, -mean}); err != nil || other.V0C != 0 || other.DepthM <= got.DepthM {
				t.Errorf("%s, %s, mean on the other side: %+v, %v", c.name, kind, other, err)
			}
			// the season's length, not the year's: over a year vs would be lower and alpha higher
			if year, err := p.Berggren(Season{kind, c.fDays * perDegF, 365, mean}); err != nil || !(year.Alpha > 2*c.alpha*0.99) {
				t.Errorf("%s: over a year %+v, %v", c.name, year, err)
			}
		}
	}
}

// Modified Berggren, four layers: computed independently with Python.
func TestBerggrenLayered(t *testing.T) {
	p := Profile{us(0.4, 0.86, 28, 0), us(1.6, 1.65, 28.0125, 972), us(2.0, 1.3, 120*(0.17+0.75*0.08), 144*120*0.08), us(0, 0.76, 28.25, 2160)}
	for _, c := range []struct{ fDays, days, v0F, lambda, ft float64 }{
		{3000, 160, 5.2, 0.873114, 7.889202}, {1500, 150, 5, 0, 6.028437},
	} {
		got, err := p.Berggren(Season{pipeline.Freeze, c.fDays * perDegF, c.days, c.v0F * perDegF})
		if err != nil || math.Abs(got.DepthM/footM-c.ft) > 2e-6 || c.lambda > 0 && math.Abs(got.Lambda-c.lambda) > 1e-6 {
			t.Errorf("%g degF.d: %+v (%.7f ft), %v; want %g ft", c.fDays, got, got.DepthM/footM, err, c.ft)
		}
	}
	// lambda and partial index of each layer of the first case
	b := berggren{alpha: 5.2 / (3000.0 / 160), vs: 3000.0 / 160 * perDegF}
	for i, want := range []struct{ lambda, fDays float64 }{{0, 0}, {0.797681, 96.743919}, {0.836089, 363.218063}} {
		index, lambda := b.index(p[i].Thermal, p[i].ThicknessM)
		if math.Abs(lambda-want.lambda) > 1e-6 || math.Abs(index*1.8-want.fDays) > 1e-5 {
			t.Errorf("layer %d: lambda %.7f, %.7f degF.d; want %g, %g", i+1, lambda, index*1.8, want.lambda, want.fDays)
		}
		b.add(p[i].Thermal, p[i].ThicknessM)
	}
}

// Never deeper than Stefan's with the same mean conductivity, and the same ground
// whether cut in two or not.
func TestBerggrenProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := drawProfile(t)
		same := make(Profile, len(p))
		for i, l := range p {
			k, c := meanK(l.Thermal), (l.CThawedJM3K+l.CFrozenJM3K)/2
			same[i] = uniform(l.ThicknessM, k, c, l.LatentJM3)
		}
		s := Season{pipeline.Thaw, rapid.Float64Range(0.01, 4000).Draw(t, "index"), rapid.Float64Range(1, 366).Draw(t, "days"), rapid.Float64Range(-20, 5).Draw(t, "mean")}
		got, err := p.Berggren(s)
		stefan, err2 := same.ThawDepth(s.SurfaceCDays)
		if err := errors.Join(err, err2); err != nil || got.DepthM > stefan+1e-8 || got.DepthM < 0 || !(got.Lambda >= 0 && got.Lambda <= 1) {
			t.Fatalf("%+v; Stefan's %g m: %v", got, stefan, err)
		}
		s.SurfaceCDays *= 1.5
		if more, err := p.Berggren(s); err != nil || more.DepthM < got.DepthM-1e-7 {
			t.Fatalf("half as much again reaches %g m, and not %g: %v", more.DepthM, got.DepthM, err)
		}
	})
}

func TestRefused(t *testing.T) {
	wet := uniform(0, 1, 2e6, 1e8)
	ends := Profile{uniform(0.5, 1, 2e6, 1e8)}
	dry := Profile{uniform(0, 1, 2e6, 0)}
	var out *RangeError
	var layer *LayerError
	for _, c := range []struct {
		name string
		f    func() (float64, error)
		want func(error) bool
	}{
		{"no layers", func() (float64, error) { return Profile{}.ThawDepth(1) }, func(err error) bool { return errors.As(err, &layer) }},
		{"a layer without thickness above another", func() (float64, error) { return Profile{wet, wet}.ThawDepth(1) }, func(err error) bool { return errors.As(err, &layer) && layer.Layer == 0 }},
		{"conductivity of nothing", func() (float64, error) { return Profile{{}}.ThawDepth(1) }, func(err error) bool { return errors.As(err, &layer) && errors.As(err, &out) }},
		{"NaN", func() (float64, error) { return Profile{wet}.ThawDepth(math.NaN()) }, func(err error) bool { return errors.As(err, &out) }},
		{"negative index", func() (float64, error) { return Profile{wet}.FrostDepth(-1) }, func(err error) bool { return errors.As(err, &out) }},
		{"infinite depth", func() (float64, error) { return Profile{wet}.IndexToThaw(math.Inf(1)) }, func(err error) bool { return errors.As(err, &out) }},
		{"through the profile", func() (float64, error) { return ends.ThawDepth(1e4) }, func(err error) bool { return errors.Is(err, ErrBelow) }},
		{"below the profile", func() (float64, error) { return ends.IndexToFreeze(0.6) }, func(err error) bool { return errors.Is(err, ErrBelow) }},
		{"no water", func() (float64, error) { return dry.ThawDepth(1) }, func(err error) bool { return errors.Is(err, ErrDry) }},
		{"no water at all", func() (float64, error) { return Stefan(1, 0, 1) }, func(err error) bool { return errors.Is(err, ErrDry) }},
		{"Berggren through the profile", func() (float64, error) {
			b, err := ends.Berggren(Season{pipeline.Thaw, 1e4, 100, -5})
			return b.DepthM, err
		}, func(err error) bool { return errors.Is(err, ErrBelow) }},
		{"Berggren without water", func() (float64, error) {
			b, err := dry.Berggren(Season{pipeline.Thaw, 100, 100, -5})
			return b.DepthM, err
		}, func(err error) bool { return errors.Is(err, ErrDry) }},
		{"no season", func() (float64, error) {
			b, err := ends.Berggren(Season{pipeline.Thaw, 100, 0, -5})
			return b.DepthM, err
		}, func(err error) bool { return errors.As(err, &out) }},
		{"alpha", func() (float64, error) { return Lambda(-0.1, 1) }, func(err error) bool { return errors.As(err, &out) }},
		{"mu", func() (float64, error) { return Lambda(0, 0) }, func(err error) bool { return errors.As(err, &out) }},
		{"no warmth", func() (float64, error) { _, x, err := Neumann(Step{1, 2e6, 1, 2e6, 1e8, 0, 1}, 1); return x, err }, func(err error) bool { return errors.As(err, &out) }},
	} {
		if v, err := c.f(); !c.want(err) || v != 0 {
			t.Errorf("%s: %g, %v", c.name, v, err)
		}
	}
	// nothing has thawed yet, even where the ground is dry
	if d, err := dry.ThawDepth(0); err != nil || d != 0 {
		t.Errorf("index 0: %g, %v", d, err)
	}
	if b, err := ends.Berggren(Season{pipeline.Thaw, 0, 1, -5}); err != nil || b.DepthM != 0 || b.Alpha != 0 {
		t.Errorf("index 0: %+v, %v", b, err)
	}
}

func TestConductivities(t *testing.T) {
	p := Profile{uniform(0.5, 1, 2e6, 0), uniform(0, 2, 2e6, 1e8)}
	p[1].KFrozenWMK = 3
	// by hand: 1.5 / (0.5/1 + 1/2) and 1.5 / (0.5/1 + 1/3)
	thawed, frozen, err := p.Conductivities(1.5)
	if err != nil || !near(thawed, 1.5, 1e-12) || !near(frozen, 1.8, 1e-12) {
		t.Errorf("%g, %g, %v; want 1.5, 1.8", thawed, frozen, err)
	}
	if _, _, err := p[:1].Conductivities(0.6); !errors.Is(err, ErrBelow) {
		t.Error(err)
	}
}
