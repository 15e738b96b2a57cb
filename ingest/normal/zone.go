package normal

import (
	"fmt"
	"strings"
	"time"

	"thawledger/pipeline"
)

// Zone is a named zone of the tz database made ready, with what is to be done
// with the times that its clocks show twice or not at all. It may be used by
// several goroutines at once.
type Zone struct {
	loc       *time.Location
	ambiguous pipeline.Ambiguous
	skipped   pipeline.Skipped
}

// Offset is a spell of civil time in which a zone's offset from UTC cannot be in
// doubt. The zero value is none.
type Offset struct{ fromS, toS, offsetS int64 }

// reachS is more than any two offsets of a zone differ, and more than any offset
// from UTC: the tz database has -15:56 to +15:13 (from memory). No zone changes
// its offset twice within twice as long: the shortest spell is of 96 h (Freetown,
// September 1939; tz database of Go 1.26, 1881 to 2042).
const reachS = 36 * 3600

// keptS is for how long an offset is taken to hold once it is known to hold before
// and after.
const keptS = 86400

// LoadZone makes a zone such as America/Edmonton ready.
func LoadZone(name string, ambiguous pipeline.Ambiguous, skipped pipeline.Skipped) (*Zone, error) {
	if !IsZoneName(name) {
		return nil, fmt.Errorf("%q is no named zone such as America/Edmonton", name)
	}
	loc, err := time.LoadLocation(name)
	if err != nil {
		return nil, fmt.Errorf("there is no zone %q such as America/Edmonton", name)
	}
	return &Zone{loc, ambiguous, skipped}, nil
}

// IsZoneName reports whether text looks like the name of a zone: area, slash and
// place. Short names such as MST are none: they mean different things in different
// places, and nothing says whether they change in summer.
func IsZoneName(text string) bool { return strings.Contains(text, "/") }

// UnixS returns the instant of a civil time, in s since 1970-01-01T00:00:00Z.
// Resolved says that the clocks show the time twice or not at all, and that the
// zone's rule has decided; where the rule is to set aside, that is the error.
// A time that is skipped is moved on by as much as the clocks were: 02:30 in the
// hour that is left out is 03:30.
//
// Last is kept from one call to the next, so that not each has to look up the
// zone.
func (z *Zone) UnixS(c Civil, last *Offset) (s int64, resolved bool, err error) {
	local := c.UnixS()
	if last.fromS <= local && local < last.toS {
		return local - last.offsetS, false, nil
	}
	before, after := z.offset(local-reachS), z.offset(local+reachS)
	if before == after {
		if z.offset(local+reachS+keptS) == before {
			*last = Offset{local, local + keptS, before}
		}
		return local - before, false, nil
	}
	first, latest := local-before, local-after
	showsFirst, showsLatest := z.offset(first) == before, z.offset(latest) == after
	switch {
	case showsFirst && !showsLatest:
		return first, false, nil
	case showsLatest && !showsFirst:
		return latest, false, nil
	case showsFirst && z.ambiguous == pipeline.AmbiguousEarlier:
		return first, true, nil
	case showsFirst && z.ambiguous == pipeline.AmbiguousLater:
		return latest, true, nil
	case showsFirst:
		return 0, false, fmt.Errorf("the clocks of %s showed %s twice", z.loc, civilText(local))
	case z.skipped == pipeline.SkippedShift:
		return local - before, true, nil
	}
	return 0, false, fmt.Errorf("the clocks of %s never showed %s", z.loc, civilText(local))
}

// offset is the zone's offset from UTC at an instant. Package time also has the
// bounds of an offset's spell, but gets them wrong around the ends of years to
// come (Go 1.26).
func (z *Zone) offset(s int64) int64 {
	_, offset := time.Unix(s, 0).In(z.loc).Zone()
	return int64(offset)
}

func civilText(s int64) string { return time.Unix(s, 0).UTC().Format("2006-01-02 15:04:05") }
