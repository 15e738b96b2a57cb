// Package quality tests a station's temperatures and marks them by WMO BUFR
// table 0 33 020. It is pure: no I/O, no clock.
//
//	a whole record of days -> Daily -> an Outcome a day
//	readings of one day    -> Hours -> one Outcome
//
// An Outcome says which tests were made, which failed, and the mark that
// follows. Every outcome is kept, not only the mark: who looks at a doubtful day
// years later wants to know why.
//
// The tests fire on the very warm spells that matter, so by them alone a value
// is at most doubtful, or inconsistent with another of the same day; either
// stays in the index. Only a value beyond the hard bounds of Range is wrong.
//
// Two things the tests are careful of:
//
//   - Limits of step and persistence that the guidelines state are for values a
//     minute apart. They are widened here with the time between two values (see
//     StepLimitC), and for daily means with the record's own differences: the
//     end of an inversion warms a valley by 20 degC in an hour.
//   - Around 0 degC ground and its surface stand still for weeks while water
//     freezes or snow melts (the zero curtain): within 0.2 degC of zero they are
//     not tested for standing still. Air that stands still there is doubtful: a
//     sensor under ice or snow.
//
// Sources. M. Zahumensky, 2004, "Guidelines on Quality Control Procedures for
// Data from Automatic Weather Stations" (WMO), for plausible range, step and
// least variability, and I. Durre et al., 2010, "Comprehensive automated quality
// assurance of daily surface observations", J. Appl. Meteorol. Climatol. 49, for
// streak, gap, climatological outlier, lagged range, spike, neighbours and
// naught. Both were read second-hand, as others quote and implement them; the
// originals were not at hand. What is from memory, or judgement, is said where
// it stands.
//
// It promises: outcomes depend on the values alone; on a record moved by a
// constant the tests of differences give the same; every fault of a value
// beyond the hard bounds stays out of the statistics that other values are
// tested with.
package quality
