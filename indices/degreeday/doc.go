// Package degreeday is the arithmetic of thawing and freezing indices. It is
// pure: no I/O, no clock.
//
//	daily means of one thaw (freeze) year -> Build -> Season: both indices, for
//	every day and for the season, with bounds where days are missing
//
// With the excess x of a day's mean over the base (freezing: of the base over
// the mean) and C(n) = x(1) + ... + x(n), C(0) = 0, all in degC.d:
//
//   - The curve index is the largest rise of C: the maximum over i < j of
//     C(j) - C(i). Days of the other sign inside the season count, and the low
//     comes before the high, so it is not max(C) - min(C). This is the seasonal
//     index of US Army TM 5-852-1 (UFC 3-130-01) and of the AMS Glossary of
//     Meteorology, "freezing index". ISO 13793:2001, annex A, begins the season
//     at the same point, and states the freezing index in K.h (24 K.h = 1 degC.d).
//   - The sum index is the sum of the positive x only (S. A. Harris, 1981, as
//     given in R. O. van Everdingen's glossary of permafrost terms, there over a
//     calendar year; here over the thaw or freeze year).
//
// It promises: a freezing index is bit for bit the thawing index of the mirrored
// temperatures; no index to date ever falls; the curve index is at most the sum;
// nothing depends on where in the cold season the thaw year starts; bounds hold
// for every filling of missing days within their own bounds. Sums are
// compensated and taken in order of date, with no products, so that all machines
// give the same bits.
//
// It refuses, with a panic that says which day, what only a fault of the caller
// can bring: days that are not consecutive, values that are not temperatures.
// A place without a thaw (freeze) season gets NoSeason, not an index of zero.
package degreeday
