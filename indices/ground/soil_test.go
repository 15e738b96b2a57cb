package ground

import (
	"errors"
	"math"
	"strings"
	"testing"

	"thawledger/pipeline"
)

// Computed independently from Kersten's formulas in SI units.
func TestKersten(t *testing.T) {
	for _, c := range []struct {
		texture                pipeline.Texture
		rho, w, thawed, frozen float64
	}{
		{"fine", 1600, 15, 1.234743, 1.384632}, {"fine", 1600, 20, 1.396471, 1.770555}, {"fine", 1400, 30, 1.218531, 1.960354},
		{"coarse", 1800, 5, 1.705074, 1.324523}, {"coarse", 1800, 10, 2.109104, 2.332315}, {"coarse", 2000, 5, 2.273020, 1.993722},
	} {
		thawed, frozen, err := Kersten(c.texture, c.rho, c.w)
		if err != nil || math.Abs(thawed-c.thawed) > 0.51e-6 || math.Abs(frozen-c.frozen) > 0.51e-6 {
			t.Errorf("%s %g %g: %.7f, %.7f, %v; want %g, %g", c.texture, c.rho, c.w, thawed, frozen, err, c.thawed, c.frozen)
		}
	}
	// Readings of Kersten's charts as printed in a teaching example of the
	// Washington State Department of Transportation (pavementinteractive.org,
	// "Calculation of frost depth"): silt 100 lb/ft3, 15 %: frozen 0.8; base
	// 135 lb/ft3, 5 %: thawed 1.65 BTU/(h ft degF).
	if _, frozen, err := Kersten(pipeline.FineSoil, 100*densityUS, 15); err != nil || !near(frozen/kUS, 0.8, 0.01) {
		t.Errorf("silt, frozen: %.4f BTU/(h ft degF), %v; want 0.8", frozen/kUS, err)
	}
	if thawed, _, err := Kersten(pipeline.CoarseSoil, 135*densityUS, 5); err != nil || !near(thawed/kUS, 1.65, 0.01) {
		t.Errorf("base, thawed: %.4f BTU/(h ft degF), %v; want 1.65", thawed/kUS, err)
	}
}

// Computed independently from Johansen's formulas.
func TestJohansen(t *testing.T) {
	for _, c := range []struct {
		texture                   pipeline.Texture
		rho, w, q, thawed, frozen float64
	}{
		{"fine", 1600, 15, 0.4, 1.325898, 1.783330}, {"coarse", 1800, 8, 0.6, 1.759839, 1.704892},
	} {
		thawed, frozen, err := Johansen(c.texture, c.rho, c.w, c.q)
		if err != nil || math.Abs(thawed-c.thawed) > 0.51e-6 || math.Abs(frozen-c.frozen) > 0.51e-6 {
			t.Errorf("%s %g %g %g: %.7f, %.7f, %v; want %g, %g", c.texture, c.rho, c.w, c.q, thawed, frozen, err, c.thawed, c.frozen)
		}
	}
}

// Computed independently from L = 144 rho w/100 BTU/ft3 and C = rho (c + f w/100)
// with c = 0.17. The latent heat of SI is 0.42 % below 144 BTU/lb. The water content
// is of the DRY mass: of the whole it would give L a sixth lower in the last row.
func TestHeats(t *testing.T) {
	for _, c := range []struct{ pcf, w, latentMJ, thawed, frozen, mean float64 }{
		{100, 15, 80.4793, 32.0, 24.5, 28.25}, {120, 10, 64.3835, 32.4, 26.4, 29.4},
		{135, 5, 36.2157, 29.7, 26.325, 28.0125}, {80, 30, 128.7669, 37.6, 25.6, 31.6},
	} {
		latent, err := LatentHeat(c.pcf*densityUS, c.w)
		thawed, frozen, err2 := HeatCapacity(c.pcf*densityUS, c.w)
		if err := errors.Join(err, err2); err != nil {
			t.Fatal(err)
		}
		if !near(latent/1e6*334.944/333.55, c.latentMJ, 1e-5) || !near(latent/1e6, c.latentMJ, 0.0043) {
			t.Errorf("%g lb/ft3, %g %%: L %.4f MJ/m3; want %.4f", c.pcf, c.w, latent/1e6, c.latentMJ)
		}
		if !near(thawed/heatUS, c.thawed, 1e-6) || !near(frozen/heatUS, c.frozen, 1e-6) || !near((thawed+frozen)/2/heatUS, c.mean, 1e-6) {
			t.Errorf("%g lb/ft3, %g %%: C %.5f, %.5f BTU/(ft3 degF); want %g, %g", c.pcf, c.w, thawed/heatUS, frozen/heatUS, c.thawed, c.frozen)
		}
	}
	// 1.89462 MJ/(m3 K) of the first row, computed independently
	thawed, frozen, _ := HeatCapacity(100*densityUS, 15)
	if mean := (thawed + frozen) / 2e6; !near(mean, 1.89462, 1e-5) {
		t.Errorf("mean C %.6f MJ/(m3 K); want 1.89462", mean)
	}
}

func TestBuild(t *testing.T) {
	given := pipeline.Thermal{KThawedWMK: 1, KFrozenWMK: 2, CThawedJM3K: 2e6, CFrozenJM3K: 1.8e6, LatentJM3: 1e8}
	fine := func(rho, w float64, m pipeline.SoilMethod) pipeline.Layer {
		return pipeline.Layer{ThicknessM: 0.5, Soil: &pipeline.Soil{Texture: pipeline.FineSoil, DryDensityKgM3: rho, WaterPctDry: w, Method: m, QuartzShare: 0.4}}
	}
	p, err := Build([]pipeline.Layer{{ThicknessM: 0.5, Thermal: &given}, fine(1600, 15, pipeline.Kersten), fine(1600, 15, pipeline.Johansen)})
	if err != nil || p[0].Thermal != given || math.Abs(p[1].KFrozenWMK-1.384632) > 1e-6 || math.Abs(p[2].KThawedWMK-1.325898) > 1e-6 {
		t.Fatalf("%+v, %v", p, err)
	}
	for _, c := range []struct {
		name  string
		layer pipeline.Layer
		says  string
	}{
		{"nothing", pipeline.Layer{ThicknessM: 1}, "layer 1: it has to be stated by"},
		{"both", pipeline.Layer{Thermal: &given, Soil: fine(1600, 15, pipeline.Kersten).Soil}, "not by both"},
		{"too dry for Kersten", fine(1600, 5, pipeline.Kersten), "Kersten's formula for fine soil, is 5; it has to be 7 or more"},
		{"too dry for Johansen", fine(1600, 2, pipeline.Johansen), "degree of saturation"},
		{"more water than pores", fine(1600, 60, pipeline.Kersten), "it has to be from 0 to 26"},
		{"density in g/cm3", fine(1.6, 15, pipeline.Kersten), "dry density in kg/m3 is 1.6; it has to be from 50 to 2700"},
		{"method", fine(1600, 15, "other"), `method "other" is not known`},
		{"texture", pipeline.Layer{Soil: &pipeline.Soil{Texture: "clay", DryDensityKgM3: 1600, WaterPctDry: 15, Method: pipeline.Kersten}}, `texture "clay" is not known`},
		{"negative thickness", pipeline.Layer{ThicknessM: -1, Thermal: &given}, "thickness in m is -1"},
	} {
		if _, err := Build([]pipeline.Layer{c.layer}); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s: %v; want %q", c.name, err, c.says)
		}
	}
	if _, err := Build(nil); err == nil {
		t.Error("no layers are a profile")
	}
}
