// Package gather decides, without a database and without a clock of its own,
// who hears of a change, when, and what one message says of many changes.
//
//	change of a standing -> Heard -> one line a recipient and channel, waiting
//	lines that wait -> Ready? -> Compose -> what the message says of each standing
//	what was said    -> Remind, HandOn -> reminders, the next recipient
//
// What waits is told as it stands when the message is written. So a burst of any
// length is one message, a state that came and went is one line or none, and what
// was kept through quiet hours or a hold is not old news when it is told.
package gather
