package mail_test

import (
	"encoding/base64"
	"io"
	"mime"
	"mime/multipart"
	"mime/quotedprintable"
	netmail "net/mail"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/emersion/go-smtp"
	"go.uber.org/goleak"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/deliverytest"
	"thawledger/alerts/delivery/mail"
	"thawledger/alerts/delivery/text"
	"thawledger/pipeline"
)

// What every channel does is tested in deliverytest; here is what only mail does.

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func receiver(t *testing.T, o deliverytest.SMTPOptions) *deliverytest.SMTP {
	t.Helper()
	r, err := deliverytest.StartSMTP(o)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(r.Close)
	return r
}

func settings(r *deliverytest.SMTP) mail.Settings {
	return mail.Settings{Host: r.Host, Port: r.Port, Authorities: r.Authorities, From: "Thaw alerts <thaw@fellmoor.example>",
		Hello: "thaw.fellmoor.example", Timeout: time.Minute}
}

func channel(t *testing.T, s mail.Settings) *mail.Channel {
	t.Helper()
	texts, err := text.Load("")
	if err != nil {
		t.Fatal(err)
	}
	c, err := mail.New(s, texts)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func password(t *testing.T, s string) string {
	t.Helper()
	name := filepath.Join(t.TempDir(), "password")
	if err := os.WriteFile(name, []byte(s), 0o600); err != nil {
		t.Fatal(err)
	}
	return name
}

// part is a leaf of a message.
type part struct {
	media, id, disposition string
	body                   []byte
}

func read(t *testing.T, raw string) (netmail.Header, []part) {
	t.Helper()
	m, err := netmail.ReadMessage(strings.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	return m.Header, leaves(t, m.Header.Get("Content-Type"), m.Header.Get("Content-Transfer-Encoding"), "", "", m.Body)
}

func leaves(t *testing.T, contentType, encoding, id, disposition string, body io.Reader) []part {
	t.Helper()
	media, params, err := mime.ParseMediaType(contentType)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.HasPrefix(media, "multipart/") {
		switch strings.ToLower(encoding) {
		case "base64":
			body = base64.NewDecoder(base64.StdEncoding, body)
		case "quoted-printable":
			body = quotedprintable.NewReader(body)
		}
		content, err := io.ReadAll(body)
		if err != nil {
			t.Fatal(err)
		}
		return []part{{media, strings.Trim(id, "<>"), disposition, content}}
	}
	var out []part
	for r := multipart.NewReader(body, params["boundary"]); ; {
		p, err := r.NextRawPart()
		if err == io.EOF {
			return out
		}
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, leaves(t, p.Header.Get("Content-Type"), p.Header.Get("Content-Transfer-Encoding"), p.Header.Get("Content-Id"), p.Header.Get("Content-Disposition"), p)...)
	}
}

func TestMessage(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{})
	s := settings(r)
	s.ReplyTo = "office@fellmoor.example"
	n := delivery.Samples()[0]
	n.Items[0].SurfaceName = "runway \u00e6st" // outside ASCII, as names are
	if out := channel(t, s).Deliver(t.Context(), n); !out.Delivered {
		t.Fatalf("%+v", out)
	}
	got := r.All()[0]
	header, parts := read(t, got.Text)
	subject, err := new(mime.WordDecoder).DecodeHeader(header.Get("Subject"))
	if err != nil {
		t.Fatal(err)
	}
	for name, pair := range map[string][2]string{
		"sender":         {got.From, "thaw@fellmoor.example"},
		"recipient":      {got.To, "duty@fellmoor.example"},
		"From":           {header.Get("From"), `"Thaw alerts" <thaw@fellmoor.example>`},
		"To":             {header.Get("To"), `"Duty engineer, Fellmoor" <duty@fellmoor.example>`},
		"Reply-To":       {header.Get("Reply-To"), "<office@fellmoor.example>"},
		"Subject":        {subject, "Fellmoor airstrip, runway \u00e6st: thaw index past its design value (1703 of 1700 degC.d)"},
		"Date":           {header.Get("Date"), "Thu, 21 Aug 2031 14:00:00 +0000"},
		"Message-ID":     {header.Get("Message-Id"), "<n-31-0821-1@fellmoor.example>"},
		"Auto-Submitted": {header.Get("Auto-Submitted"), "auto-generated"},
		"Thawledger-Key": {header.Get("Thawledger-Key"), "n-31-0821-1"},
		"In-Reply-To":    {header.Get("In-Reply-To"), ""},
		"References":     {header.Get("References"), ""},
	} {
		if pair[0] != pair[1] {
			t.Errorf("%s: %q, want %q", name, pair[0], pair[1])
		}
	}
	if !got.Encrypted {
		t.Error("sent in the clear")
	}
	if len(parts) != 3 || parts[0].media != "text/plain" || parts[1].media != "text/html" || parts[2].media != "image/png" {
		t.Fatalf("parts %+v", parts)
	}
	if !strings.Contains(string(parts[0].body), "Walk the runway edges") || !strings.Contains(string(parts[0].body), pipeline.Caution) {
		t.Errorf("plain text: %s", parts[0].body)
	}
	if !strings.Contains(string(parts[1].body), `src="cid:`+parts[2].id+`"`) {
		t.Errorf("the page does not show the picture %q", parts[2].id)
	}
	if !strings.HasPrefix(string(parts[2].body), "\x89PNG") || !strings.HasPrefix(parts[2].disposition, "inline") {
		t.Errorf("picture %q begins with %q", parts[2].disposition, parts[2].body[:8])
	}
}

