package webhook

import (
	"cmp"
	"crypto/x509"
	"errors"
	"fmt"
	"net/url"
	"strings"
	"time"
)

// Settings are the settings of the channel.
type Settings struct {
	// Address is where to post; https, unless WhyNone says why not. Empty: the
	// recipient's own address.
	Address string
	// WhyNone is why notices may go in the clear to an http address.
	WhyNone string
	// Authorities are the certificate authorities trusted; nil: the system's.
	Authorities *x509.CertPool

	// SecretFile holds the key for signing; see ReadSecret. It is read for each
	// delivery, so that it can be changed.
	SecretFile string

	// Timeout is the longest that one delivery may take in all; 30 s if 0.
	Timeout time.Duration

	// LongestWait is the most that a receiver's Retry-After is obeyed for; an
	// hour if 0.
	LongestWait time.Duration

	Now func() time.Time // the clock
}

// Check says everything that is wrong with the settings; nil if nothing is.
func (s *Settings) Check() error {
	var faults []error
	if s.Address != "" {
		if err := s.checkAddress(s.Address); err != nil {
			faults = append(faults, err)
		}
	}
	if _, err := ReadSecret(s.SecretFile); err != nil {
		faults = append(faults, err)
	}
	if s.Timeout < 0 || s.LongestWait < 0 {
		faults = append(faults, errors.New("a time limit is below 0"))
	}
	if s.Now == nil {
		faults = append(faults, errors.New("there is no clock"))
	}
	return errors.Join(faults...)
}

func (s *Settings) checkAddress(address string) error {
	u, err := url.Parse(address)
	switch {
	case err != nil || u.Host == "":
		// The parser's own error would repeat a password in the address.
		return errors.New("address is not one such as https://agency.example/thaw")
	case u.User != nil:
		return fmt.Errorf("address %s holds a password; the signature is proof enough", u.Redacted())
	case u.Scheme == "https":
		return nil
	case u.Scheme != "http":
		return fmt.Errorf("address %s is neither https nor http", u.Redacted())
	case strings.TrimSpace(s.WhyNone) == "":
		return fmt.Errorf("address %s is http: use https, or say why notices may go in the clear", u.Redacted())
	}
	return nil
}

func (s *Settings) timeout() time.Duration     { return cmp.Or(s.Timeout, 30*time.Second) }
func (s *Settings) longestWait() time.Duration { return cmp.Or(s.LongestWait, time.Hour) }
