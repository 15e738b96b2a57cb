// Package send writes notices and sees them delivered.
//
//	thaw.notice_changes (a line a recipient, channel and change, written with the change)
//	   -> gather: what waits long enough becomes one message   thaw.notices, thaw.notice_items
//	   -> work:   what is due is handed to its channel         thaw.notice_attempts
//
// A notice is sent at least once, always with the same key. What was in hand when
// a process ended is taken again when its lease is over. What cannot be delivered
// is tried again, ever less often, and given up in the end: on record, in the log,
// and to the recipient named operator if there is one.
//
// Figures are for screening: local codes and a licensed engineer decide.
package send
