// Package pipeline holds the words that every stage shares: the station, the
// reading, the day, the index, the site, its surfaces and their design values.
//
//	feed -> ingest -> bus -> indices -> store -> alerts
//
// It imports the standard library only, does no I/O and reads no clock. The
// sub-packages bus and store are the only importers of the message and the
// database client; the three stages meet there and nowhere else.
package pipeline
