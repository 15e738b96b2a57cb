package heat

import (
	"math"
	"testing"

	"thawledger/indices/ground"
	"thawledger/pipeline"
)

// neumannCases are Neumann's exact solution after 120 days of a constant surface
// temperature, computed independently with Python by bisection; silt with R 4.2 too.
var neumannCases = []struct {
	name string
	pipeline.Thermal
	surfaceC, groundC, depthM float64
}{
	{"silt", pipeline.Thermal{KThawedWMK: 1.0, CThawedJM3K: 2.8e6, KFrozenWMK: 2.0, CFrozenJM3K: 2.0e6, LatentJM3: 1.0e8}, 10, -2, 1.298898},
	{"coarse", pipeline.Thermal{KThawedWMK: 2.0, CThawedJM3K: 2.2e6, KFrozenWMK: 2.6, CFrozenJM3K: 1.8e6, LatentJM3: 5.0e7}, 12, -5, 2.488674},
	{"icy peat", pipeline.Thermal{KThawedWMK: 0.5, CThawedJM3K: 3.5e6, KFrozenWMK: 1.6, CFrozenJM3K: 2.2e6, LatentJM3: 2.4e8}, 8, -3, 0.533082},
	{"equal properties", pipeline.Thermal{KThawedWMK: 1.5, CThawedJM3K: 2.0e6, KFrozenWMK: 1.5, CFrozenJM3K: 2.0e6, LatentJM3: 8.0e7}, 10, -4, 1.707475},
	{"ground at 0 degC", pipeline.Thermal{KThawedWMK: 1.0, CThawedJM3K: 2.8e6, KFrozenWMK: 2.0, CFrozenJM3K: 2.0e6, LatentJM3: 1.0e8}, 10, 0, 1.379158},
}

const neumannDays = 120

// neumannRun is a case in a column so deep that its base is out of reach.
func neumannRun(t *testing.T, l pipeline.Thermal, surfaceC, groundC, cellM float64, o Options) Track {
	t.Helper()
	c, err := New([]pipeline.ThermalLayer{{Thermal: l}}, Grid{CellM: cellM, FineM: 3, Growth: 1.1, DepthM: 40}, FixedC(groundC), groundC, o)
	if err != nil {
		t.Fatal(err)
	}
	got, err := c.Run(constant(surfaceC, neumannDays), secondsPerDay)
	if err != nil {
		t.Fatal(err)
	}
	return got
}

func constant(c float64, n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = c
	}
	return out
}

// Within 1 % at cells of 0.05 m and the step that stability gives (some 360 to 720 s;
// in truth within 0.05 %), and the root mean square error of all days from the tenth
// on falls to less than a half as cells are halved.
func TestNeumann(t *testing.T) {
	for _, c := range neumannCases {
		t.Run(c.name, func(t *testing.T) {
			var before float64
			for _, cellM := range []float64{0.1, 0.05, 0.025} {
				got := neumannRun(t, c.Thermal, c.surfaceC, c.groundC, cellM, Options{})
				var squares float64
				for d := 9; d < neumannDays; d++ { // X grows with the root of time
					x := c.depthM * math.Sqrt(float64(d+1)/neumannDays)
					squares += math.Pow(got.Moments[d].ThawM/x-1, 2)
				}
				rms := math.Sqrt(squares / (neumannDays - 9))
				x := got.Moments[neumannDays-1].ThawM
				t.Logf("cells of %g m: %.6f m, exactly %.6f m (%+.4f %%); root mean square error of all days %.4f %%", cellM, x, c.depthM, 100*(x/c.depthM-1), 100*rms)
				if cellM == 0.05 && math.Abs(x/c.depthM-1) > 0.01 {
					t.Errorf("%.6f m; want %.6f m within 1 %%", x, c.depthM)
				}
				if cellM == 0.05 && (math.Abs(x/c.depthM-1) > 0.0005 || rms > 0.0005) {
					t.Errorf("the package says within 0.05 %%; the root mean square error is %.4f %%", 100*rms)
				}
				if before > 0 && rms > before/2 {
					t.Errorf("cells of %g m: error %.5f %%, was %.5f %% with cells twice as thick", cellM, 100*rms, 100*before)
				}
				before = rms
			}
		})
	}
}

// Frost is thaw with the phases exchanged and the sign of temperature turned.
func TestFrostMirrorsThaw(t *testing.T) {
	for _, c := range neumannCases {
		m := pipeline.Thermal{KThawedWMK: c.KFrozenWMK, CThawedJM3K: c.CFrozenJM3K, KFrozenWMK: c.KThawedWMK, CFrozenJM3K: c.CThawedJM3K, LatentJM3: c.LatentJM3}
		ground := max(-c.groundC, 1e-9) // at 0 degC it would count as frozen
		got := neumannRun(t, m, -c.surfaceC, ground, 0.1, Options{}).Moments[neumannDays-1]
		if math.Abs(got.FrostM/c.depthM-1) > 0.01 || got.ThawM != 0 {
			t.Errorf("%s: %+v; want frost to %g m", c.name, got, c.depthM)
		}
	}
}

// With the latent heat spread over a tenth of a degree the front is hardly elsewhere.
func TestFreezingRange(t *testing.T) {
	for _, c := range neumannCases[:2] {
		got := neumannRun(t, c.Thermal, c.surfaceC, c.groundC, 0.05, Options{RangeK: 0.1}).Moments[neumannDays-1].ThawM
		if math.Abs(got/c.depthM-1) > 0.02 {
			t.Errorf("%s: %g m; want %g m within 2 %%", c.name, got, c.depthM)
		}
	}
}

// In layers whose heat capacity is small beside their latent heat the depth is that
// of the layered Stefan formula, which neglects the former.
func TestLayersAgainstStefan(t *testing.T) {
	layer := func(thickness, k, latent float64) pipeline.ThermalLayer {
		return pipeline.ThermalLayer{ThicknessM: thickness, Thermal: pipeline.Thermal{KThawedWMK: k, KFrozenWMK: k, CThawedJM3K: 1e5, CFrozenJM3K: 1e5, LatentJM3: latent}}
	}
	p := ground.Profile{layer(0.15, 1.5, 1e5), layer(0.45, 2.0, 3e7), layer(0.2, 0.3, 2e8), layer(0, 1.2, 1.1e8)}
	c, err := New(p, Grid{CellM: 0.05, FineM: 2, Growth: 1.3, DepthM: 10}, NoFlux(), 0, Options{})
	if err != nil {
		t.Fatal(err)
	}
	days := make([]float64, 90)
	var index float64
	for i := range days {
		days[i] = 12 * math.Sin(math.Pi*(float64(i)+0.5)/90)
	}
	got, err := c.Run(days, secondsPerDay)
	if err != nil {
		t.Fatal(err)
	}
	for i, d := range days {
		index += d
		want, err := p.ThawDepth(index)
		if err != nil {
			t.Fatal(err)
		}
		if i%20 == 19 && math.Abs(got.Moments[i].ThawM/want-1) > 0.01 {
			t.Errorf("day %d, %.0f degC.d: %g m; Stefan %g m", i+1, index, got.Moments[i].ThawM, want)
		}
	}
}
