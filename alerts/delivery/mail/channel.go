package mail

import (
	"cmp"
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"net"
	"net/textproto"
	"strings"
	"time"

	gomail "github.com/wneessen/go-mail"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
)

// Channel delivers notices by e-mail.
type Channel struct {
	settings Settings
	texts    *text.Texts
}

// New returns a channel, or everything that is wrong with its settings. It does
// not look for the server.
func New(s Settings, texts *text.Texts) (*Channel, error) {
	if err := s.Check(); err != nil {
		return nil, fmt.Errorf("mail settings: %w", err)
	}
	return &Channel{settings: s, texts: texts}, nil
}

// Deliver sends one message to the notice's recipient. It blocks until the
// server has taken or refused it, ctx is done or the time limit of the settings
// is over.
func (c *Channel) Deliver(ctx context.Context, n delivery.Notice) delivery.Outcome {
	m, err := c.message(n)
	if err != nil {
		return delivery.Failed(false, err.Error())
	}
	ctx, cancel := context.WithTimeout(ctx, c.settings.timeout())
	defer cancel()
	line := &line{ctx: ctx, encryption: c.settings.Encryption, config: c.tlsConfig()}
	defer line.close()
	client, err := c.client(line)
	if err != nil {
		return delivery.Failed(true, "set up: "+err.Error())
	}
	if err := client.DialWithContext(ctx); err != nil {
		return failed(ctx, err)
	}
	if err := client.Send(m); err != nil && !m.IsDelivered() {
		return failed(ctx, err)
	}
	// The server has it: what goes wrong from here on changes nothing, and a
	// server that is slow to say goodbye is not waited for long.
	line.hurry(5 * time.Second)
	_ = client.Close()
	return delivery.Taken(cmp.Or(m.ServerResponse(), "taken"))
}

func (c *Channel) client(l *line) (*gomail.Client, error) {
	options := []gomail.Option{
		// line keeps the time; the library's own limit must not come first, which
		// would leave it to chance how the outcome is worded.
		gomail.WithPort(c.settings.port()), gomail.WithTimeout(c.settings.timeout() + time.Minute),
		gomail.WithTLSConfig(l.config), gomail.WithDialContextFunc(l.dial), gomail.WithoutNoop(), gomail.WithoutRset(),
	}
	if c.settings.Hello != "" {
		options = append(options, gomail.WithHELO(c.settings.Hello))
	}
	switch c.settings.Encryption {
	case TLS, None: // line has done it, or it is not wanted
		options = append(options, gomail.WithTLSPolicy(gomail.NoTLS))
	default:
		options = append(options, gomail.WithTLSPolicy(gomail.TLSMandatory))
	}
	if c.settings.User != "" {
		password, err := c.settings.password()
		if err != nil {
			return nil, err
		}
		// Strongest first; the last two are sent only through an encrypted line.
		options = append(options, gomail.WithUsername(c.settings.User), gomail.WithPassword(password),
			gomail.WithOpportunisticSMTPAuth(gomail.SMTPAuthSCRAMSHA256, gomail.SMTPAuthPlain, gomail.SMTPAuthLogin))
	}
	return gomail.NewClient(c.settings.Host, options...)
}

func (c *Channel) tlsConfig() *tls.Config {
	return &tls.Config{ServerName: c.settings.Host, MinVersion: tls.VersionTLS12, RootCAs: c.settings.Authorities}
}

// line is the one connection of a delivery. The library gives a connection a
// time limit and does not look at the context again; line cuts it when the
// context is done, whatever is being waited for.
type line struct {
	ctx        context.Context
	encryption Encryption
	config     *tls.Config
	conn       net.Conn
	stop       func() bool
}

func (l *line) dial(ctx context.Context, network, address string) (net.Conn, error) {
	conn, err := (&net.Dialer{}).DialContext(ctx, network, address)
	if err != nil {
		return nil, err
	}
	l.conn = conn
	l.stop = context.AfterFunc(l.ctx, func() { _ = conn.Close() })
	if l.encryption != TLS {
		return conn, nil
	}
	encrypted := tls.Client(conn, l.config)
	if err := encrypted.HandshakeContext(ctx); err != nil {
		return nil, fmt.Errorf("encrypt: %w", err)
	}
	return encrypted, nil
}

// hurry gives what is still to come so much time.
func (l *line) hurry(limit time.Duration) { _ = l.conn.SetDeadline(time.Now().Add(limit)) }

func (l *line) close() {
	if l.conn == nil {
		return
	}
	l.stop()
	_ = l.conn.Close()
}

// failed says whether an error is worth another try. A server's lasting refusal
// is not; everything else is the connection, the time, or a refusal for now.
func failed(ctx context.Context, err error) delivery.Outcome {
	answer := strings.TrimSpace(err.Error())
	if ctx.Err() != nil {
		return delivery.Failed(true, fmt.Sprintf("%v: %s", context.Cause(ctx), answer))
	}
	code := 0
	if refused := new(textproto.Error); errors.As(err, &refused) {
		code = refused.Code
	} else if sent := new(gomail.SendError); errors.As(err, &sent) {
		code = sent.ErrorCode()
	}
	return delivery.Failed(code < 500, answer)
}
