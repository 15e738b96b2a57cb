package main

import (
	"context"
	"fmt"
	"strings"
	"text/tabwriter"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// notices is the command `notices`.
func (p program) notices(ctx context.Context, args []string) error {
	f := p.flags("notices", "notices [--site SITE] [--days N]: what was sent to whom and what became of it, and what waits to be told")
	file := f.String("settings", "settings.yaml", "settings `file`")
	site := f.String("site", "", "only notices about a `site`")
	days := f.Int("days", 30, "how many `days` back")
	if _, err := parse(f, args, 0); err != nil {
		return err
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
	now := time.Now()
	sent, err := db.Notices(ctx, *site, now.AddDate(0, 0, -*days))
	if err != nil {
		return err
	}
	waiting, err := db.WaitingNotices(ctx, *site, now)
	if err != nil {
		return err
	}
	if len(sent)+len(waiting) == 0 {
		fmt.Fprintf(p.out, "no notices in %d days, and nothing waits to be told\n", *days)
		return nil
	}
	p.showNotices(sent)
	p.showWaiting(waiting)
	fmt.Fprintln(p.out, "\n"+pipeline.Caution)
	return nil
}

func (p program) showNotices(sent []store.NoticeShown) {
	if len(sent) == 0 {
		return
	}
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintln(w, "WRITTEN (UTC)\tKEY\tTO\tBY\tKIND\tABOUT\tATTEMPTS\tOUTCOME\tSEEN BY")
	for i := range sent {
		n := &sent[i]
		fmt.Fprintf(w, "%s\t%s\t%s\t%s\t%s\t%s\t%d\t%s\t%s\n", minute(n.WrittenAt), n.Key, n.Recipient, n.Channel, n.Kind, about(n.Says), n.Attempts, became(n), n.SeenBy)
	}
	w.Flush()
}

func minute(t time.Time) string { return t.UTC().Format("2006-01-02 15:04") }

// about shows the first of what a notice says, and how many more there are.
func about(says []string) string {
	switch len(says) {
	case 0:
		return ""
	case 1:
		return strings.ReplaceAll(says[0], "_", " ")
	}
	return fmt.Sprintf("%s and %d more", strings.ReplaceAll(says[0], "_", " "), len(says)-1)
}

// became is what became of a notice.
func became(n *store.NoticeShown) string {
	why := ""
	if n.Reason != "" {
		why = ": " + delivery.OneLine(n.Reason, 80)
	}
	switch {
	case n.DeliveredAt != nil:
		return "delivered " + minute(*n.DeliveredAt)
	case n.GivenUpAt != nil:
		return "given up " + minute(*n.GivenUpAt) + why
	case n.Attempts == 0:
		return "to be sent"
	}
	return "again at " + minute(n.NextAttemptAt) + why
}

func (p program) showWaiting(waiting []store.WaitingShown) {
	if len(waiting) == 0 {
		return
	}
	fmt.Fprintln(p.out, "\nwaiting to be told:")
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	for _, c := range waiting {
		why := "gathering, or in quiet hours"
		if c.Held {
			why = "on hold"
		}
		fmt.Fprintf(w, "  %s\t%s\t%s/%s\t%s\tnoted %s UTC\t%s\n", c.Recipient, c.Channel, c.Site, c.Surface, strings.ReplaceAll(string(c.To), "_", " "), minute(c.NotedAt), why)
	}
	w.Flush()
}
