// Package trend says whether a record of seasons changes with the years, and by
// how much, without assuming a distribution. It is pure: no I/O, no clock.
//
//	points (year, index) -> MannKendall -> is there a trend?
//	                     -> TheilSen    -> how many degC.d a year, within what bounds
//	                     -> LagOne      -> do neighbouring years go together?
//
// A word of caution: the test takes the years to be independent. Where one year
// goes with the next (a positive LagOne) it finds trends too easily, so that p must
// be read with LagOne beside it; and what the latest 30 years say and what the
// trend says belong in one report.
//
// It promises: the order of the points does not matter, missing years do not
// matter (slopes are over the true difference of time), no NaN and no infinity
// leaves a function. It refuses, with an error, fewer than MinPoints points, values
// that are not finite, and two points of one time.
package trend
