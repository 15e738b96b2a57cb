package ground

import (
	"errors"
	"fmt"
	"math"
)

// ErrBelow says that the front passes, or the depth lies below, the bottom of a
// profile whose last layer has a thickness: nothing is known of what is there.
var ErrBelow = errors.New("it is below the last layer of the profile")

// ErrDry says that the front meets no latent heat, so that it has no depth.
var ErrDry = errors.New("the ground holds no water to thaw or freeze")

// RangeError is a value that is outside of what a formula or the world allows.
type RangeError struct {
	What      string // what it is, with its unit in words
	Value     float64
	Low, High float64
}

// Error names the value and the range.
func (e *RangeError) Error() string {
	if math.IsInf(e.High, 1) {
		return fmt.Sprintf("%s is %g; it has to be %g or more", e.What, e.Value, e.Low)
	}
	return fmt.Sprintf("%s is %g; it has to be from %g to %g", e.What, e.Value, e.Low, e.High)
}

// within is nil if v is from low to high. NaN never is.
func within(what string, v, low, high float64) error {
	if v >= low && v <= high && !math.IsInf(v, 0) {
		return nil
	}
	return &RangeError{what, v, low, high}
}

// An index above maxIndex degC.d is no year's; the warmest deserts have 12,000.
const maxIndex = 1e6

func checkIndex(what string, cDays float64) error {
	return within(what+" index in degC.d", cDays, 0, maxIndex)
}

func checkDepth(m float64) error { return within("depth in m", m, 0, maxThicknessM) }
