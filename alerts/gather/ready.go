package gather

import (
	"time"

	"thawledger/pipeline"
)

// patience is how many times GatherFor a message waits for work that is still
// going on, at most.
const patience = 3

// Ready says whether a message about changes that wait goes out now, and if not
// when to look again. first is when the first of them was noted. busy says that
// readings that have come are still being taken or judged: more changes may
// follow, as when the history of many stations is loaded, and the message waits
// for them up to three times as long (judgement).
func Ready(r *pipeline.Recipient, first time.Time, busy bool, now time.Time) (yes bool, again time.Time) {
	due := first.Add(r.GatherFor)
	if now.Before(due) {
		return false, AfterQuiet(r.Quiet, r.Zone, due)
	}
	if last := first.Add(patience * r.GatherFor); busy && now.Before(last) {
		return false, AfterQuiet(r.Quiet, r.Zone, last)
	}
	if open := AfterQuiet(r.Quiet, r.Zone, now); open.After(now) {
		return false, open
	}
	return true, now
}
