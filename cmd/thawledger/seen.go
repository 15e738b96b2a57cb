package main

import (
	"context"
	"fmt"
	"strings"
	"time"
)

// seen is the command `seen KEY`.
func (p program) seen(ctx context.Context, args []string) error {
	f := p.flags("seen", "seen KEY --by NAME: mark a notice as seen, so that nobody is reminded of it or told instead; KEY stands in the notice")
	file := f.String("settings", "settings.yaml", "settings `file`")
	by := f.String("by", "", "`name` of who has seen it")
	words, err := parse(f, args, 1)
	if err != nil {
		return err
	}
	if len(words) != 1 {
		f.Usage()
		return errUsage
	}
	name := strings.TrimSpace(*by)
	if name == "" {
		return fmt.Errorf("--by: say who has seen it")
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	if err := db.Seen(ctx, words[0], name, "command", time.Now()); err != nil {
		return err
	}
	fmt.Fprintf(p.out, "notice %s is marked as seen by %s\n", words[0], name)
	return nil
}