// Updates and withdrawals are found under the first message.
func TestCitesTheFirstNotice(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{})
	c := channel(t, settings(r))
	samples := delivery.Samples()
	for _, n := range []delivery.Notice{samples[3], samples[5], samples[7]} {
		if out := c.Deliver(t.Context(), n); !out.Delivered {
			t.Fatalf("%+v", out)
		}
	}
	for i, got := range r.All() {
		header, _ := read(t, got.Text)
		const first = "<n-31-0808-1@fellmoor.example>"
		if header.Get("In-Reply-To") != first || header.Get("References") != first {
			t.Errorf("%d: in reply to %q, references %q", i, header.Get("In-Reply-To"), header.Get("References"))
		}
	}
}

// The same notice gives the same message, but for the lines between its parts.
func TestRepeatIsTheSameMessage(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{})
	c := channel(t, settings(r))
	for range 2 {
		if out := c.Deliver(t.Context(), delivery.Samples()[0]); !out.Delivered {
			t.Fatalf("%+v", out)
		}
	}
	var seen []string
	for _, m := range r.All() {
		header, parts := read(t, m.Text)
		all := header.Get("Message-Id") + header.Get("Date") + header.Get("Subject")
		for _, p := range parts {
			all += string(p.body)
		}
		seen = append(seen, all)
	}
	if len(seen) != 2 || seen[0] != seen[1] {
		t.Error("a repeat differs")
	}
}

