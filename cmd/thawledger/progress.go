package main

import (
	"fmt"
	"os"
	"time"

	"golang.org/x/term"

	"thawledger/pipeline/store"
)

// progress returns a function that shows what is still to be done: on one line
// that is written over on a terminal, nothing elsewhere (the log says it there).
func (p program) progress() func(store.Pending) {
	f, ok := p.err.(*os.File)
	if !ok || !term.IsTerminal(int(f.Fd())) {
		return func(store.Pending) {}
	}
	var last time.Time
	return func(left store.Pending) {
		if left.Idle() {
			fmt.Fprint(p.err, "\r\033[K")
			return
		}
		if time.Since(last) > 200*time.Millisecond {
			last = time.Now()
			fmt.Fprintf(p.err, "\r\033[K%d batches being read, %d parts to commit, %d stations to judge", left.OpenBatches, left.OpenParts, left.Changes)
		}
	}
}
