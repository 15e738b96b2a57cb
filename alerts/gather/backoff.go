package gather

import "time"

// Backoff returns how long to wait after an attempt that failed: evenly between 0
// and a limit that doubles with each attempt, from base up to most, so that many
// that failed together do not come back together. attempt counts from 1; share
// is a random number from 0 to 1. asked is how long the receiver asked to be left
// alone; the wait is at least that.
func Backoff(attempt int, base, most, asked time.Duration, share float64) time.Duration {
	limit := base
	for range attempt - 1 {
		if limit >= most/2 {
			limit = most
			break
		}
		limit *= 2
	}
	return max(time.Duration(share*float64(min(limit, most))), asked)
}
