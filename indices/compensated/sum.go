// Package compensated sums numbers so that what rounding takes away is kept
// beside. It is pure.
package compensated

import "math"

// Sum is a compensated sum (A. Neumaier, 1974, "Rundungsfehleranalyse einiger
// Verfahren zur Summation endlicher Summen", ZAMM 54); the zero value is zero.
// For a year of daily means the low part loses nothing, so that the value is the
// exact sum rounded once: it never falls when a term rises. There is no product in
// it, so that all machines give the same bits.
type Sum struct{ high, low float64 }

// Add adds a finite number.
func (s *Sum) Add(x float64) {
	sum := s.high + x
	if math.Abs(s.high) >= math.Abs(x) {
		s.low += (s.high - sum) + x
	} else {
		s.low += (x - sum) + s.high
	}
	s.high = sum
}

// Value returns the sum so far.
func (s *Sum) Value() float64 { return s.high + s.low }
