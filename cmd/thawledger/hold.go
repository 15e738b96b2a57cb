package main

import (
	"context"
	"fmt"
	"slices"
	"strconv"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/settings"
	"thawledger/pipeline/store"
)

const holdSynopsis = `hold SITE[/SURFACE] --until TIME --by NAME --why TEXT: put notices off; what changes is told when the hold ends, as it stands then
thawledger hold --station STATION --until TIME --by NAME --why TEXT: the same for all sites that draw on a station
thawledger hold list: the holds in force
thawledger hold lift NUMBER --by NAME: end a hold now
TIME is such as 2031-08-01, 2031-08-01T06:00Z or 2031-08-01T06:00-08:00 (a date is its beginning in UTC), or a length such as 48h`

// hold is the command `hold`.
func (p program) hold(ctx context.Context, args []string) error {
	f := p.flags("hold", holdSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	until := f.String("until", "", "when the hold ends, as a `time`")
	by := f.String("by", "", "`name` of who answers for it")
	why := f.String("why", "", "the reason, as a `text`")
	station := f.String("station", "", "hold all sites that draw on a `station`")
	words, err := parse(f, args, 2)
	if err != nil {
		return err
	}
	list, lift := slices.Equal(words, []string{"list"}), len(words) == 2 && words[0] == "lift"
	if put := len(words) == 1 && *station == "" || len(words) == 0 && *station != ""; !list && !lift && !put {
		f.Usage()
		return errUsage
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	now := time.Now()
	h := store.Hold{Station: *station, By: strings.TrimSpace(*by), Why: strings.TrimSpace(*why), From: now}
	number := int64(0)
	switch {
	case list:
	case h.By == "":
		return fmt.Errorf("--by: say who answers for it")
	case lift:
		if number, err = strconv.ParseInt(words[1], 10, 64); err != nil {
			return fmt.Errorf("%q is no number of a hold; `thawledger hold list` shows them", words[1])
		}
	default:
		if err := completeHold(&h, strings.Join(words, ""), *until, set, now); err != nil {
			return err
		}
	}
	db, done, err := p.reading(ctx, set)
	if err != nil {
		return err
	}
	defer done()
	switch {
	case list:
		return p.listHolds(ctx, db, now)
	case lift:
		if err := db.LiftHold(ctx, number, h.By, now); err != nil {
			return err
		}
		fmt.Fprintf(p.out, "hold %d is lifted; what changed meanwhile is told now, as it stands\n", number)
		return nil
	}
	if number, err = db.AddHold(ctx, h); err != nil {
		return err
	}
	fmt.Fprintf(p.out, "hold %d: nothing is told of %s until %s\n", number, heldWhat(&h), h.Until.UTC().Format("2006-01-02 15:04 UTC"))
	return nil
}

// completeHold reads what is held, and until when.
func completeHold(h *store.Hold, what, until string, set *settings.Settings, now time.Time) (err error) {
	if h.Why == "" {
		return fmt.Errorf("--why: say why")
	}
	if h.Until, err = endOfHold(until, now); err != nil {
		return err
	}
	if h.Station != "" {
		if !slices.ContainsFunc(set.Stations, func(s pipeline.Station) bool { return s.ID == h.Station }) {
			return fmt.Errorf("there is no station %q in the settings", h.Station)
		}
		return nil
	}
	h.Site, h.Surface, _ = strings.Cut(what, "/")
	i := slices.IndexFunc(set.Sites, func(s pipeline.Site) bool { return s.ID == h.Site })
	if i < 0 {
		return fmt.Errorf("there is no site %q in the settings", h.Site)
	}
	if h.Surface != "" && !slices.ContainsFunc(set.Sites[i].Surfaces, func(s pipeline.Surface) bool { return s.ID == h.Surface }) {
		return fmt.Errorf("site %s has no surface %q in the settings", h.Site, h.Surface)
	}
	return nil
}

// endOfHold reads --until.
func endOfHold(text string, now time.Time) (time.Time, error) {
	if text == "" {
		return time.Time{}, fmt.Errorf("--until: say when the hold ends")
	}
	end := time.Time{}
	if d, err := time.ParseDuration(text); err == nil {
		end = now.Add(d)
	}
	for _, form := range []string{time.DateOnly, "2006-01-02T15:04Z07:00", time.RFC3339} {
		if t, err := time.Parse(form, text); err == nil {
			end = t
		}
	}
	switch {
	case end.IsZero():
		return end, fmt.Errorf("--until: %q is no time such as 2031-08-01T06:00Z, 2031-08-01 or 48h", text)
	case !end.After(now):
		return end, fmt.Errorf("--until: %s is over", end.UTC().Format("2006-01-02 15:04 UTC"))
	}
	return end, nil
}

func heldWhat(h *store.Hold) string {
	switch {
	case h.Station != "":
		return "sites on station " + h.Station
	case h.Surface != "":
		return h.Site + "/" + h.Surface
	}
	return h.Site
}

func (p program) listHolds(ctx context.Context, db *store.DB, now time.Time) error {
	holds, err := db.Holds(ctx, now)
	if err != nil {
		return err
	}
	if len(holds) == 0 {
		fmt.Fprintln(p.out, "no hold is in force")
		return nil
	}
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "NUMBER\tWHAT\tUNTIL (UTC)\tBY\tWHY")
	for i := range holds {
		h := &holds[i]
		fmt.Fprintf(w, "%d\t%s\t%s\t%s\t%s\n", h.ID, heldWhat(h), h.Until.UTC().Format("2006-01-02 15:04"), h.By, h.Why)
	}
	return w.Flush()
}
