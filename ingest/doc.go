// Package ingest is the ingest worker: it finds out what has arrived, keeps it,
// reads it by its feed's layout and publishes the readings.
//
//	folder -> archive -> ledger line -> first pass: counts, set-aside rows, parts -> ledger
//	                                    second pass: parts -> bus -> confirmed -> ledger
//
// A file is read twice: only after the first pass is it known that the layout
// fits and the batch is not held back, and what parts it has. Both passes, and
// every later one, come to the same parts, since the layout is kept with the
// batch; so a part that was lost on its way is made again from the archive.
//
// Nothing is lost whenever the process is killed: what is not in the ledger is
// still in the folder, and what is in the ledger and not committed is published
// again.
package ingest
