package delivery

import (
	"context"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"
)

// Channel delivers notices in one way. Deliver blocks until the outcome is
// known, ctx is done, or the channel's own time is up, whichever comes first. It
// never panics on what a receiver answers and may be used by several goroutines.
type Channel interface {
	Deliver(ctx context.Context, n Notice) Outcome
}

// Outcome is what came of one attempt to deliver.
type Outcome struct {
	Delivered bool

	// Again says that the same notice may be delivered by trying again: the
	// receiver refused for now, or could not be reached. It is false if the
	// receiver refused for good or if notice or settings are at fault. Only with
	// Delivered false.
	Again bool

	// After is how long the receiver asked to be left alone; 0 if it said nothing.
	After time.Duration

	// Answer is what the receiver said, or what went wrong, on one line for the
	// record; it holds no password, no key and at most 300 characters.
	Answer string
}

// Taken is the outcome of a delivery that the receiver confirmed.
func Taken(answer string) Outcome {
	return Outcome{Delivered: true, Answer: OneLine(answer, maxAnswer)}
}

// Failed is the outcome of an attempt that did not succeed.
func Failed(again bool, answer string) Outcome {
	return Outcome{Again: again, Answer: OneLine(answer, maxAnswer)}
}

const maxAnswer = 300

// OneLine returns s on one line: white space of any kind becomes single spaces,
// other characters that do not print are dropped, and what goes past limit
// characters is cut and ends in "...". Text from others goes through it before
// it reaches a header, a subject or a record.
func OneLine(s string, limit int) string {
	var b strings.Builder
	gap := false
	for _, r := range s {
		switch {
		case unicode.IsSpace(r):
			gap = b.Len() > 0
			continue
		case !unicode.IsPrint(r), r == utf8.RuneError:
			continue
		}
		if gap {
			b.WriteByte(' ')
			gap = false
		}
		b.WriteRune(r)
	}
	out := []rune(b.String())
	if len(out) <= limit {
		return string(out)
	}
	return strings.TrimRight(string(out[:max(limit-3, 0)]), " ") + "..."
}
