package deliverytest

import (
	"fmt"
	"testing"
	"time"

	"thawledger/alerts/delivery/webhook"
)

func startWebhook(t *testing.T, b Behaviour, limit time.Duration) rig {
	t.Helper()
	const secret = "0123456789abcdef0123456789abcdef"
	s := webhook.Settings{SecretFile: write(t, secret+"\n"), Timeout: limit, Now: time.Now}
	r := rig{keys: func() []string { return nil }, secret: secret}
	if b == absent {
		s.Address = fmt.Sprintf("https://127.0.0.1:%d/", freePort(t))
	} else {
		receiver, err := StartWeb(b, nil)
		if err != nil {
			t.Fatal(err)
		}
		t.Cleanup(receiver.Close)
		s.Address, s.Authorities = receiver.Address, receiver.Authorities
		r.stalled, r.keys = receiver.Stalled, func() []string {
			// A receiver as it should be: only what is proved counts.
			v := webhook.Verifier{Secrets: [][]byte{[]byte(secret)}, Now: time.Now, Seen: func(string) (bool, error) { return false, nil }}
			var out []string
			for _, p := range receiver.All() {
				proved, err := v.Verify(p.Header, p.Body)
				if err != nil {
					t.Fatal(err)
				}
				out = append(out, proved.Key)
			}
			return out
		}
	}
	channel, err := webhook.New(s, texts(t))
	if err != nil {
		t.Fatal(err)
	}
	r.channel = channel
	return r
}
