package mail

import (
	"cmp"
	"crypto/x509"
	"errors"
	"fmt"
	netmail "net/mail"
	"os"
	"strings"
	"time"
)

// Encryption is how the connection to the server is protected.
type Encryption string

// The ways to protect a connection.
const (
	StartTLS Encryption = "starttls" // begins in the clear and goes on encrypted, or not at all; port 587
	TLS      Encryption = "tls"      // encrypted from the start; port 465
	None     Encryption = "none"     // in the clear; needs a reason; port 25
)

// Settings are the settings of the channel.
type Settings struct {
	Host string // of the SMTP server
	Port int    // 0: the usual one for Encryption

	Encryption Encryption // StartTLS if empty
	// WhyNone is why messages may go in the clear, where Encryption is None: "the
	// server is on this machine".
	WhyNone string
	// Authorities are the certificate authorities trusted; nil: the system's.
	Authorities *x509.CertPool

	// User and the file that holds the password, for a login; both or neither.
	// The file is read for each delivery, so that it can be changed. A final line
	// break is not part of the password.
	User, PasswordFile string

	From    string // address of the sender, as "Thaw alerts <thaw@agency.example>"
	ReplyTo string // may be empty

	// Domain is the right-hand side of Message-IDs; that of From if empty. It
	// must not change, or updates would cite messages that never were.
	Domain string

	Hello string // name that we greet the server with; the machine's if empty

	// Timeout is the longest that one delivery may take in all; a minute if 0.
	Timeout time.Duration
}

// Check says everything that is wrong with the settings; nil if nothing is.
func (s *Settings) Check() error {
	var faults []error
	add := func(bad bool, format string, args ...any) {
		if bad {
			faults = append(faults, fmt.Errorf(format, args...))
		}
	}
	add(s.Host == "" || strings.ContainsAny(s.Host, "/ \t\r\n"), "host %q is not the name of a server", s.Host)
	add(s.Port < 0 || s.Port > 65535, "port %d is not from 1 to 65535", s.Port)
	switch s.Encryption {
	case "", StartTLS, TLS:
		add(s.WhyNone != "", "a reason for sending in the clear is given, but encryption is %s", cmp.Or(s.Encryption, StartTLS))
	case None:
		add(strings.TrimSpace(s.WhyNone) == "", "encryption is none: say why messages may go in the clear")
		add(s.User != "", "encryption is none: a password is never sent in the clear")
	default:
		add(true, "encryption %q is none of %s, %s, %s", s.Encryption, StartTLS, TLS, None)
	}
	add((s.User == "") != (s.PasswordFile == ""), "a login needs both a user and a password file")
	from, err := netmail.ParseAddress(s.From)
	add(err != nil, "from %q is not an address such as Thaw alerts <thaw@agency.example>", s.From)
	if s.ReplyTo != "" {
		_, err := netmail.ParseAddress(s.ReplyTo)
		add(err != nil, "reply to %q is not an address", s.ReplyTo)
	}
	if s.Domain != "" || from != nil {
		add(!isDomain(s.domain()), "domain %q is not one", s.domain())
	}
	add(s.Timeout < 0, "timeout %s is below 0", s.Timeout)
	if s.PasswordFile != "" {
		_, err := s.password()
		add(err != nil, "%v", err)
	}
	return errors.Join(faults...)
}

func (s *Settings) port() int {
	if s.Port != 0 {
		return s.Port
	}
	switch s.Encryption {
	case TLS:
		return 465
	case None:
		return 25
	}
	return 587
}

func (s *Settings) timeout() time.Duration { return cmp.Or(s.Timeout, time.Minute) }

// domain is the right-hand side of Message-IDs.
func (s *Settings) domain() string {
	if s.Domain != "" {
		return s.Domain
	}
	from, err := netmail.ParseAddress(s.From)
	if err != nil {
		return ""
	}
	return from.Address[strings.LastIndex(from.Address, "@")+1:]
}

func (s *Settings) password() (string, error) {
	text, err := os.ReadFile(s.PasswordFile)
	if err != nil {
		return "", fmt.Errorf("read password: %w", err)
	}
	password := strings.TrimRight(string(text), "\r\n")
	if password == "" {
		return "", fmt.Errorf("read password: %s is empty", s.PasswordFile)
	}
	if strings.ContainsAny(password, "\r\n\x00") {
		return "", fmt.Errorf("read password: %s has more than one line", s.PasswordFile)
	}
	return password, nil
}

// isDomain reports whether s is made of labels of letters, digits and hyphens.
func isDomain(s string) bool {
	if s == "" || len(s) > 253 {
		return false
	}
	for label := range strings.SplitSeq(s, ".") {
		if label == "" || strings.Trim(label, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789-") != "" {
			return false
		}
	}
	return true
}
