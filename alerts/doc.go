// Package alerts is the alerting stage: it compares indices with design values
// and keeps what came of it.
//
//	changes (a line a station) -> Judge -> standings, exceedances, standing_changes
//	standing_changes (not yet told) -> Announce -> bus and log
//
// Judging works off the table changes; the bus only says that looking is worth
// while. Every step may be done twice: a standing is worked out from the whole
// season, and what is told carries a key that does not change.
//
// Figures are for screening: local codes and a licensed engineer decide.
package alerts
