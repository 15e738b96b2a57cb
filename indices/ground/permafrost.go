package ground

import (
	"errors"
	"math"
)

// daysPerYear is the period P of TTOP and MAGST.
const daysPerYear = 365

// TTOP returns the temperature at the top of permafrost in degC, an equilibrium
// measure: from mean surface SUM indices over ten years or more (n-factor times air
// index, degC.d) and the conductivities of the layer that thaws and freezes.
//
//	TTOP = (rk nt TDD - nf FDD) / 365, rk = kt/kf, where that is below 0 degC;
//	       (nt TDD - nf FDD / rk) / 365 otherwise: there is no permafrost
//
// (M. W. Smith and D. W. Riseborough, 1996, Permafrost and Periglacial Processes 7,
// and 2002, ibid. 13; formula from memory.) frozen says which branch it is. At 58
// sites in Yukon and British Columbia two results of three were within 1 K of
// what was measured (Bevington, 2015).
func TTOP(thawCDays, freezeCDays, kThawedWMK, kFrozenWMK float64) (c float64, frozen bool, err error) {
	if err := errors.Join(checkIndex("surface thawing", thawCDays), checkIndex("surface freezing", freezeCDays),
		within("thawed conductivity in W/(m K)", kThawedWMK, 0.005, 20), within("frozen conductivity in W/(m K)", kFrozenWMK, 0.005, 20)); err != nil {
		return 0, false, err
	}
	rk := kThawedWMK / kFrozenWMK
	if c = (rk*thawCDays - freezeCDays) / daysPerYear; c < 0 {
		return c, true, nil
	}
	return (thawCDays - freezeCDays/rk) / daysPerYear, false, nil
}

// MAGST returns the mean annual temperature of the ground's surface in degC from
// surface sum indices: (nt TDD - nf FDD) / 365.
func MAGST(thawCDays, freezeCDays float64) (float64, error) {
	if err := errors.Join(checkIndex("surface thawing", thawCDays), checkIndex("surface freezing", freezeCDays)); err != nil {
		return 0, err
	}
	return (thawCDays - freezeCDays) / daysPerYear, nil
}

// FrostNumber returns sqrt(FDD) / (sqrt(FDD) + sqrt(TDD)), 0 to 1, of air or of
// surface sum indices (F. E. Nelson and S. I. Outcalt, 1987, Arctic and Alpine
// Research 19). 0.5 and more: more frost than thaw. Without thaw it is 1; without
// both there is none, and ok is false.
func FrostNumber(freezeCDays, thawCDays float64) (f float64, ok bool, err error) {
	if err := errors.Join(checkIndex("thawing", thawCDays), checkIndex("freezing", freezeCDays)); err != nil {
		return 0, false, err
	}
	if freezeCDays == 0 && thawCDays == 0 {
		return 0, false, nil
	}
	root := math.Sqrt(freezeCDays)
	return root / (root + math.Sqrt(thawCDays)), true, nil
}

// FreezeBack is how far a winter has come in freezing again what the summer
// before had thawed.
type FreezeBack struct {
	ThawDepthM  float64 // last summer's
	FrostDepthM float64 // this winter's so far, at most ThawDepthM
	NeededCDays float64 // surface freezing index that freezes all of it
	GoneCDays   float64 // this winter's surface freezing index so far
	Share       float64 // GoneCDays/NeededCDays; 1 and more: frozen back; 1 too where nothing is needed
}

// FreezeBack returns it by Stefan's formula with frozen conductivities. Frost from
// above only: over cold permafrost the thawed ground freezes from below as well, so
// that less than NeededCDays may do.
func (p Profile) FreezeBack(thawDepthM, freezeCDays float64) (FreezeBack, error) {
	needed, err := p.IndexToFreeze(thawDepthM)
	if err != nil {
		return FreezeBack{}, err
	}
	if err := checkIndex("surface freezing", freezeCDays); err != nil {
		return FreezeBack{}, err
	}
	out := FreezeBack{ThawDepthM: thawDepthM, FrostDepthM: thawDepthM, NeededCDays: needed, GoneCDays: freezeCDays, Share: 1}
	if needed > 0 {
		out.Share = freezeCDays / needed
	}
	if freezeCDays < needed {
		if out.FrostDepthM, err = p.FrostDepth(freezeCDays); err != nil {
			return FreezeBack{}, err
		}
	}
	return out, nil
}
