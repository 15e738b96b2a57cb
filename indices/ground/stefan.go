package ground

import (
	"math"

	"thawledger/pipeline"
)

// secondsPerDay turns degC.d into degC.s.
const secondsPerDay = 86400

// Stefan returns the depth of the front in uniform ground in m:
//
//	X = sqrt(2 k 86400 I / L)
//
// (J. Stefan, 1891; US form X = sqrt(48 k n I / L), UFC 3-130-05). k is the
// conductivity of the zone between surface and front: thawed for thaw, frozen for
// frost. I is the surface index. It neglects the heat that warms the ground, and
// so is too deep, by 1 to 15 % in wet ground, by more in dry (see Lambda).
func Stefan(kWMK, latentJM3, indexCDays float64) (float64, error) {
	e, err := Edaphic(kWMK, latentJM3)
	if err != nil {
		return 0, err
	}
	if err := checkIndex("surface", indexCDays); err != nil {
		return 0, err
	}
	return e * math.Sqrt(indexCDays), nil
}

// Edaphic returns E = sqrt(2 k 86400 / L) in m/sqrt(degC.d), so that X = E sqrt(I).
func Edaphic(kWMK, latentJM3 float64) (float64, error) {
	if err := within("conductivity in W/(m K)", kWMK, 0.005, 20); err != nil {
		return 0, err
	}
	if latentJM3 == 0 {
		return 0, ErrDry
	}
	if err := within("latent heat in J/m3", latentJM3, 1, 3.4e8); err != nil {
		return 0, err
	}
	return math.Sqrt(2 * kWMK * secondsPerDay / latentJM3), nil
}

// ThawDepth returns the depth in m that a surface thawing index reaches from a
// frozen start. Layer m, of thickness d and resistance R = d/k, takes
//
//	I(m) = L(m) d(m) / 86400 (R(1) + ... + R(m-1) + R(m)/2)
//
// to be thawed, which follows from quasi-steady conduction and is the layered
// procedure of the US Army manuals (TM 5-852-6) with lambda = 1; other ways of
// layering are disputed in print (Xie and Gough 2013, Kurylyk 2015, Permafrost and
// Periglacial Processes). A dry layer resists and costs nothing.
//
// Errors: ErrBelow if the front passes the bottom of the profile, ErrDry if the
// last layer goes on below and is dry.
func (p Profile) ThawDepth(surfaceCDays float64) (float64, error) {
	return p.depth(pipeline.Thaw, surfaceCDays)
}

// FrostDepth is ThawDepth of a freezing index from a thawed start: with frozen
// conductivities.
func (p Profile) FrostDepth(surfaceCDays float64) (float64, error) {
	return p.depth(pipeline.Freeze, surfaceCDays)
}

// IndexToThaw returns the surface thawing index in degC.d that reaches a depth:
// the inverse of ThawDepth. Within dry layers at the top it is 0.
func (p Profile) IndexToThaw(depthM float64) (float64, error) {
	return p.index(pipeline.Thaw, depthM)
}

// IndexToFreeze is IndexToThaw of frost: the inverse of FrostDepth.
func (p Profile) IndexToFreeze(depthM float64) (float64, error) {
	return p.index(pipeline.Freeze, depthM)
}

func (p Profile) depth(kind pipeline.Kind, cDays float64) (float64, error) {
	if err := p.check(); err != nil {
		return 0, err
	}
	if err := checkIndex("surface", cDays); err != nil {
		return 0, err
	}
	if cDays == 0 {
		return 0, nil
	}
	var above, r float64 // depth and resistance of the layers above
	rest := cDays
	for _, l := range p {
		k := conductivity(l.Thermal, kind)
		if l.ThicknessM > 0 {
			whole := stefanIndex(l.LatentJM3, k, r, l.ThicknessM)
			if whole <= rest {
				above, r, rest = above+l.ThicknessM, r+l.ThicknessM/k, rest-whole
				continue
			}
		}
		if l.LatentJM3 == 0 {
			return 0, ErrDry
		}
		// L/86400 (r d + d2/(2k)) = rest, solved so that nothing cancels
		q := secondsPerDay * rest / l.LatentJM3
		return above + 2*q/(r+math.Sqrt(r*r+2*q/k)), nil
	}
	if rest == 0 {
		return above, nil
	}
	return 0, ErrBelow
}

func (p Profile) index(kind pipeline.Kind, depthM float64) (float64, error) {
	if err := p.check(); err != nil {
		return 0, err
	}
	if err := checkDepth(depthM); err != nil {
		return 0, err
	}
	var r, cDays float64
	rest := depthM
	for _, l := range p {
		k, d := conductivity(l.Thermal, kind), rest
		if l.ThicknessM > 0 {
			d = min(d, l.ThicknessM)
		}
		cDays += stefanIndex(l.LatentJM3, k, r, d)
		r += d / k
		if rest -= d; rest <= 0 {
			return cDays, nil
		}
	}
	return 0, ErrBelow
}

// stefanIndex is the index that a layer takes below a resistance r.
func stefanIndex(latentJM3, kWMK, r, dM float64) float64 {
	return latentJM3 * dM / secondsPerDay * (r + dM/(2*kWMK))
}
