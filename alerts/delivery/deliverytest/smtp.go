package deliverytest

import (
	"crypto/tls"
	"crypto/x509"
	"errors"
	"io"
	"net"
	"sync"

	"github.com/emersion/go-sasl"
	"github.com/emersion/go-smtp"
)

// The login that the SMTP receiver accepts, where it asks for one.
const (
	User     = "thaw"
	Password = "correct horse 17 \u00e9"
)

// Mail is a message that an SMTP receiver took.
type Mail struct {
	From, To  string
	Encrypted bool
	User      string // who had logged in
	Text      string // headers and body as they came
}

// SMTP is a receiver of e-mail.
type SMTP struct {
	Host        string
	Port        int
	Authorities *x509.CertPool
	Stalled     chan struct{} // gets a value when a delivery has come to a stop

	taken[Mail]
	server *smtp.Server
	plain  net.Listener
	done   sync.WaitGroup
	quit   chan struct{}
}

// SMTPOptions are what an SMTP receiver offers.
type SMTPOptions struct {
	Behaviour    Behaviour
	FromTheStart bool // encrypted from the first byte on
	NoEncryption bool
	Refusal      *smtp.SMTPError // in place of the usual one
	AtData       bool            // refuses, stalls or hangs up after the message, and not after the recipient
}

// StartSMTP starts a receiver on 127.0.0.1. It asks for no login but accepts one.
func StartSMTP(o SMTPOptions) (*SMTP, error) {
	certificate, pool, err := Certificate()
	if err != nil {
		return nil, err
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return nil, err
	}
	r := &SMTP{Host: "127.0.0.1", Port: l.Addr().(*net.TCPAddr).Port, Authorities: pool, Stalled: make(chan struct{}, 100), quit: make(chan struct{}), plain: l}
	config := &tls.Config{Certificates: []tls.Certificate{certificate}, MinVersion: tls.VersionTLS12}
	if o.Behaviour == Stalls && !o.AtData {
		r.done.Go(r.sit)
		return r, nil
	}
	if o.FromTheStart {
		l = tls.NewListener(l, config)
	}
	r.server = smtp.NewServer(smtp.BackendFunc(func(c *smtp.Conn) (smtp.Session, error) {
		return &session{r: r, o: o, conn: c}, nil
	}))
	r.server.Domain = "receiver.example"
	r.server.ErrorLog = silent{}
	if !o.NoEncryption && !o.FromTheStart {
		r.server.TLSConfig = config
	}
	r.done.Go(func() { _ = r.server.Serve(l) })
	return r, nil
}

type silent struct{}

func (silent) Printf(string, ...any) {}
func (silent) Println(...any)        {}

// sit takes connections and says nothing.
func (r *SMTP) sit() {
	var open []net.Conn
	defer func() {
		for _, c := range open {
			_ = c.Close()
		}
	}()
	for {
		c, err := r.plain.Accept()
		if err != nil {
			return
		}
		open = append(open, c)
		r.Stalled <- struct{}{}
	}
}

// Close stops the receiver.
func (r *SMTP) Close() {
	close(r.quit)
	// The server knows of its port only once it serves, which it may not yet.
	_ = r.plain.Close()
	if r.server != nil {
		_ = r.server.Close()
	}
	r.done.Wait()
}

// session is one connection.
type session struct {
	r    *SMTP
	o    SMTPOptions
	conn *smtp.Conn
	mail Mail
	user string
}

func (s *session) Reset()                   { s.mail = Mail{} }
func (s *session) Logout() error            { return nil }
func (s *session) AuthMechanisms() []string { return []string{sasl.Plain} }
func (s *session) Auth(string) (sasl.Server, error) {
	return sasl.NewPlainServer(func(_, user, password string) error {
		if user != User || password != Password {
			return smtp.ErrAuthFailed
		}
		s.user = user
		return nil
	}), nil
}

func (s *session) Mail(from string, _ *smtp.MailOptions) error {
	s.mail.From = from
	return nil
}

func (s *session) Rcpt(to string, _ *smtp.RcptOptions) error {
	s.mail.To = to
	if s.o.AtData {
		return nil
	}
	return s.misbehave()
}

func (s *session) Data(from io.Reader) error {
	text, err := io.ReadAll(from)
	if err != nil {
		return err
	}
	if s.o.AtData {
		if err := s.misbehave(); err != nil {
			return err
		}
	}
	_, s.mail.Encrypted = s.conn.TLSConnectionState()
	s.mail.User, s.mail.Text = s.user, string(text)
	s.r.add(s.mail)
	return nil
}

func (s *session) misbehave() error {
	if s.o.Refusal != nil {
		return s.o.Refusal
	}
	switch s.o.Behaviour {
	case RefusesForNow:
		return &smtp.SMTPError{Code: 451, EnhancedCode: smtp.EnhancedCode{4, 3, 0}, Message: "put off " + Words}
	case RefusesForGood:
		return &smtp.SMTPError{Code: 550, EnhancedCode: smtp.EnhancedCode{5, 1, 1}, Message: "no such mailbox, " + Words}
	case ClosesEarly:
		_ = s.conn.Conn().Close()
		return errors.New("hung up")
	case Stalls:
		s.r.Stalled <- struct{}{}
		<-s.r.quit
		return errors.New("stopped")
	}
	return nil
}
