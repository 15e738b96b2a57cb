// Package bus carries parts from the ingest workers to the index service, and
// what the alerting stage has to say to whoever listens. It is the only package
// that speaks to the message server, and the server's own terms stay inside it:
// the rest of the program says publish, take, done, not now and never again.
//
//	ingest --Publisher.Publish--> [ readings, on disk ] --Taker.Take--> indices
//	                                     ^                                 |
//	                                     +------- not now / nothing -------+
//	                                done, never again: gone from the bus
//
//	alerts --Announce--> [ announcements, on disk for 90 days ] --> subscribers
//	anyone --Nudge-----> "something changed", not kept        --> Nudges
//
// # What it promises
//
// A part whose publication was reported as good is on the server's disk (the
// embedded server writes through before it answers; a cluster does as it is set
// up). It is given to takers until one says done or never again, however often
// that takes and across restarts of everything. Nothing is thrown away to make
// room: a full bus refuses new parts (see ErrFull). A part published again with
// the same batch, number and attempt within two minutes is dropped; with a new
// attempt it passes.
//
// # What it does not promise
//
// A part may be delivered more than once: when its taker was slower than
// Config.WorkTime, when a done got lost, when a message came just as its taker
// gave up, or when a process died. Parts of one station may come in another
// order than they were published in, even to a single taker. Only writing
// results by key makes up for both. A storage fault may still lose what was
// acknowledged; the ledger finds that, not the bus.
//
// # Trouble
//
// A lost connection is never final: the client tries again for ever, logs both
// ends of the gap, and calls made meanwhile fail at once with an error for which
// Temporary is true; nothing is buffered behind the caller's back. What was
// deleted on the server by other hands is made again at the next Take, Waiting
// or failed Flush; Restored counts it. Only Close is final (ErrClosed).
//
// The folder of an embedded server must be locked by the caller: two servers
// would open it without complaint and spoil it.
package bus
