package settings

import (
	"fmt"
	"time"

	"thawledger/pipeline"
)

func writeChannel(t *tree, c *pipeline.Channel) {
	t.text("name", c.Name)
	if m := c.Mail; m != nil {
		t.sub("mail", func(t *tree) {
			t.text("host", m.Host)
			t.number("port", float64(m.Port))
			t.text("encryption", m.Encryption)
			t.word("why_none", m.WhyNone)
			t.text("from", m.From)
			t.word("reply_to", m.ReplyTo)
			t.word("user", m.User)
			t.word("password_file", m.PasswordFile)
		})
	}
	if w := c.Webhook; w != nil {
		t.sub("webhook", func(t *tree) {
			t.word("url", w.Address)
			t.word("why_none", w.WhyNone)
			t.text("key_file", w.KeyFile)
		})
	}
	if c := c.CAP; c != nil {
		t.sub("cap", func(t *tree) {
			t.text("sender", c.Sender)
			t.text("sender_name", c.SenderName)
			t.word("contact", c.Contact)
			status := "Test"
			if c.Actual {
				status = "Actual"
			}
			t.text("status", status)
			t.text("scope", c.Scope)
			t.word("restriction", c.Restriction)
			t.texts("addresses", c.Addresses)
			t.text("language", c.Language)
			t.text("listen", c.Listen)
			t.text("base_url", c.BaseURL)
			t.text("feed_id", c.FeedID)
			t.text("title", c.Title)
		})
	}
}

func writeRecipient(t *tree, to *pipeline.Recipient) {
	t.text("id", to.ID)
	t.text("name", to.Name)
	if len(to.Addresses) > 0 {
		t.sub("addresses", func(t *tree) {
			for i := range t.s.Channels {
				t.word(t.s.Channels[i].Name, to.Addresses[t.s.Channels[i].Name])
			}
		})
	}
	t.list("hears", len(to.Hears), func(i int, t *tree) {
		h := &to.Hears[i]
		t.texts("sites", h.Sites)
		t.texts("tags", h.Tags)
		t.texts("surfaces", h.Surfaces)
		var states []pipeline.State
		for _, s := range h.States {
			states = append(states, writtenState(s))
		}
		t.texts("states", words(states))
		t.texts("channels", h.Channels)
	})
	t.text("unit", string(to.Unit))
	t.text("time_zone", to.Zone.String())
	if q := to.Quiet; q != nil {
		t.sub("quiet", func(t *tree) {
			t.text("from", clockText(q.From))
			t.text("to", clockText(q.To))
		})
	}
	t.duration("gather_for", to.GatherFor)
	t.duration("remind_every", to.RemindEvery)
	if to.Next != "" {
		t.text("next", to.Next)
		t.duration("next_after", to.NextAfter)
	}
}

func clockText(d time.Duration) string {
	return fmt.Sprintf("%02d:%02d", int(d.Hours()), int(d.Minutes())%60)
}

// writeSiteWords writes what a site says to recipients.
func writeSiteWords(t *tree, site *pipeline.Site) {
	t.texts("tags", site.Tags)
	if len(site.Instructions) > 0 {
		t.sub("instructions", func(t *tree) {
			for _, state := range heardStates {
				t.word(string(state), site.Instructions[shownState(state)])
			}
		})
	}
}
