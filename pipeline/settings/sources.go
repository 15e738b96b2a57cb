package settings

import (
	"net/url"
	"time"

	"thawledger/pipeline"
)

// remote reads where a feed's files are fetched from; nil for nowhere.
func (r *reader) remote(o *object, within func(string) string) *pipeline.Remote {
	if !o.has("url") {
		o.known = append(o.known, "url")
		return nil
	}
	n := o.get("url")
	f := r.object(n, o.at("url"), n)
	m := &pipeline.Remote{URL: f.text("address", "write https:// and so on"), User: f.textOr("user", ""),
		PasswordFile: within(f.textOr("password_file", "")), BearerFile: within(f.textOr("bearer_file", "")),
		Timeout: f.duration("timeout", time.Minute)}
	f.done()
	if u, err := url.Parse(m.URL); m.URL != "" && (err != nil || u.Scheme != "http" && u.Scheme != "https" || u.Host == "") {
		r.fault(f.vals["address"], f.at("address"), "write http:// or https://, a host and a path", "that is no address")
	} else if err == nil && u.User != nil {
		r.fault(f.vals["address"], f.at("address"), "give user and password_file", "credentials stand in the address")
	}
	if (m.User == "") != (m.PasswordFile == "") {
		r.fault(n, o.at("url"), "give both, or neither", "user and password_file go together")
	}
	if m.BearerFile != "" && m.User != "" {
		r.fault(n, o.at("url"), "leave one of them out", "bearer_file and user are both given")
	}
	return m
}

// push reads how a feed's files may be pushed; nil for not at all.
func (r *reader) push(o *object, within func(string) string) *pipeline.Push {
	if !o.has("push") {
		o.known = append(o.known, "push")
		return nil
	}
	n := o.get("push")
	f := r.object(n, o.at("push"), n)
	megabytes := 64.0
	p := &pipeline.Push{TokenFile: within(f.text("token_file", "name the file that holds the feed's token")),
		MaxBytes: int64(f.whole("max_megabytes", &megabytes, 1, 4096)) << 20}
	f.done()
	return p
}

// Listen says where pushed files are taken.
type Listen struct {
	Address         string // host:port; "" for not at all
	CertificateFile string
	KeyFile         string
	Plain           bool // without TLS on other than loopback addresses
}

func (r *reader) readPush(s *Settings, o *object, within func(string) string) {
	s.Listen = Listen{Address: o.textOr("listen", ""), CertificateFile: within(o.textOr("certificate_file", "")),
		KeyFile: within(o.textOr("key_file", "")), Plain: o.yes("plain")}
	o.done()
	if (s.Listen.CertificateFile == "") != (s.Listen.KeyFile == "") {
		r.fault(o.node, o.at("certificate_file"), "give both, or neither", "certificate_file and key_file go together")
	}
	pushed := false
	for i := range s.Feeds {
		pushed = pushed || s.Feeds[i].Push != nil
	}
	switch {
	case pushed && s.Listen.Address == "" && len(r.faults) == 0:
		r.fault(o.node, "push.listen", `write the address that files are pushed to, such as "127.0.0.1:8750"`, "it is missing, and a feed has push")
	case !pushed && s.Listen.Address != "" && len(r.faults) == 0:
		r.warn(o.vals["listen"], o.at("listen"), "no feed has push: there is nothing to listen for")
	}
}
