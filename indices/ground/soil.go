package ground

import (
	"fmt"
	"math"

	"thawledger/pipeline"
)

// Densities in kg/m3. 2700 is the density of solids that Johansen's formulas use.
const (
	solidsKgM3 = 2700
	waterKgM3  = 1000
)

// FusionJKg is the latent heat of fusion of ice at 0 degC in J/kg, common value.
// US manuals have 144 BTU/lb = 334.944 kJ/kg, 0.42 % more.
const FusionJKg = 333.55e3

// Specific heats in J/(kg K). Water: 1 BTU/(lb degF) by definition of the
// manuals; ice: half of it; dry mineral soil: 0.17 of it, US Army TM 5-818-2
// (frost conditions, as quoted elsewhere). The utilities manual, TM 5-852-5
// (UFC 3-130-05), has 0.2.
const (
	waterJKgK = 4186.8
	iceJKgK   = 0.5 * waterJKgK
	soilJKgK  = 0.17 * waterJKgK
)

// LatentHeat returns the latent heat of a m3 of ground in J/m3: all water
// freezes, L = rho w/100 FusionJKg, with the dry density in kg/m3 and the water
// content in % of the DRY mass. Water that stays unfrozen, in clays and in saline
// soil a tenth to a third of it, makes the true figure lower.
func LatentHeat(dryDensityKgM3, waterPctDry float64) (float64, error) {
	if err := checkComposition(dryDensityKgM3, waterPctDry); err != nil {
		return 0, err
	}
	return dryDensityKgM3 * waterPctDry / 100 * FusionJKg, nil
}

// HeatCapacity returns the heat capacities of a m3 of ground in J/(m3 K), thawed
// and frozen: C = rho (c + w/100) and rho (c + 0.5 w/100) times that of water,
// c = 0.17 (UFC 3-130-05, there with c = 0.2).
func HeatCapacity(dryDensityKgM3, waterPctDry float64) (thawed, frozen float64, err error) {
	if err := checkComposition(dryDensityKgM3, waterPctDry); err != nil {
		return 0, 0, err
	}
	w := waterPctDry / 100
	return dryDensityKgM3 * (soilJKgK + w*waterJKgK), dryDensityKgM3 * (soilJKgK + w*iceJKgK), nil
}

// checkComposition refuses what cannot be: solids and water of a m3 of ground
// take at most a m3 (here 2 % more, since densities of solids differ).
func checkComposition(dryDensityKgM3, waterPctDry float64) error {
	if err := within("dry density in kg/m3", dryDensityKgM3, 50, solidsKgM3); err != nil {
		return err
	}
	pores := 1.02 - dryDensityKgM3/solidsKgM3
	most := max(0, math.Floor(pores*waterKgM3/dryDensityKgM3*1000)/10)
	return within(fmt.Sprintf("water content in %% of the dry mass, at a dry density of %g kg/m3,", dryDensityKgM3), waterPctDry, 0, most)
}

