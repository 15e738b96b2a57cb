package ground

import (
	"errors"
	"math"

	"thawledger/pipeline"
)

// Season is a surface's season, as the modified Berggren formula wants it.
type Season struct {
	Kind         pipeline.Kind
	SurfaceCDays float64 // surface index, degC.d
	LengthDays   float64 // of the season (to date), not of the year
	MeanAnnualC  float64 // mean annual temperature, degC: that of the ground below at the season's start
}

// Berggren is the depth of the front by the modified Berggren formula.
type Berggren struct {
	DepthM float64
	// V0C is how far the ground was from 0 degC at the season's start, on the
	// side away from the front, VsC how far the surface is in the season's mean,
	// on the front's: Alpha = V0C/VsC.
	V0C, VsC, Alpha float64
	Lambda          float64 // of the layer that the front is in
}

// Berggren returns the depth of the front by the modified Berggren formula,
//
//	X = lambda sqrt(2 K 86400 I / L)
//
// with K the mean of thawed and frozen conductivity, lambda by Lambda of
// alpha = v0/vs and mu = vs C/L, vs = I/t, C the mean heat capacity (TM 5-852-6;
// H. P. Aldrich, 1956, Highway Research Board Bulletin 135). t is the season's
// length. v0 is how far the mean annual temperature lies on the side away from the
// front: below 0 degC for thaw, above it for frost. On the front's side there is
// nothing to be warmed (cooled) to 0 degC first, and v0 is 0.
//
// Layer m takes L(m) d(m) / (86400 lambda(m)2) (R(1) + ... + R(m-1) + R(m)/2), with
// lambda(m) of L and C weighted by thickness down to and including it. In front of
// the first water the formula only says that the front is not above it.
//
// Errors: ErrBelow, ErrDry as for ThawDepth.
func (p Profile) Berggren(s Season) (Berggren, error) {
	if err := p.check(); err != nil {
		return Berggren{}, err
	}
	if err := errors.Join(checkIndex("surface", s.SurfaceCDays), within("season in days", s.LengthDays, 1, 366),
		within("mean annual temperature in degC", s.MeanAnnualC, -90, 60)); err != nil {
		return Berggren{}, err
	}
	v0 := max(0, -s.MeanAnnualC)
	if s.Kind == pipeline.Freeze {
		v0 = max(0, s.MeanAnnualC)
	}
	out := Berggren{V0C: v0, VsC: s.SurfaceCDays / s.LengthDays}
	if s.SurfaceCDays == 0 {
		return out, nil
	}
	out.Alpha = v0 / out.VsC
	if out.Alpha > 1000 { // a season of almost nothing: no front
		return out, nil
	}
	var b berggren
	b.alpha, b.vs = out.Alpha, out.VsC
	rest := s.SurfaceCDays
	for _, l := range p {
		if l.ThicknessM > 0 {
			whole, lambda := b.index(l.Thermal, l.ThicknessM)
			if whole <= rest {
				rest -= whole
				out.Lambda = lambda
				b.add(l.Thermal, l.ThicknessM)
				continue
			}
		}
		if l.LatentJM3 == 0 {
			return Berggren{}, ErrDry
		}
		d := b.solve(l, rest)
		_, out.Lambda = b.index(l.Thermal, max(d, 1e-9))
		out.DepthM = b.depth + d
		return out, nil
	}
	return Berggren{}, ErrBelow
}

// berggren is what the layers above one amount to.
type berggren struct {
	alpha, vs       float64
	depth, r        float64 // m, m2 K/W
	latent, thermal float64 // sums of L d and C d
}

func meanK(t pipeline.Thermal) float64 { return (t.KThawedWMK + t.KFrozenWMK) / 2 }

func (b *berggren) add(t pipeline.Thermal, d float64) {
	b.depth += d
	b.r += d / meanK(t)
	b.latent += t.LatentJM3 * d
	b.thermal += (t.CThawedJM3K + t.CFrozenJM3K) / 2 * d
}

// index returns the partial index of the uppermost d m of a layer, and its lambda;
// both are 0 for a dry one.
func (b *berggren) index(t pipeline.Thermal, d float64) (cDays, lambda float64) {
	if t.LatentJM3 == 0 {
		return 0, 0
	}
	to := *b
	to.add(t, d)
	lambda, err := Lambda(b.alpha, min(1e9, b.vs*to.thermal/to.latent))
	if err != nil {
		panic("ground: lambda of checked values: " + err.Error())
	}
	return stefanIndex(t.LatentJM3, meanK(t), b.r, d) / (lambda * lambda), lambda
}

// solve returns how deep an index that does not pass a layer goes into it.
func (b *berggren) solve(l pipeline.ThermalLayer, cDays float64) float64 {
	high := l.ThicknessM
	if high == 0 {
		// lambda <= 1 makes Stefan's depth the deepest that there can be
		q := secondsPerDay * cDays / l.LatentJM3
		high = 2*q/(b.r+math.Sqrt(b.r*b.r+2*q/meanK(l.Thermal))) + 1e-9
	}
	return bisectTo(1e-9, 0, high, func(d float64) float64 {
		i, _ := b.index(l.Thermal, d)
		return cDays - i
	})
}

// bisectTo is bisect that ends when it is as close as tolerance.
func bisectTo(tolerance, low, high float64, f func(float64) float64) float64 {
	for high-low > tolerance {
		mid := low + (high-low)/2
		if f(mid) > 0 {
			low = mid
		} else {
			high = mid
		}
	}
	return (low + high) / 2
}
