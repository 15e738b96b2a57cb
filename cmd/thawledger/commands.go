package main

import (
	"context"
	"flag"
	"fmt"
	"runtime/debug"
	"strings"
)

const usage = `thawledger keeps account of how much thaw each surface on frozen ground has taken.

  thawledger demo                    an invented region, from CSV files to standings
  thawledger run                     the daemon: read feeds, make indices, judge surfaces
  thawledger settings check|show     look at the settings without starting anything
  thawledger schema [apply]          show the database's schema, or bring it up to date
  thawledger standing [SITE]         how surfaces stand against their design values
  thawledger design [compute]        how the record stands against the design values; one from the record
  thawledger ground                  thaw depth, freeze-back and permafrost measures by surface
  thawledger ledger                  what arrived and what became of it
  thawledger feed try FILE           what a feed would make of a file, or a layout for an unknown one
  thawledger feed read|reread|take   take a file by hand; read batches again; use one that waits
  thawledger edit ...                correct readings by hand, with author and reason; undo; list
  thawledger approve ...             answer for a record through a day; decide on late corrections
  thawledger filling show|test       how missing days would be filled, and how far off that is
  thawledger station compare A B     two records side by side, and the adjustment that joins them
  thawledger outlook [hindcast]      what seasons may come to; what such outlooks were worth
  thawledger notices                 what was sent to whom, and what waits to be told
  thawledger hold SITE[/SURFACE]     put notices off for a while; list; lift
  thawledger seen KEY                mark a notice as seen
  thawledger version

Each takes --help. Screening figures: local codes and a licensed engineer decide.
`

func (p program) run(ctx context.Context, args []string) error {
	if len(args) == 0 {
		fmt.Fprint(p.err, usage)
		return errUsage
	}
	name, rest := args[0], args[1:]
	switch name {
	case "demo":
		return p.demo(ctx, rest)
	case "run":
		return p.daemon(ctx, rest)
	case "settings":
		return p.settings(rest)
	case "schema":
		return p.schema(ctx, rest)
	case "standing":
		return p.standing(ctx, rest)
	case "design":
		return p.design(ctx, rest)
	case "ground":
		return p.ground(ctx, rest)
	case "ledger":
		return p.ledger(ctx, rest)
	case "outlook":
		return p.outlook(ctx, rest)
	case "feed":
		return p.feed(ctx, rest)
	case "edit":
		return p.edit(ctx, rest)
	case "filling":
		return p.filling(ctx, rest)
	case "station":
		return p.station(ctx, rest)
	case "approve":
		return p.approve(ctx, rest)
	case "notices":
		return p.notices(ctx, rest)
	case "hold":
		return p.hold(ctx, rest)
	case "seen":
		return p.seen(ctx, rest)
	case "version", "--version":
		fmt.Fprintln(p.out, version())
		return nil
	case "help", "-h", "--help":
		fmt.Fprint(p.out, usage)
		return nil
	}
	fmt.Fprintf(p.err, "thawledger: there is no command %q\n\n%s", name, usage)
	return errUsage
}

// flags makes a command's flags; synopsis is shown above them.
func (p program) flags(name, synopsis string) *flag.FlagSet {
	f := flag.NewFlagSet(name, flag.ContinueOnError)
	f.SetOutput(p.err)
	f.Usage = func() {
		fmt.Fprintf(p.err, "thawledger %s\n\n", synopsis)
		f.PrintDefaults()
	}
	return f
}

// parse reads a command's flags, which may stand before and after its words, and
// returns the words, of which there may be at most most.
func parse(f *flag.FlagSet, args []string, most int) (words []string, err error) {
	for rest := args; ; rest = f.Args()[1:] {
		if err := f.Parse(rest); err != nil {
			if err == flag.ErrHelp {
				return nil, err
			}
			return nil, errUsage
		}
		if f.NArg() == 0 {
			break
		}
		words = append(words, f.Arg(0))
	}
	if len(words) > most {
		fmt.Fprintf(f.Output(), "thawledger: what is %q for?\n", strings.Join(words[most:], " "))
		f.Usage()
		return nil, errUsage
	}
	return words, nil
}

// version says which program this is, for the settings' and the schema's history.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "thawledger (unknown build)"
	}
	v := "thawledger " + info.Main.Version
	for _, s := range info.Settings {
		switch {
		case s.Key == "vcs.revision":
			v += " " + s.Value[:min(12, len(s.Value))]
		case s.Key == "vcs.modified" && s.Value == "true":
			v += "+changes"
		}
	}
	return v
}
