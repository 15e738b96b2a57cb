package settings

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

const groundFile = `stations: [{id: TARN, latitude: 69, longitude: -121, utc_offset: "-08:00", daily_mean: max_min}]
layouts: {}
feeds: []
sites: [{id: strip, station: TARN, surfaces: [{id: runway, n_factors: [{kind: thaw, value: 1.3, source: s}, {kind: freeze, value: 0.9, source: s}],
  ground: [
    %GROUND
  ],
  design_values: [
    {definition: curve, direction: not_above, source: drawing 7, %DESIGN}
  ]}]}]
`

const (
	goodGround = "{thickness_m: 0.9, texture: coarse, dry_density_kg_m3: 1900, water_pct_dry: 5, method: kersten, source: log 1},\n" +
		"    {thickness_m: 0.3, texture: fine, dry_density_kg_m3: 1500, water_pct_dry: 22, method: johansen, quartz_share: 0.3, source: log 1},\n" +
		"    {k_thawed_w_mk: 1.1, k_frozen_w_mk: 1.9, c_thawed_j_m3k: 2.8e6, c_frozen_j_m3k: 2.0e6, latent_j_m3: 1.0e8, source: laboratory}"
	goodDepth = "kind: thaw, of: surface, depth_m: 1.5"
)

func groundSettings(ground, design string) []byte {
	return []byte(strings.NewReplacer("%GROUND", ground, "%DESIGN", design).Replace(groundFile))
}

