package pipeline

import "fmt"

// Site is an asset on frozen ground. It draws on one station.
type Site struct {
	ID       string
	Name     string
	Station  string
	Surfaces []Surface
	Tags     []string // by which recipients may mean it
	// Instructions say, by state, what to look at and whom to call.
	Instructions map[State]string
}

// Surface is a part of a site with its own n-factors and design values.
type Surface struct {
	ID      string // unique within the site
	Name    string
	Factors []NFactor
	Designs []DesignValue
	Ground  []Layer // from the top down; nil if the settings have no profile
	// MeasuredBy is the station that measures the surface's own temperature; "" if none does.
	MeasuredBy string
}

// NFactor is the ratio of a surface index to the air index of the same season.
// It holds from the first season that starts on or after From.
type NFactor struct {
	Kind  Kind
	From  Day
	Value float64
	// Low and High are its range; both are Value where none is stated.
	Low, High float64
	Source    string
}

// Of says which index a design value limits.
type Of string

// A design value is for the air or for the surface.
const (
	OfAir     Of = "air"
	OfSurface Of = "surface"
)

// Direction says on which side of the design value a season has to stay.
type Direction string

// The directions of a design value.
const (
	NotAbove Direction = "not_above" // thaw design values, most surfaces
	NotBelow Direction = "not_below" // what must freeze enough
)

// DesignValue is the index that a surface was designed for, with everything
// that an index must share with it to be compared: kind, definition, base,
// air or surface, unit.
type DesignValue struct {
	Kind       Kind
	Definition Definition
	Of         Of
	Index      float64 // in Unit, as its document states it
	Unit       IndexUnit
	BaseC      float64
	Direction  Direction
	From       Day // first day on which it was in force
	NearShare  float64
	Source     string
	// DepthM is not nil for a value that is stated as a depth of thaw, in m. Index
	// is then the surface index that reaches it; see indices/ground.
	DepthM *float64
}

// IndexCDays returns the design value in degC.d.
func (d *DesignValue) IndexCDays() (float64, error) {
	if d.DepthM != nil && d.Index == 0 {
		return 0, fmt.Errorf("the depth of %g m has not been turned into an index", *d.DepthM)
	}
	return d.Unit.DegCDays(d.Index)
}

// Comparable says why an index of a station with the given base cannot be
// compared with the design value; nil if it can. A definition that is not
// stated is compared with the curve index.
func (d *DesignValue) Comparable(baseC float64) error {
	if d.Definition == Monthly {
		return fmt.Errorf("a %s design value cannot be compared with the curve or sum index of daily means", Monthly)
	}
	if d.BaseC != baseC {
		return fmt.Errorf("its base is %g degC, the station's is %g degC; indices of different bases cannot be compared", d.BaseC, baseC)
	}
	return nil
}

// Compared returns the definition of the index that the design value is
// compared with.
func (d *DesignValue) Compared() Definition {
	if d.Definition == NotStated {
		return Curve
	}
	return d.Definition
}
