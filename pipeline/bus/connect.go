package bus

import (
	"context"
	"errors"
	"fmt"
	"strconv"
	"strings"
	"time"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
	"go.uber.org/zap"
)

const (
	connectTimeout  = 5 * time.Second
	reconnectWait   = time.Second
	reconnectJitter = 500 * time.Millisecond
	// answerTimeout is how long the server may take to answer for a published
	// part. With every write synced, 128 parts take some tenths of a second.
	answerTimeout = 30 * time.Second
)

func (b *Bus) connect(ctx context.Context) error {
	timeout := connectTimeout
	if deadline, ok := ctx.Deadline(); ok {
		timeout = min(timeout, time.Until(deadline))
	}
	if err := ctx.Err(); err != nil {
		return err
	}
	options := []nats.Option{
		nats.Name(b.conf.Name),
		nats.Timeout(timeout),
		nats.MaxReconnects(-1), // for ever; the client's default gives up after 60 tries, for good
		nats.IgnoreAuthErrorAbort(),
		nats.ReconnectWait(reconnectWait),
		nats.ReconnectJitter(reconnectJitter, reconnectJitter),
		nats.ReconnectBufSize(-1), // fail at once instead of keeping what the caller then repeats
		nats.PingInterval(20 * time.Second),
		nats.DisconnectErrHandler(b.onLost),
		nats.ReconnectHandler(func(c *nats.Conn) {
			b.log.Info("bus back in reach", zap.String("url", c.ConnectedUrlRedacted()))
		}),
		nats.ClosedHandler(func(c *nats.Conn) {
			if !b.closing() {
				b.log.Error("bus connection ended for good", zap.Error(c.LastError()))
			}
		}),
		nats.ErrorHandler(func(_ *nats.Conn, s *nats.Subscription, err error) {
			b.log.Warn("bus trouble", zap.Error(err), zap.Bool("subscription", s != nil))
		}),
	}
	if b.server != nil {
		options = append(options, nats.InProcessServer(b.server))
	}
	if b.conf.CredentialsFile != "" {
		options = append(options, nats.UserCredentials(b.conf.CredentialsFile))
	}
	conn, err := nats.Connect(b.conf.URL, options...)
	if err != nil {
		return fmt.Errorf("connect: %w", err)
	}
	b.conn = conn
	if v := conn.ConnectedServerVersion(); !atLeast(v, 2, 10, 4) {
		return fmt.Errorf("server has version %s; 2.10.4 or later is needed", v)
	}
	b.js, err = jetstream.New(conn,
		jetstream.WithPublishAsyncTimeout(answerTimeout),
		jetstream.WithPublishAsyncAckHandler(func(_ jetstream.JetStream, m *nats.Msg, _ *jetstream.PubAck) { b.settle(m, nil) }),
		jetstream.WithPublishAsyncErrHandler(func(_ jetstream.JetStream, m *nats.Msg, err error) { b.settle(m, err) }),
	)
	return err
}

func (b *Bus) onLost(_ *nats.Conn, err error) {
	if b.closing() {
		return
	}
	if err == nil {
		err = errors.New("connection ended by the server")
	}
	b.log.Warn("bus out of reach, trying again for ever", zap.Error(err))
}

// atLeast compares a version such as 2.10.4 or 2.12.0-RC.1 with the one asked
// for. What cannot be read counts as too old.
func atLeast(version string, want ...int) bool {
	version, _, _ = strings.Cut(version, "-")
	have := strings.Split(version, ".")
	for i, w := range want {
		if i >= len(have) {
			return false
		}
		n, err := strconv.Atoi(have[i])
		if err != nil || n < w {
			return false
		}
		if n > w {
			return true
		}
	}
	return true
}
