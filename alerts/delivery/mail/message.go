package mail

import (
	"bytes"
	"fmt"
	netmail "net/mail"
	"strings"

	gomail "github.com/wneessen/go-mail"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
)

// message puts a notice into a message. The same notice gives the same message,
// but for the lines that part its pieces.
func (c *Channel) message(n delivery.Notice) (*gomail.Msg, error) {
	w, err := c.texts.Write(n)
	if err != nil {
		return nil, err
	}
	pictures, err := text.Pictures(n)
	if err != nil {
		return nil, err
	}
	m := gomail.NewMsg(gomail.WithNoDefaultUserAgent())
	if err := c.addresses(m, n); err != nil {
		return nil, err
	}
	m.Subject(w.Subject)
	m.SetDateWithValue(n.Written)
	m.SetMessageIDWithValue(c.messageID(n.Key))
	if cited := c.cited(n); len(cited) > 0 {
		m.SetGenHeader(gomail.HeaderInReplyTo, "<"+cited[0]+">")
		m.SetGenHeader(gomail.HeaderReferences, "<"+strings.Join(cited, "> <")+">")
	}
	// RFC 3834, section 5: sent by a program, not in answer to anything.
	m.SetGenHeader("Auto-Submitted", "auto-generated")
	m.SetGenHeader("Thawledger-Key", n.Key)
	m.SetGenHeader("Thawledger-Kind", string(n.Kind))
	m.SetBodyString(gomail.TypeTextPlain, w.Plain)
	m.AddAlternativeString(gomail.TypeTextHTML, w.HTML)
	for i, chart := range pictures {
		if err := embed(m, i, chart); err != nil {
			return nil, err
		}
	}
	return m, nil
}

func (c *Channel) addresses(m *gomail.Msg, n delivery.Notice) error {
	to, err := netmail.ParseAddress(n.Recipient.Address)
	if err != nil {
		return fmt.Errorf("recipient's address %q: %w", n.Recipient.Address, err)
	}
	if to.Name == "" {
		to.Name = delivery.OneLine(n.Recipient.Name, 120)
	}
	m.ToMailAddress(to)
	if err := m.From(c.settings.From); err != nil {
		return fmt.Errorf("sender's address: %w", err)
	}
	if c.settings.ReplyTo != "" {
		if err := m.ReplyTo(c.settings.ReplyTo); err != nil {
			return fmt.Errorf("address for replies: %w", err)
		}
	}
	return nil
}

func embed(m *gomail.Msg, i int, chart text.Picture) error {
	err := m.EmbedReader(fmt.Sprintf("chart-%d.png", i+1), bytes.NewReader(chart.PNG),
		gomail.WithFileContentID(chart.ID), gomail.WithFileContentType("image/png"), gomail.WithFileDescription(delivery.OneLine(chart.Alt, 200)))
	if err != nil {
		return fmt.Errorf("add chart: %w", err)
	}
	return nil
}

// messageID is the Message-ID of a notice, without its brackets.
func (c *Channel) messageID(key string) string { return key + "@" + c.settings.domain() }

// cited are the Message-IDs of the first notices about the items, each once.
func (c *Channel) cited(n delivery.Notice) []string {
	var out []string
	seen := map[string]bool{n.Key: true}
	for i := range n.Items {
		if first, told := n.Items[i].First(); told && !seen[first.Key] {
			seen[first.Key] = true
			out = append(out, c.messageID(first.Key))
		}
	}
	return out
}
