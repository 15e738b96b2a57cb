package quality

import (
	"fmt"
	"math"
)

// Medium is what a sensor is in.
type Medium uint8

// The media.
const (
	Air     Medium = 0
	Surface Medium = 1 // of ground, pavement, roof
	Soil    Medium = 2
)

// Options are what the tests have to know beside the values. The zero value is
// for air, without neighbours.
type Options struct {
	Medium Medium

	// Bounds are the hard bounds of the Range test; nil for those of the medium:
	// air -80 to 60, surface -80 to 80, soil -50 to 50 degC (Zahumensky, 2004,
	// second-hand). A station on the antarctic plateau needs its own.
	Bounds *Bounds

	// Neighbours are records of other stations near by, chosen by the caller
	// (Durre et al., 2010, second-hand: within 75 km, three to seven of them).
	Neighbours []Record
	// LeastNeighbours is how many of them it takes for the Neighbour test; 0 for
	// 3 (Durre et al.). With one or two a fault of theirs makes this station
	// doubtful, which a network that thin has to accept.
	LeastNeighbours int
}

// Bounds are the lowest and the highest temperature that can be, in degC.
type Bounds struct{ LowestC, HighestC float64 }

func (o *Options) bounds() Bounds {
	if o.Bounds != nil {
		return *o.Bounds
	}
	switch o.Medium {
	case Surface:
		return Bounds{-80, 80}
	case Soil:
		return Bounds{-50, 50}
	}
	return Bounds{-80, 60}
}

func (o *Options) leastNeighbours() int {
	if o.LeastNeighbours > 0 {
		return o.LeastNeighbours
	}
	return 3
}

// check panics at a fault of the caller.
func (o *Options) check() {
	if o.Medium > Soil {
		panic(fmt.Sprintf("quality: medium %d is unknown", o.Medium))
	}
	if b := o.Bounds; b != nil && !(b.LowestC < b.HighestC && isTemperature(b.LowestC) && isTemperature(b.HighestC)) {
		panic(fmt.Sprintf("quality: %v to %v degC are no bounds", b.LowestC, b.HighestC))
	}
	if o.LeastNeighbours < 0 {
		panic(fmt.Sprintf("quality: %d neighbours cannot be the least", o.LeastNeighbours))
	}
}

// isTemperature is false for what no arithmetic here should see: values far from
// any temperature, infinities and NaN.
func isTemperature(c float64) bool { return math.Abs(c) <= 1e6 }
