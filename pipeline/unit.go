package pipeline

import "fmt"

// TempUnit is a unit in which a feed states temperatures.
type TempUnit string

// The units a layout may declare.
const (
	DegC       TempUnit = "degC"
	DegF       TempUnit = "degF"
	Kelvin     TempUnit = "K"
	TenthsDegC TempUnit = "tenths degC"
	TenthsDegF TempUnit = "tenths degF"
)

// TempUnits lists the units in the order in which messages name them.
var TempUnits = []TempUnit{DegC, DegF, Kelvin, TenthsDegC, TenthsDegF}

// Celsius converts a value in this unit to degrees Celsius by the definitions
// 0 degC = 32 degF = 273.15 K (BIPM SI Brochure, 9th edition, 2019, section
// 2.3.1, and NIST SP 811, appendix B). Exact to one rounding of float64.
func (u TempUnit) Celsius(v float64) (float64, error) {
	switch u {
	case DegC:
		return v, nil
	case DegF:
		return (v - 32) / 1.8, nil
	case Kelvin:
		return v - 273.15, nil
	case TenthsDegC:
		return v / 10, nil
	case TenthsDegF:
		return (v/10 - 32) / 1.8, nil
	}
	return 0, fmt.Errorf("unknown temperature unit %q", string(u))
}

// IndexUnit is a unit of a thawing or freezing index. Stored values are always
// in DegCDays; the others are for design values as their documents state them.
type IndexUnit string

// The units a design value may be stated in.
const (
	DegCDays    IndexUnit = "degC.d"
	DegFDays    IndexUnit = "degF.d"
	KelvinHours IndexUnit = "K.h"
)

// IndexUnits lists the units in the order in which messages name them.
var IndexUnits = []IndexUnit{DegCDays, DegFDays, KelvinHours}

// DegCDays converts an index in this unit to degC.d. An index is a sum of
// differences, so no 32 degF offset applies: 1 degC.d = 1.8 degF.d = 24 K.h
// (ISO 13793:2001, annex A, states freezing indices in K.h).
func (u IndexUnit) DegCDays(v float64) (float64, error) {
	switch u {
	case DegCDays:
		return v, nil
	case DegFDays:
		return v / 1.8, nil
	case KelvinHours:
		return v / 24, nil
	}
	return 0, fmt.Errorf("unknown index unit %q", string(u))
}