func TestEncryption(t *testing.T) {
	for _, test := range []struct {
		name      string
		server    deliverytest.SMTPOptions
		bend      func(*mail.Settings)
		delivered bool
		encrypted bool
		says      string
	}{
		{"starttls", deliverytest.SMTPOptions{}, func(*mail.Settings) {}, true, true, ""},
		{"starttls is not offered", deliverytest.SMTPOptions{NoEncryption: true}, func(*mail.Settings) {}, false, false, "STARTTLS"},
		{"certificate of a stranger", deliverytest.SMTPOptions{}, func(s *mail.Settings) { s.Authorities = nil }, false, false, "certificate"},
		{"certificate of another name", deliverytest.SMTPOptions{}, func(s *mail.Settings) { s.Host = "localhost" }, false, false, "certificate"},
		{"tls", deliverytest.SMTPOptions{FromTheStart: true}, func(s *mail.Settings) { s.Encryption = mail.TLS }, true, true, ""},
		{"tls of a stranger", deliverytest.SMTPOptions{FromTheStart: true}, func(s *mail.Settings) { s.Encryption, s.Authorities = mail.TLS, nil }, false, false, "certificate"},
		{"none, with a reason", deliverytest.SMTPOptions{NoEncryption: true}, func(s *mail.Settings) { s.Encryption, s.WhyNone = mail.None, "same machine" }, true, false, ""},
	} {
		t.Run(test.name, func(t *testing.T) {
			r := receiver(t, test.server)
			s := settings(r)
			test.bend(&s)
			out := channel(t, s).Deliver(t.Context(), delivery.Samples()[6])
			got := r.All()
			if out.Delivered != test.delivered || !strings.Contains(out.Answer, test.says) || len(got) > 0 != test.delivered {
				t.Fatalf("%+v, %d received", out, len(got))
			}
			if !test.delivered && !out.Again {
				t.Errorf("given up: %+v", out)
			}
			if test.delivered && got[0].Encrypted != test.encrypted {
				t.Errorf("encrypted %v", got[0].Encrypted)
			}
		})
	}
}

func TestLogin(t *testing.T) {
	for _, test := range []struct {
		name, password string
		fromTheStart   bool
		delivered      bool
	}{
		{"starttls", deliverytest.Password + "\n", false, true},
		{"tls", deliverytest.Password, true, true},
		{"wrong password", "wrong", false, false},
	} {
		t.Run(test.name, func(t *testing.T) {
			r := receiver(t, deliverytest.SMTPOptions{FromTheStart: test.fromTheStart})
			s := settings(r)
			s.User, s.PasswordFile = deliverytest.User, password(t, test.password)
			if test.fromTheStart {
				s.Encryption = mail.TLS
			}
			out := channel(t, s).Deliver(t.Context(), delivery.Samples()[6])
			if out.Delivered != test.delivered {
				t.Fatalf("%+v", out)
			}
			if test.delivered && r.All()[0].User != deliverytest.User {
				t.Error("not logged in")
			}
			if !test.delivered && (out.Again || !strings.Contains(out.Answer, "535")) {
				t.Errorf("535 is a lasting refusal: %+v", out)
			}
		})
	}
}

// A password that is changed in its file is used from then on.
func TestPasswordIsReadEachTime(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{})
	s := settings(r)
	s.User, s.PasswordFile = deliverytest.User, password(t, "old")
	c := channel(t, s)
	if out := c.Deliver(t.Context(), delivery.Samples()[6]); out.Delivered {
		t.Fatal("the old password was accepted")
	}
	if err := os.WriteFile(s.PasswordFile, []byte(deliverytest.Password), 0o600); err != nil {
		t.Fatal(err)
	}
	if out := c.Deliver(t.Context(), delivery.Samples()[6]); !out.Delivered {
		t.Errorf("%+v", out)
	}
}

// RFC 5321, section 4.2.1: 4yz may be tried again, 5yz may not.
func TestAnswers(t *testing.T) {
	for _, test := range []struct {
		code   int
		atData bool
		again  bool
	}{
		{421, false, true}, {450, false, true}, {451, true, true}, {452, false, true},
		{550, false, false}, {552, true, false}, {553, false, false}, {554, true, false},
	} {
		r := receiver(t, deliverytest.SMTPOptions{AtData: test.atData, Refusal: &smtp.SMTPError{Code: test.code, EnhancedCode: smtp.NoEnhancedCode, Message: "words of the server"}})
		out := channel(t, settings(r)).Deliver(t.Context(), delivery.Samples()[6])
		if out.Delivered || out.Again != test.again || !strings.Contains(out.Answer, "words of the server") || !strings.Contains(out.Answer, smtpCode(test.code)) {
			t.Errorf("%d: %+v", test.code, out)
		}
	}
}

