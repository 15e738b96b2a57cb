// Package daily turns readings into a record of daily mean air temperatures. It
// is pure: no I/O, no clock.
//
//	readings of a day -> Make -> Value -+
//	readings of a day -> Make -> Value -+-> Complete -> every day of the record,
//	                                         and Extremes for the days around it
//
// It promises: the same values whatever the order of the readings; no mean but
// by the station's rule; every day from the first to the last observed one,
// never skipped and never taken as zero; bounds on every day that has no mean.
// Completing a completed record changes nothing.
//
// It refuses to guess: a day with too little is missing. A mark of wrong or
// missing keeps a value out; no other mark does.
package daily
