package webhook

import (
	"bytes"
	"crypto/hmac"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"net/http"
	"os"
	"strings"
	"time"
)

// The headers of a delivery.
const (
	TimeHeader  = "Thawledger-Time"
	KeyHeader   = "Thawledger-Key"
	ProofHeader = "Thawledger-Proof"
)

const proofMethod = "hmac-sha256"

// minSecret is the least length of a secret, in bytes: below it guessing becomes
// thinkable. RFC 2104, section 3, discourages keys shorter than the hash, 32;
// 24 characters of text made at random are taken as well.
const minSecret = 24

// Proof returns the Thawledger-Proof header for a body sent at a time, written
// as in the Thawledger-Time header.
func Proof(secret []byte, sentAt string, body []byte) string {
	return proofMethod + " " + hex.EncodeToString(sum(secret, sentAt, body))
}

func sum(secret []byte, sentAt string, body []byte) []byte {
	mac := hmac.New(sha256.New, secret)
	mac.Write([]byte(sentAt))
	mac.Write([]byte("."))
	mac.Write(body)
	return mac.Sum(nil)
}

// ReadSecret reads the secret that sender and receivers share from a file: all
// of it but white space at its ends. It is at least 24 bytes.
func ReadSecret(file string) ([]byte, error) {
	text, err := os.ReadFile(file)
	if err != nil {
		return nil, fmt.Errorf("read key for signing: %w", err)
	}
	secret := bytes.TrimSpace(text)
	if len(secret) < minSecret {
		return nil, fmt.Errorf("read key for signing: %s has %d bytes; at least %d, made at random, are needed", file, len(secret), minSecret)
	}
	return secret, nil
}

// What Verify finds wrong.
var (
	ErrForged = errors.New("the proof is not ours")
	ErrTime   = errors.New("sent too long ago, or by a clock that is wrong")
)

// Verifier checks deliveries, for receivers.
type Verifier struct {
	// Secrets are the keys that a proof may be made with: one, or two while one
	// takes the place of the other.
	Secrets [][]byte

	// Window is how far the time of a delivery may be from Now, either way; five
	// minutes if 0. What Seen has noted has to be kept for at least twice as long.
	Window time.Duration
	Now    func() time.Time

	// Seen notes the key of a notice and says whether it had been noted before,
	// in one step: two deliveries at once must not both be new. To act on a
	// notice only once even if it comes late or after a restart, keep keys for
	// good.
	Seen func(key string) (before bool, err error)
}

// Verified is a delivery that is ours.
type Verified struct {
	Key string // the notice's key

	// Repeated says that the notice has come before: answer 200 and do nothing.
	Repeated bool
}

// Verify checks the headers and the whole body of a delivery. The error is
// ErrForged or ErrTime, to be answered with 401, or one of Seen's, to be
// answered with 503.
func (v *Verifier) Verify(h http.Header, body []byte) (Verified, error) {
	if len(h.Values(TimeHeader)) != 1 || len(h.Values(ProofHeader)) != 1 {
		return Verified{}, ErrForged
	}
	sentAt := h.Get(TimeHeader)
	method, digest, _ := strings.Cut(h.Get(ProofHeader), " ")
	claimed, err := hex.DecodeString(digest)
	if method != proofMethod || err != nil || len(claimed) != sha256.Size {
		return Verified{}, ErrForged
	}
	ours := false
	for _, secret := range v.Secrets {
		// A secret that is empty by mistake would let everybody in.
		ours = ours || len(secret) >= minSecret && hmac.Equal(claimed, sum(secret, sentAt, body))
	}
	if !ours {
		return Verified{}, ErrForged
	}
	t, err := time.Parse(time.RFC3339, sentAt)
	if err != nil {
		return Verified{}, ErrTime
	}
	window := v.Window
	if window == 0 {
		window = 5 * time.Minute
	}
	if age := v.Now().Sub(t); age > window || age < -window {
		return Verified{}, ErrTime
	}
	var named struct {
		Key string `json:"key"`
	}
	if err := json.Unmarshal(body, &named); err != nil || named.Key == "" || h.Get(KeyHeader) != named.Key {
		return Verified{}, ErrForged
	}
	before, err := v.Seen(named.Key)
	if err != nil {
		return Verified{}, fmt.Errorf("note key %s: %w", named.Key, err)
	}
	return Verified{Key: named.Key, Repeated: before}, nil
}