// A profile and a depth are read as meant, shown so that they are read again as the
// same, and the depth turned into an index once.
func TestGround(t *testing.T) {
	s, _, err := Parse("s", groundSettings(goodGround, goodDepth), "")
	if err != nil {
		t.Fatal(err)
	}
	surface := &s.Sites[0].Surfaces[0]
	want := []pipeline.Layer{
		{ThicknessM: 0.9, Source: "log 1", Soil: &pipeline.Soil{Texture: pipeline.CoarseSoil, DryDensityKgM3: 1900, WaterPctDry: 5, Method: pipeline.Kersten}},
		{ThicknessM: 0.3, Source: "log 1", Soil: &pipeline.Soil{Texture: pipeline.FineSoil, DryDensityKgM3: 1500, WaterPctDry: 22, Method: pipeline.Johansen, QuartzShare: 0.3}},
		{Source: "laboratory", Thermal: &pipeline.Thermal{KThawedWMK: 1.1, KFrozenWMK: 1.9, CThawedJM3K: 2.8e6, CFrozenJM3K: 2e6, LatentJM3: 1e8}},
	}
	if diff := cmp.Diff(want, surface.Ground); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	again, _, err := Parse("s", []byte(s.Text()), "")
	if err != nil || again.Hash != s.Hash || cmp.Diff(s.Sites, again.Sites) != "" {
		t.Errorf("shown and read again: %v\n%s", err, s.Text())
	}
	if _, err := surface.Designs[0].IndexCDays(); err == nil {
		t.Error("a depth is an index before it is turned into one")
	}
	text := s.Text()
	for range 2 { // the second time nothing is left to do
		err = s.Ground(func([]pipeline.Layer) (int, error) { return 0, nil }, func(l []pipeline.Layer, depthM float64) (float64, error) {
			if len(l) != 3 || depthM != 1.5 {
				t.Errorf("asked for %g m of %d layers", depthM, len(l))
			}
			return 812.34, nil
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	const source = "drawing 7 [1.5 m of thaw, as a surface index of 812.3 degC.d by the layered Stefan formula]"
	if d := surface.Designs[0]; d.Index != 812.34 || d.Unit != pipeline.DegCDays || *d.DepthM != 1.5 || d.Source != source {
		t.Errorf("%+v", d)
	}
	if s.Text() != text {
		t.Error("what is shown has changed")
	}
}

func TestGroundRefused(t *testing.T) {
	replaced := func(old, with string) string { return strings.Replace(goodGround, old, with, 1) }
	for _, c := range []struct{ name, ground, design, says string }{
		{"thickness", replaced("0.9,", "0,"), goodDepth, `s:6:19: sites[0].surfaces[0].ground[0].thickness_m: "0" will not do; write a number from 0.001`},
		{"no thickness above another", replaced("thickness_m: 0.3, ", ""), goodDepth, "s:7:5: sites[0].surfaces[0].ground[1].thickness_m: it is missing, and only the last layer may go on below"},
		{"texture", replaced("coarse", "gravel"), goodDepth, `s:6:33: sites[0].surfaces[0].ground[0].texture: "gravel" is not known; write one of fine, coarse`},
		{"no method", replaced(", method: kersten", ""), goodDepth, "s:6:5: sites[0].surfaces[0].ground[0].method: it is missing; write one of kersten, johansen"},
		{"density in g/cm3", replaced("1900", "1.9"), goodDepth, `ground[0].dry_density_kg_m3: "1.9" will not do; write a number from 50 to 2700`},
		{"water", replaced("water_pct_dry: 5", "water_pct_dry: wet"), goodDepth, `ground[0].water_pct_dry: "wet" will not do`},
		{"no quartz", replaced(", quartz_share: 0.3", ""), goodDepth, "s:7:5: sites[0].surfaces[0].ground[1].quartz_share: it is missing"},
		{"quartz by Kersten", replaced("kersten,", "kersten, quartz_share: 0.2,"), goodDepth, "ground[0].quartz_share: kersten's formula has no quartz in it; leave it out"},
		{"both kinds", replaced("kersten,", "kersten, latent_j_m3: 1e8,"), goodDepth, "s:6:5: sites[0].surfaces[0].ground[0]: it has keys of both kinds"},
		{"neither kind", "{source: s}", goodDepth, "s:6:5: sites[0].surfaces[0].ground[0]: it says nothing of the ground"},
		{"conductivity", replaced("1.1", "1100"), goodDepth, `ground[2].k_thawed_w_mk: "1100" will not do; write a number from 0.005 to 20`},
		{"capacity missing", replaced("c_frozen_j_m3k: 2.0e6, ", ""), goodDepth, "s:8:5: sites[0].surfaces[0].ground[2].c_frozen_j_m3k: it is missing"},
		{"latent heat", replaced("1.0e8", "-1"), goodDepth, `ground[2].latent_j_m3: "-1" will not do`},
		{"no source", replaced(", source: laboratory", ""), goodDepth, "s:8:5: sites[0].surfaces[0].ground[2].source: it is missing; say where its properties were taken from"},
		{"unknown key", replaced("thickness_m: 0.3", "thicknes_m: 0.3"), goodDepth, "s:7:6: sites[0].surfaces[0].ground[1].thicknes_m: there is no such key; did you mean thickness_m?"},
		{"no mapping", "silt", goodDepth, `s:6:5: sites[0].surfaces[0].ground[0]: "silt" is not a mapping`},
		{"no layers", "", goodDepth, "sites[0].surfaces[0].ground: it has no layers"},
		{"depth", goodGround, "kind: thaw, of: surface, depth_m: deep", `s:11:100: sites[0].surfaces[0].design_values[0].depth_m: "deep" will not do`},
		{"depth and index", goodGround, goodDepth + ", index: 800", "s:11:112: sites[0].surfaces[0].design_values[0].index: the value is stated as a depth; leave it out"},
		{"depth and unit", goodGround, goodDepth + ", unit: degC.d", "design_values[0].unit: the value is stated as a depth"},
		{"neither", goodGround, "kind: thaw, of: surface, unit: degC.d", "design_values[0].index: it is missing"},
		{"depth of frost", goodGround, "kind: freeze, of: surface, depth_m: 1", "s:11:72: sites[0].surfaces[0].design_values[0].kind: a depth is one of thaw"},
		{"depth of the air", goodGround, "kind: thaw, of: air, depth_m: 1", "design_values[0].of: a depth is reached from the surface"},
		{"another base", goodGround, goodDepth + ", base_c: -1", "design_values[0].base_c: a depth of thaw counts from 0 degC"},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, _, err := Parse("s", groundSettings(c.ground, c.design), "")
			if err == nil || !strings.Contains(err.Error(), c.says) || !strings.HasPrefix(err.Error(), "s:") {
				t.Errorf("%v; want %q", err, c.says)
			}
		})
	}
	without := strings.Replace(string(groundSettings("", goodDepth)), "  ground: [\n    \n  ],\n", "", 1)
	if _, _, err := Parse("s", []byte(without), ""); err == nil || !strings.Contains(err.Error(), "s:6:5: sites[0].surfaces[0].design_values[0]: it is a depth of thaw, and nothing is known of the ground") {
		t.Error(err)
	}
}

// What only the arithmetic of the ground finds gets its place too.
func TestGroundFaultsOfOthers(t *testing.T) {
	fine := func([]pipeline.Layer) (int, error) { return 0, nil }
	for _, c := range []struct {
		name   string
		build  func([]pipeline.Layer) (int, error)
		toThaw func([]pipeline.Layer, float64) (float64, error)
		says   string
	}{
		{"layer", func([]pipeline.Layer) (int, error) { return 1, errors.New("too dry") }, nil, "s:7:5: sites[0].surfaces[0].ground[1]: too dry"},
		{"depth", fine, func([]pipeline.Layer, float64) (float64, error) { return 0, fmt.Errorf("below") }, "s:11:100: sites[0].surfaces[0].design_values[0].depth_m: a depth of 1.5 m: below"},
		{"dry", fine, func([]pipeline.Layer, float64) (float64, error) { return 0, nil }, "depth_m: thaw is past 1.5 m at once: the ground above is dry; write a depth"},
	} {
		s, _, err := Parse("s", groundSettings(goodGround, goodDepth), "")
		if err != nil {
			t.Fatal(err)
		}
		if err := s.Ground(c.build, c.toThaw); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s: %v; want %q", c.name, err, c.says)
		}
	}
}
