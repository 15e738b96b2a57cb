package ground

import (
	"fmt"

	"thawledger/pipeline"
)

// Profile is the ground under a surface from the top down. All layers but the
// last have a thickness; a last layer without one goes on below. Build makes
// profiles; one that is put together by hand is checked at each use.
type Profile []pipeline.ThermalLayer

const maxThicknessM = 1000

// LayerError is what is wrong with one layer of a profile.
type LayerError struct {
	Layer int // place from the top, from 0
	Err   error
}

// Error names the layer from 1.
func (e *LayerError) Error() string { return fmt.Sprintf("layer %d: %v", e.Layer+1, e.Err) }

// Unwrap returns what is wrong.
func (e *LayerError) Unwrap() error { return e.Err }

// Build returns the profile of layers as stated. The error is a *LayerError.
func Build(layers []pipeline.Layer) (Profile, error) {
	if len(layers) == 0 {
		return nil, &LayerError{0, fmt.Errorf("there is none")}
	}
	p := make(Profile, len(layers))
	for i, l := range layers {
		t, err := Properties(l)
		if err != nil {
			return nil, &LayerError{i, err}
		}
		p[i] = pipeline.ThermalLayer{ThicknessM: l.ThicknessM, Thermal: t}
	}
	return p, p.check()
}

// Properties returns a layer's thermal properties: those stated, or those of its
// composition by Kersten or Johansen, with HeatCapacity and LatentHeat.
func Properties(l pipeline.Layer) (pipeline.Thermal, error) {
	switch {
	case (l.Soil == nil) == (l.Thermal == nil):
		return pipeline.Thermal{}, fmt.Errorf("it has to be stated by its composition or by its thermal properties, and not by both")
	case l.Thermal != nil:
		return *l.Thermal, nil
	}
	var t pipeline.Thermal
	var err error
	s := l.Soil
	switch s.Method {
	case pipeline.Kersten:
		t.KThawedWMK, t.KFrozenWMK, err = Kersten(s.Texture, s.DryDensityKgM3, s.WaterPctDry)
	case pipeline.Johansen:
		t.KThawedWMK, t.KFrozenWMK, err = Johansen(s.Texture, s.DryDensityKgM3, s.WaterPctDry, s.QuartzShare)
	default:
		err = fmt.Errorf("method %q is not known; it has to be %s or %s", string(s.Method), pipeline.Kersten, pipeline.Johansen)
	}
	if err != nil {
		return pipeline.Thermal{}, err
	}
	if t.CThawedJM3K, t.CFrozenJM3K, err = HeatCapacity(s.DryDensityKgM3, s.WaterPctDry); err != nil {
		return pipeline.Thermal{}, err
	}
	t.LatentJM3, err = LatentHeat(s.DryDensityKgM3, s.WaterPctDry)
	return t, err
}

// check is nil for what can be a profile; otherwise a *LayerError.
func (p Profile) check() error {
	if len(p) == 0 {
		return &LayerError{0, fmt.Errorf("there is none")}
	}
	for i, l := range p {
		err := checkThermal(l.Thermal)
		if err == nil && (l.ThicknessM != 0 || i < len(p)-1) {
			err = within("thickness in m", l.ThicknessM, 0.001, maxThicknessM)
		}
		if err != nil {
			return &LayerError{i, err}
		}
	}
	return nil
}

// checkThermal allows what is found in nature and in construction, from
// insulation boards to rock and ice, with room on both sides.
func checkThermal(t pipeline.Thermal) error {
	for _, v := range []struct {
		what      string
		v         float64
		low, high float64
	}{
		{"thawed conductivity in W/(m K)", t.KThawedWMK, 0.005, 20},
		{"frozen conductivity in W/(m K)", t.KFrozenWMK, 0.005, 20},
		{"thawed heat capacity in J/(m3 K)", t.CThawedJM3K, 1e4, 1e7},
		{"frozen heat capacity in J/(m3 K)", t.CFrozenJM3K, 1e4, 1e7},
		{"latent heat in J/m3", t.LatentJM3, 0, 3.4e8}, // water has 3.34e8
	} {
		if err := within(v.what, v.v, v.low, v.high); err != nil {
			return err
		}
	}
	return nil
}

// conductivity returns a layer's conductivity between the surface and the front
// of a season of the kind: thawed for thaw, frozen for frost.
func conductivity(t pipeline.Thermal, kind pipeline.Kind) float64 {
	if kind == pipeline.Freeze {
		return t.KFrozenWMK
	}
	return t.KThawedWMK
}

// Conductivities returns the conductivities, thawed and frozen, of the profile
// down to a depth above 0, as of one layer that resists as much: depth divided by
// the sum of d/k. Below a profile that ends it is ErrBelow.
func (p Profile) Conductivities(depthM float64) (thawed, frozen float64, err error) {
	if err := p.check(); err != nil {
		return 0, 0, err
	}
	if err := within("depth in m", depthM, 1e-6, maxThicknessM); err != nil {
		return 0, 0, err
	}
	var rThawed, rFrozen float64
	rest := depthM
	for _, l := range p {
		d := rest
		if l.ThicknessM > 0 {
			d = min(d, l.ThicknessM)
		}
		rThawed += d / l.KThawedWMK
		rFrozen += d / l.KFrozenWMK
		if rest -= d; rest <= 0 {
			return depthM / rThawed, depthM / rFrozen, nil
		}
	}
	return 0, 0, ErrBelow
}
