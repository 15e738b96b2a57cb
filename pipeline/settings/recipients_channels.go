package settings

import (
	"net"
	netmail "net/mail"
	"net/url"
	"os"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// readChannels reads the ways by which notices are sent.
func (r *reader) readChannels(s *Settings, o *object, within func(string) string) {
	seen := map[string]*yaml.Node{}
	o.list("channels", func(n *yaml.Node, path string) {
		c := r.channel(r.object(n, path, n), within)
		if first, ok := seen[c.Name]; ok && c.Name != "" {
			r.fault(n, path, "give each channel a name of its own", "channel %s stands in line %d already", c.Name, first.Line)
			return
		}
		seen[c.Name] = n
		s.Channels = append(s.Channels, c)
	})
}

func (r *reader) channel(o *object, within func(string) string) pipeline.Channel {
	c := pipeline.Channel{Name: o.id("name")}
	ways := 0
	for _, way := range []struct {
		key  string
		read func(*object)
	}{
		{"mail", func(f *object) { c.Mail = r.mailChannel(f, within) }},
		{"webhook", func(f *object) { c.Webhook = r.webhookChannel(f, within) }},
		{"cap", func(f *object) { c.CAP = r.capChannel(f) }},
	} {
		if n := o.get(way.key); n != nil {
			f := r.object(n, o.at(way.key), n)
			way.read(f)
			f.done()
			ways++
		}
	}
	o.done()
	if ways != 1 && !o.bad {
		r.fault(o.node, o.path, "write one of mail, webhook and cap", "channel %s has %d of them", c.Name, ways)
	}
	return c
}

// secret reads the name of a file that has to be there; what it holds stays there.
func (o *object) secret(key string, within func(string) string, required bool) string {
	file := o.optional(key)
	if file == "" {
		if required {
			o.missing(key, "name the file that holds it")
		}
		return ""
	}
	file = within(file)
	if info, err := os.Stat(file); err != nil {
		o.r.fault(o.vals[key], o.at(key), "put the secret in a file that only the program can read", "%v", err)
	} else if info.IsDir() {
		o.r.fault(o.vals[key], o.at(key), "name a file", "%s is a folder", file)
	}
	return file
}

func (r *reader) mailChannel(o *object, within func(string) string) *pipeline.MailChannel {
	none := 0.0
	m := &pipeline.MailChannel{
		Host: o.text("host", "name the SMTP server"), Port: o.whole("port", &none, 0, 65535),
		Encryption: oneOf(o, "encryption", "starttls", "starttls", "tls", "none"), WhyNone: o.optional("why_none"),
		From: o.text("from", "write the sender's address, such as Thaw alerts <thaw@agency.example>"), ReplyTo: o.optional("reply_to"),
		User: o.optional("user"), PasswordFile: o.secret("password_file", within, false),
	}
	if o.bad {
		return m
	}
	for key, address := range map[string]string{"from": m.From, "reply_to": m.ReplyTo} {
		if _, err := netmail.ParseAddress(address); address != "" && err != nil {
			r.fault(o.vals[key], o.at(key), "write one such as Thaw alerts <thaw@agency.example>", "%q is no e-mail address", address)
		}
	}
	if (m.User == "") != (m.PasswordFile == "") {
		r.fault(o.node, o.path, "give both, or neither", "user and password_file go together")
	}
	switch {
	case m.Encryption == "none" && m.WhyNone == "":
		r.fault(o.vals["encryption"], o.at("encryption"), "use starttls or tls, or say in why_none why messages may go in the clear", "nothing would be encrypted")
	case m.Encryption == "none" && m.User != "":
		r.fault(o.vals["encryption"], o.at("encryption"), "use starttls or tls, or leave user out", "the password would be sent in the clear")
	case m.Encryption != "none" && m.WhyNone != "":
		r.fault(o.vals["why_none"], o.at("why_none"), "leave it out", "messages are encrypted")
	}
	return m
}

func (r *reader) webhookChannel(o *object, within func(string) string) *pipeline.WebhookChannel {
	w := &pipeline.WebhookChannel{Address: o.optional("url"), WhyNone: o.optional("why_none"), KeyFile: o.secret("key_file", within, true)}
	if w.Address == "" {
		return w
	}
	u, err := url.Parse(w.Address)
	at, path := o.vals["url"], o.at("url")
	switch {
	case err != nil || u.Host == "" || u.Scheme != "https" && u.Scheme != "http":
		r.fault(at, path, "write https://, a host and a path", "that is no address")
	case u.User != nil:
		r.fault(at, path, "leave them out: notices are signed", "credentials stand in the address")
	case u.Scheme == "http" && w.WhyNone == "":
		r.fault(at, path, "use https, or say in why_none why notices may go in the clear", "it is not encrypted")
	case u.Scheme == "https" && w.WhyNone != "":
		r.fault(o.vals["why_none"], o.at("why_none"), "leave it out", "notices are encrypted")
	}
	return w
}

func loopback(host string) bool {
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}

func (r *reader) capChannel(o *object) *pipeline.CAPChannel {
	c := &pipeline.CAPChannel{
		Sender:     o.text("sender", "write what identifies the agency for good, such as thaw@agency.example"),
		SenderName: o.text("sender_name", "write the agency's name"), Contact: o.optional("contact"),
		Actual: oneOf(o, "status", "Test", "Test", "Actual") == "Actual",
		Scope:  oneOf(o, "scope", "Restricted", "Restricted", "Private"), Restriction: o.optional("restriction"), Addresses: o.texts("addresses"),
		Language: o.textOr("language", "en"), Listen: o.text("listen", `write the address at which the feed is served, such as "127.0.0.1:8760"`),
		BaseURL: o.text("base_url", "write where the feed is reached from outside, such as https://agency.example/cap/"),
		FeedID:  o.text("feed_id", "write the feed's name for good, such as tag:agency.example,2031:thaw"),
		Title:   o.text("title", "write the feed's title"),
	}
	if host, _, err := net.SplitHostPort(c.Listen); c.Listen != "" && (err != nil || !loopback(host)) {
		r.fault(o.vals["listen"], o.at("listen"), `write one such as "127.0.0.1:8760" and put the agency's web server in front of it`, "%q is no loopback address, and the feed is not encrypted", c.Listen)
	}
	switch {
	case o.bad:
	case c.Scope == "Restricted" && c.Restriction == "":
		o.missing("restriction", "say for whom messages are, or write scope: Private")
	case c.Scope == "Restricted" && len(c.Addresses) > 0:
		r.fault(o.keys["addresses"], o.at("addresses"), "leave them out, or write scope: Private", "addresses are for scope Private")
	case c.Scope == "Private" && len(c.Addresses) == 0:
		o.missing("addresses", "name whom messages are for, or write scope: Restricted")
	case c.Scope == "Private" && c.Restriction != "":
		r.fault(o.keys["restriction"], o.at("restriction"), "leave it out, or write scope: Restricted", "a restriction is for scope Restricted")
	}
	return c
}
