package quality

import (
	"fmt"
	"strings"

	"thawledger/pipeline"
)

// Test is one quality test. Its number is its place in a Mask; masks are stored,
// so a number never changes its meaning.
type Test uint8

// The tests. What each does on daily values is said at Daily, on readings at
// Hours.
const (
	Range       Test = 0  // within the hard bounds of what can be
	Consistency Test = 1  // minimum <= mean <= maximum
	Step        Test = 2  // change since the value before
	Spike       Test = 3  // off the values before and after, to the same side
	Persistence Test = 4  // stands still through a day or hours of it
	Streak      Test = 5  // the same value on many days
	Naught      Test = 6  // maximum and minimum 0 degC, or 0 degF
	Gap         Test = 7  // apart from all other values of its month
	Climatology Test = 8  // far from the values of its date
	LaggedRange Test = 9  // maximum far above, or minimum far below, those of three days
	Neighbour   Test = 10 // far from what other stations let expect
)

// names are indexed by test.
var names = [...]string{
	"range", "consistency", "step", "spike", "persistence", "streak", "naught", "gap", "climatology", "lagged_range", "neighbour",
}

// Count is how many tests there are.
const Count = len(names)

// String returns the test's name in tables and messages.
func (t Test) String() string {
	if int(t) < len(names) {
		return names[t]
	}
	return fmt.Sprintf("test %d", uint8(t))
}

// Mask is a set of tests: bit t stands for test t.
type Mask uint32

// MaskOf returns the set of the given tests.
func MaskOf(tests ...Test) Mask {
	var m Mask
	for _, t := range tests {
		m |= 1 << t
	}
	return m
}

// Has reports whether the set has the test.
func (m Mask) Has(t Test) bool { return m>>t&1 == 1 }

// Tests lists the tests of the set, by number.
func (m Mask) Tests() []Test {
	var out []Test
	for t := range Test(32) {
		if m.Has(t) {
			out = append(out, t)
		}
	}
	return out
}

// String returns the names, with commas between.
func (m Mask) String() string {
	var s []string
	for _, t := range m.Tests() {
		s = append(s, t.String())
	}
	return strings.Join(s, ",")
}

// Outcome is what the tests found on a day.
type Outcome struct {
	Day    pipeline.Day
	Tested Mask // the tests that could be made
	Failed Mask // of these, those that failed
	// Mark follows from the two: wrong if Range failed, else inconsistent if
	// Consistency failed, else doubtful if any test failed, else good; not
	// checked if there was no test to make, missing if there was no value.
	Mark pipeline.Quality
}

// settle sets the mark of a day that has a value.
func (o *Outcome) settle() {
	switch {
	case o.Failed.Has(Range):
		o.Mark = pipeline.QualityWrong
	case o.Failed.Has(Consistency):
		o.Mark = pipeline.QualityInconsistent
	case o.Failed != 0:
		o.Mark = pipeline.QualityDoubtful
	case o.Tested != 0:
		o.Mark = pipeline.QualityGood
	default:
		o.Mark = pipeline.QualityNotChecked
	}
}

// note records that a test was made, and whether it failed.
func (o *Outcome) note(t Test, failed bool) {
	o.Tested |= 1 << t
	if failed {
		o.Failed |= 1 << t
	}
}
