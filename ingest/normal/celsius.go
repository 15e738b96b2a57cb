package normal

import (
	"fmt"
	"strconv"

	"thawledger/pipeline"
)

// Bounds of what is taken for a temperature, degC (common practice, no source;
// the lowest and highest air temperatures on WMO's list are -89.2 and 56.7 degC,
// from memory).
const (
	LowestC  = -100.0
	HighestC = 100.0
)

// Celsius converts a finite value to degC by its unit and refuses what is
// outside LowestC to HighestC. It never returns a negative zero.
func Celsius(v float64, unit pipeline.TempUnit) (float64, error) {
	c, err := unit.Celsius(v)
	if err != nil {
		return 0, err
	}
	if c >= LowestC && c <= HighestC {
		if c == 0 {
			return 0, nil
		}
		return c, nil
	}
	text := decimal(v) + " " + string(unit)
	if unit != pipeline.DegC {
		text += " is " + decimal(c) + " degC,"
	} else {
		text += " is"
	}
	return 0, fmt.Errorf("%s outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value", text)
}

func decimal(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }
