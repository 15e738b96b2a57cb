package deliverytest

import (
	netmail "net/mail"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"sync"
	"testing"
	"time"

	"thawledger/alerts/delivery/mail"
	"thawledger/alerts/delivery/text"
)

func startMail(t *testing.T, b Behaviour, limit time.Duration) rig {
	t.Helper()
	s := mail.Settings{
		Host: "127.0.0.1", User: User, PasswordFile: write(t, Password+"\n"), Timeout: limit,
		From: "Thaw alerts <thaw@fellmoor.example>", Hello: "thaw.fellmoor.example",
	}
	r := rig{keys: func() []string { return nil }, secret: Password}
	if b == absent {
		s.Port = freePort(t)
	} else {
		receiver, err := StartSMTP(SMTPOptions{Behaviour: b})
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(receiver.Close)
		s.Port, s.Authorities = receiver.Port, receiver.Authorities
		r.stalled, r.keys = receiver.Stalled, func() []string { return mailKeys(t, receiver) }
	}
	channel, err := mail.New(s, texts(t))
	if err != nil {
		t.Fatal(err)
	}
	r.channel = channel
	return r
}

// mailKeys reads the keys out of the Message-IDs.
func mailKeys(t *testing.T, receiver *SMTP) []string {
	t.Helper()
	var out []string
	for _, m := range receiver.All() {
		message, err := netmail.ReadMessage(strings.NewReader(m.Text))
		if err != nil {
			t.Fatal(err)
		}
		if to := message.Header["Bcc"]; to != nil || m.To != "duty@fellmoor.example" && m.To != "runway@fellmoor.example" {
			continue // not a message to the recipient alone
		}
		key, _, _ := strings.Cut(strings.Trim(message.Header.Get("Message-Id"), "<>"), "@")
		out = append(out, key)
	}
	return out
}

var loadTexts = sync.OnceValues(func() (*text.Texts, error) { return text.Load("") })

func texts(t *testing.T) *text.Texts {
	t.Helper()
	x, err := loadTexts()
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// write writes a file and returns its name.
func write(t *testing.T, content string) string {
	t.Helper()
	name := filepath.Join(t.TempDir(), "secret")
	if err := os.WriteFile(name, []byte(content), 0o600); err != nil {
		t.Fatal(err)
	}
	return name
}

func freePort(t *testing.T) int {
	t.Helper()
	address, err := FreePort()
	if err != nil {
		t.Fatal(err)
	}
	port, err := strconv.Atoi(address[strings.LastIndex(address, ":")+1:])
	if err != nil {
		t.Fatal(err)
	}
	return port
}