func smtpCode(c int) string {
	return string([]byte{byte('0' + c/100), byte('0' + c/10%10), byte('0' + c%10)})
}

// The server has the message and says nothing: nobody knows, so it is tried again.
func TestConnectionBreaksAfterTheMessage(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{Behaviour: deliverytest.ClosesEarly, AtData: true})
	if out := channel(t, settings(r)).Deliver(t.Context(), delivery.Samples()[6]); out.Delivered || !out.Again {
		t.Errorf("%+v", out)
	}
}

func TestStallsAfterTheMessage(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{Behaviour: deliverytest.Stalls, AtData: true})
	s := settings(r)
	s.Timeout = 300 * time.Millisecond
	if out := channel(t, s).Deliver(t.Context(), delivery.Samples()[6]); out.Delivered || !out.Again || !strings.Contains(out.Answer, "deadline") {
		t.Errorf("%+v", out)
	}
}

func TestRecipientWithoutAddress(t *testing.T) {
	r := receiver(t, deliverytest.SMTPOptions{})
	for _, address := range []string{"", "nobody", "a@fellmoor.example, b@fellmoor.example", "a@fellmoor.example\r\nBcc: c@fellmoor.example"} {
		n := delivery.Samples()[6]
		n.Recipient.Address = address
		if out := channel(t, settings(r)).Deliver(t.Context(), n); out.Delivered || out.Again {
			t.Errorf("%q: %+v", address, out)
		}
	}
	if got := r.All(); len(got) > 0 {
		t.Errorf("received %d", len(got))
	}
}

func TestSettings(t *testing.T) {
	good := mail.Settings{Host: "mail.fellmoor.example", From: "Thaw <thaw@fellmoor.example>"}
	if err := good.Check(); err != nil {
		t.Fatal(err)
	}
	for _, test := range []struct {
		name string
		bend func(*mail.Settings)
		says string
	}{
		{"no host", func(s *mail.Settings) { s.Host = "" }, "host"},
		{"address for a host", func(s *mail.Settings) { s.Host = "smtp://mail" }, "host"},
		{"port", func(s *mail.Settings) { s.Port = 70000 }, "port"},
		{"none without reason", func(s *mail.Settings) { s.Encryption = mail.None }, "say why"},
		{"password in the clear", func(s *mail.Settings) {
			s.Encryption, s.WhyNone, s.User, s.PasswordFile = mail.None, "local", "u", password(t, "p")
		}, "never sent in the clear"},
		{"reason for nothing", func(s *mail.Settings) { s.WhyNone = "local" }, "a reason"},
		{"unknown encryption", func(s *mail.Settings) { s.Encryption = "ssl" }, "none of starttls"},
		{"user alone", func(s *mail.Settings) { s.User = "u" }, "both"},
		{"password file that is not there", func(s *mail.Settings) { s.User, s.PasswordFile = "u", "/none" }, "/none"},
		{"empty password", func(s *mail.Settings) { s.User, s.PasswordFile = "u", password(t, "\n") }, "empty"},
		{"two lines", func(s *mail.Settings) { s.User, s.PasswordFile = "u", password(t, "a\nb\n") }, "more than one line"},
		{"from", func(s *mail.Settings) { s.From = "thaw" }, "from"},
		{"reply to", func(s *mail.Settings) { s.ReplyTo = "thaw" }, "reply to"},
		{"domain", func(s *mail.Settings) { s.Domain = "a b>" }, "domain"},
		{"timeout", func(s *mail.Settings) { s.Timeout = -1 }, "timeout"},
	} {
		s := good
		test.bend(&s)
		if err := s.Check(); err == nil || !strings.Contains(err.Error(), test.says) {
			t.Errorf("%s: %v does not say %q", test.name, err, test.says)
		}
	}
}
