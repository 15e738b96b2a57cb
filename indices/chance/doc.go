// Package chance answers, for a design value, what an engineer asks of it: how
// often was it passed, how likely is that in this year's climate, and within the
// years that are left. It is pure: no I/O, no clock.
//
//	record of seasons, design value -> Of -> Answer
//	    Latest: the latest 30 years as they were, as if the climate stood still
//	    Trend:  the whole record, each season moved along the trend to this year
//
// Both are given, each by counting and by the best fitting distribution, with the
// number of seasons that they rest on and an interval. Neither is right: the latest
// 30 years lag behind a changing climate by some 15 years; the line through all
// years takes the change to have been steady, and over the years to come takes it
// to go on. If they differ much, that is the answer.
//
// It promises: order of the seasons does not matter; the same figures and seed give
// the same answer; no NaN and no infinity leaves it. Incomplete and unfinished
// seasons are not for it: the caller leaves them out and says how many.
package chance
