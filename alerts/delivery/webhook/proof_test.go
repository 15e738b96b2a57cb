package webhook_test

import (
	"encoding/hex"
	"errors"
	"net/http"
	"strings"
	"testing"
	"time"

	"thawledger/alerts/delivery/webhook"
)

// What OpenSSL gives for the same text and key:
//
//	printf '2031-08-21T12:00:00Z.{"key":"a"}' | openssl dgst -sha256 -hmac 0123456789abcdef0123456789abcdef
func TestProof(t *testing.T) {
	const want = "hmac-sha256 0f2c94766642968d695d72083a339b9ff67840e4bcba8d9221aa02b17cb34a94"
	if got := webhook.Proof([]byte(secret), "2031-08-21T12:00:00Z", []byte(`{"key":"a"}`)); got != want {
		t.Errorf("%s, want %s", got, want)
	}
}

func signed(body, sentAt string) http.Header {
	h := http.Header{}
	h.Set(webhook.TimeHeader, sentAt)
	h.Set(webhook.KeyHeader, "n-1")
	h.Set(webhook.ProofHeader, webhook.Proof([]byte(secret), sentAt, []byte(body)))
	return h
}

func verifier() *webhook.Verifier {
	had := map[string]bool{}
	return &webhook.Verifier{Secrets: [][]byte{[]byte(secret)}, Now: func() time.Time { return noon }, Seen: func(key string) (bool, error) {
		before := had[key]
		had[key] = true
		return before, nil
	}}
}

func TestVerify(t *testing.T) {
	const body, sentAt = `{"key":"n-1","version":1}`, "2031-08-21T12:00:00Z"
	for _, test := range []struct {
		name string
		bend func(h http.Header, v *webhook.Verifier) string // returns the body
		want error
	}{
		{"as sent", func(http.Header, *webhook.Verifier) string { return body }, nil},
		{"another body", func(http.Header, *webhook.Verifier) string { return strings.Replace(body, "1}", "2}", 1) }, webhook.ErrForged},
		{"another time", func(h http.Header, _ *webhook.Verifier) string {
			h.Set(webhook.TimeHeader, "2031-08-21T12:00:01Z")
			return body
		}, webhook.ErrForged},
		{"another key in the header", func(h http.Header, _ *webhook.Verifier) string { h.Set(webhook.KeyHeader, "n-2"); return body }, webhook.ErrForged},
		{"no proof", func(h http.Header, _ *webhook.Verifier) string { h.Del(webhook.ProofHeader); return body }, webhook.ErrForged},
		{"two proofs", func(h http.Header, _ *webhook.Verifier) string { h.Add(webhook.ProofHeader, "x"); return body }, webhook.ErrForged},
		{"proof by something else", func(h http.Header, _ *webhook.Verifier) string {
			h.Set(webhook.ProofHeader, strings.Replace(h.Get(webhook.ProofHeader), "hmac-sha256", "none", 1))
			return body
		}, webhook.ErrForged},
		{"half a proof", func(h http.Header, _ *webhook.Verifier) string {
			h.Set(webhook.ProofHeader, h.Get(webhook.ProofHeader)[:40])
			return body
		}, webhook.ErrForged},
		{"other secret", func(_ http.Header, v *webhook.Verifier) string {
			v.Secrets = [][]byte{[]byte("another secret of some length")}
			return body
		}, webhook.ErrForged},
		{"no secret at all", func(_ http.Header, v *webhook.Verifier) string { v.Secrets = nil; return body }, webhook.ErrForged},
		{"new secret beside the old", func(_ http.Header, v *webhook.Verifier) string {
			v.Secrets = [][]byte{[]byte("another secret of some length"), []byte(secret)}
			return body
		}, nil},
		{"clock five minutes on", func(_ http.Header, v *webhook.Verifier) string {
			v.Now = func() time.Time { return noon.Add(5 * time.Minute) }
			return body
		}, nil},
		{"a second later", func(_ http.Header, v *webhook.Verifier) string {
			v.Now = func() time.Time { return noon.Add(5*time.Minute + time.Second) }
			return body
		}, webhook.ErrTime},
		{"from the future", func(_ http.Header, v *webhook.Verifier) string {
			v.Now = func() time.Time { return noon.Add(-6 * time.Minute) }
			return body
		}, webhook.ErrTime},
	} {
		t.Run(test.name, func(t *testing.T) {
			h, v := signed(body, sentAt), verifier()
			b := test.bend(h, v)
			got, err := v.Verify(h, []byte(b))
			if !errors.Is(err, test.want) || err == nil && (got.Key != "n-1" || got.Repeated) {
				t.Errorf("%+v, %v; want %v", got, err, test.want)
			}
		})
	}
}

func TestVerifyEmptySecret(t *testing.T) {
	const body, sentAt = `{"key":"n-1"}`, "2031-08-21T12:00:00Z"
	h := signed(body, sentAt)
	h.Set(webhook.ProofHeader, webhook.Proof(nil, sentAt, []byte(body)))
	v := verifier()
	v.Secrets = [][]byte{{}}
	if _, err := v.Verify(h, []byte(body)); !errors.Is(err, webhook.ErrForged) {
		t.Errorf("an empty secret proves: %v", err)
	}
}

// A proof that is ours over what is no time, or no notice, is of no use.
func TestVerifySignedNonsense(t *testing.T) {
	for _, test := range []struct {
		body, sentAt string
		want         error
	}{
		{`{"key":"n-1"}`, "yesterday", webhook.ErrTime},
		{`{"key":""}`, "2031-08-21T12:00:00Z", webhook.ErrForged},
		{`not JSON`, "2031-08-21T12:00:00Z", webhook.ErrForged},
	} {
		if _, err := verifier().Verify(signed(test.body, test.sentAt), []byte(test.body)); !errors.Is(err, test.want) {
			t.Errorf("%s at %s: %v", test.body, test.sentAt, err)
		}
	}
}

func TestVerifyRepeats(t *testing.T) {
	const body = `{"key":"n-1"}`
	v := verifier()
	for i, sentAt := range []string{"2031-08-21T12:00:00Z", "2031-08-21T12:00:00Z", "2031-08-21T12:01:00Z"} {
		got, err := v.Verify(signed(body, sentAt), []byte(body))
		if err != nil || got.Repeated != (i > 0) {
			t.Errorf("%d: %+v %v", i, got, err)
		}
	}
	trouble := errors.New("no room")
	v.Seen = func(string) (bool, error) { return false, trouble }
	if _, err := v.Verify(signed(body, "2031-08-21T12:00:00Z"), []byte(body)); !errors.Is(err, trouble) {
		t.Errorf("%v", err)
	}
}

// Whatever is sent, nothing is verified that was not signed, and nothing panics.
func FuzzVerify(f *testing.F) {
	f.Add("2031-08-21T12:00:00Z", "n-1", "hmac-sha256 00", `{"key":"n-1"}`)
	f.Add("", "", "hmac-sha256 "+hex.EncodeToString(make([]byte, 32)), "")
	f.Fuzz(func(t *testing.T, sentAt, key, proof, body string) {
		h := http.Header{webhook.TimeHeader: {sentAt}, webhook.KeyHeader: {key}, webhook.ProofHeader: {proof}}
		if got, err := verifier().Verify(h, []byte(body)); err == nil && proof != webhook.Proof([]byte(secret), sentAt, []byte(body)) {
			t.Errorf("%+v verified by %q", got, proof)
		}
	})
}
