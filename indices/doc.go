// Package indices is the index service: it takes parts off the bus and turns
// them into readings, daily values and thawing and freezing indices.
//
//	bus -> intake -> a list a station -> worker: one transaction -> done
//	                                       readings -> daily values -> air indices -> a line in changes
//
// All parts of a station that wait are worked off in one transaction under the
// station's lock, so that thirty years of history are not recomputed once a
// part. Parts are done only after the commit, and everything written is worked
// out from what is stored, never added to it: a part that comes twice, or late,
// or out of order, leaves the same tables.
//
// The arithmetic is in daily and degreeday, which know nothing of any of this.
package indices
