// Package filling estimates daily mean temperatures that were not observed, and
// says how far off a season's index may be because of them. It is pure: no I/O,
// no clock.
//
//	record, neighbours -> Fit -> Model -> Ladder (Fill, FillLine, FillClimate) -> filled days
//	                                   \-> IndexError: index and its standard error, both definitions
//
// A day is filled by the first rung that can do it:
//
//   - line: on a straight line between the observed days beside a gap of at most
//     Options.LineDays days;
//   - neighbour: by regression on a neighbour's daily mean of the same day;
//   - climate: by the record's own mean for the date; for the index only where
//     settings allow it.
//
// Every rung carries the error that it had on days that were observed: for the
// neighbour and the climate found by leaving out whole years, because days of
// one year are not independent. Errors of days near each other are alike, and a
// part of the error is common to all days of a year: neither averages out as
// independent errors would, and IndexError counts both.
//
// It promises: the same result for the same input; no NaN or
// infinity; not ok rather than a guess where the record is too short.
package filling
