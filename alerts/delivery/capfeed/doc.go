// Package capfeed publishes notices as OASIS CAP 1.2 messages on an Atom feed.
//
//	Notice -> Build -> one Message an item -> Keeper (the caller's)
//	Reader (the caller's) -> Handler -> feed.atom, and each message
//
// CAP is the Common Alerting Protocol, version 1.2, OASIS Standard of 1 July
// 2010 (also ITU-T X.1303 bis); the feed is RFC 4287. Words such as urgency,
// severity, certainty, Alert, Update and Cancel, and their values, are that
// standard's; they are used in this package and nowhere else.
//
// Every item becomes a message of its own, since an update or a cancellation
// concerns whole messages. Its identifier is made of the notice's key and of
// what the item is about, so that later messages can refer to earlier ones
// without anything having been written down.
//
// A message says Test until settings say Actual, and Exercise in a drill. Its
// scope is Restricted or Private, never Public: these are figures for those who
// look after a site. The handler does not ask who reads; where the feed can be
// reached by others, put something in front of it that does.
//
// Times are in UTC and end in -00:00: the standard wants an offset and forbids Z
// (section 3.3.2).
package capfeed
