// Package propose looks at a sample of an unknown station file and proposes a
// layout for it, as YAML for settings.yaml:
//
//	sample -> lines -> table -> time, station, temperatures -> layout -> csvfeed reads the sample by it
//	                      \-> what the file does not say     -> questions
//
// It proposes and a person decides. What the file does not state itself stands
// in the proposal as the likeliest answer with a question beside it: the unit
// unless a name or a line of units gives it, the order of day and month unless a
// day past the 12th proves it, the zone unless the text states it, whether a
// time is that of a start, an end or an instant, what a flag beside a value
// means, which number stands for no value. The running daemon never asks this
// package: it obeys the layout that a person has put into the settings.
//
// A proposal always compiles, and says how many rows of the sample it reads and
// sets aside. Look is pure: no files, no clock, and its work is bounded by the
// sample, of which it takes MaxSample bytes at most. Any bytes whatever give a
// proposal or an error that says what was found instead.
//
// It refuses: what is not text or not UTF-8, what has no column of dates, and no
// column of temperatures; month names, the 12-hour clock, seconds since 1970 and
// the decimal comma are named where they are the cause, for no layout reads them.
package propose
