// Package judge compares an index with a design value. It is pure: no I/O, no
// clock. A standing is worked out from the whole of a season's days, so that
// judging again, in whatever order the days came, gives the same answer.
package judge