// Kersten returns conductivities in W/(m K), thawed and frozen, by M. S. Kersten
// (1949), "Thermal properties of soils", University of Minnesota Engineering
// Experiment Station Bulletin 28. With rho in g/cm3 and w in % of the dry mass:
//
//	fine    thawed 0.1442 (0.9 log w - 0.2) 10^(0.6243 rho)
//	        frozen 0.001442 10^(1.373 rho) + 0.01226 10^(0.4994 rho) w
//	coarse  thawed 0.1442 (0.7 log w + 0.4) 10^(0.6243 rho)
//	        frozen 0.01096 10^(0.8116 rho) + 0.00461 10^(0.9115 rho) w
//
// The thawed forms hold from 7 % (fine) and 1 % (coarse) on: less is an error.
// Accuracy about 25 % (from memory). At a low water content frozen coarse soil
// conducts less than thawed: that is as it should be.
func Kersten(t pipeline.Texture, dryDensityKgM3, waterPctDry float64) (thawed, frozen float64, err error) {
	if err := checkComposition(dryDensityKgM3, waterPctDry); err != nil {
		return 0, 0, err
	}
	rho, w := dryDensityKgM3/1000, waterPctDry
	switch t {
	case pipeline.FineSoil:
		if err := within("water content in % of the dry mass, for Kersten's formula for fine soil,", w, 7, math.Inf(1)); err != nil {
			return 0, 0, err
		}
		return 0.1442 * (0.9*math.Log10(w) - 0.2) * math.Pow(10, 0.6243*rho),
			0.001442*math.Pow(10, 1.373*rho) + 0.01226*math.Pow(10, 0.4994*rho)*w, nil
	case pipeline.CoarseSoil:
		if err := within("water content in % of the dry mass, for Kersten's formula for coarse soil,", w, 1, math.Inf(1)); err != nil {
			return 0, 0, err
		}
		return 0.1442 * (0.7*math.Log10(w) + 0.4) * math.Pow(10, 0.6243*rho),
			0.01096*math.Pow(10, 0.8116*rho) + 0.00461*math.Pow(10, 0.9115*rho)*w, nil
	}
	return 0, 0, fmt.Errorf("texture %q is not known; it has to be %s or %s", string(t), pipeline.FineSoil, pipeline.CoarseSoil)
}

// Johansen returns conductivities in W/(m K), thawed and frozen, by O. Johansen
// (1975), "Varmeledningsevne av jordarter" (Thermal conductivity of soils),
// Trondheim; formulas from memory. With the dry density rho in kg/m3, porosity
// n = 1 - rho/2700, degree of saturation S and the share q of quartz in the solids:
//
//	k      = (ksat - kdry) Ke + kdry,  kdry = (0.135 rho + 64.7) / (2700 - 0.947 rho)
//	ksat   = ks^(1-n) 0.57^n thawed,   ks^(1-n) 2.2^n frozen (no unfrozen water)
//	ks     = 7.7^q ko^(1-q),           ko = 2.0, or 3.0 where q <= 0.2
//	Ke     = log S + 1 fine, 0.7 log S + 1 coarse, thawed;  Ke = S frozen
//
// It holds for S above 0.1 (fine) and 0.05 (coarse), and not beyond saturation:
// anything else is an error.
func Johansen(t pipeline.Texture, dryDensityKgM3, waterPctDry, quartzShare float64) (thawed, frozen float64, err error) {
	if err := checkComposition(dryDensityKgM3, waterPctDry); err != nil {
		return 0, 0, err
	}
	if err := within("share of quartz", quartzShare, 0, 1); err != nil {
		return 0, 0, err
	}
	rho, q := dryDensityKgM3, quartzShare
	n := 1 - rho/solidsKgM3
	if err := within("porosity", n, 0.01, 1); err != nil {
		return 0, 0, err
	}
	s := waterPctDry / 100 * rho / waterKgM3 / n
	slope, least := 1.0, 0.1
	switch t {
	case pipeline.FineSoil:
	case pipeline.CoarseSoil:
		slope, least = 0.7, 0.05
	default:
		return 0, 0, fmt.Errorf("texture %q is not known; it has to be %s or %s", string(t), pipeline.FineSoil, pipeline.CoarseSoil)
	}
	// an excess that rounding of densities and water contents may bring is saturation
	if s > 1 && s < 1.02 {
		s = 1
	}
	if err := within("degree of saturation, for Johansen's formula,", s, least, 1); err != nil {
		return 0, 0, err
	}
	ko := 2.0
	if q <= 0.2 {
		ko = 3.0
	}
	solids := math.Pow(math.Pow(7.7, q)*math.Pow(ko, 1-q), 1-n)
	dry := (0.135*rho + 64.7) / (2700 - 0.947*rho)
	thawed = (solids*math.Pow(0.57, n)-dry)*(slope*math.Log10(s)+1) + dry
	frozen = (solids*math.Pow(2.2, n)-dry)*s + dry
	return thawed, frozen, nil
}
