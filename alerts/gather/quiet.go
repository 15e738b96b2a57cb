package gather

import (
	"time"

	"thawledger/pipeline"
)

const wholeDay = 24 * time.Hour

// AfterQuiet returns the first instant, t or later, that is not within quiet
// hours in a zone; t if quiet is nil. The hours are those of the clock on the
// wall: where it is put forward across the end of them they end with that, and
// where it is put back into them they begin again.
func AfterQuiet(quiet *pipeline.Quiet, zone *time.Location, t time.Time) time.Time {
	if quiet == nil {
		return t
	}
	if zone == nil {
		zone = time.UTC
	}
	for {
		local := t.In(zone)
		wall := onTheWall(local)
		if !within(quiet, wall) {
			return t
		}
		left := (quiet.To - wall + wholeDay) % wholeDay
		end := t.Add(left)
		// The wall clock goes on evenly only until the zone's offset changes.
		if _, jump := local.ZoneBounds(); !jump.IsZero() && !jump.After(end) {
			end = jump
		}
		t = end
	}
}

// onTheWall is the time of day that a clock shows.
func onTheWall(local time.Time) time.Duration {
	return time.Duration(local.Hour())*time.Hour + time.Duration(local.Minute())*time.Minute +
		time.Duration(local.Second())*time.Second + time.Duration(local.Nanosecond())
}

func within(quiet *pipeline.Quiet, wall time.Duration) bool {
	if quiet.From < quiet.To {
		return quiet.From <= wall && wall < quiet.To
	}
	return quiet.From <= wall || wall < quiet.To
}
