package bus

import (
	"context"
	"errors"
	"fmt"
	"net"
	"strconv"
	"sync"
	"time"

	natsserver "github.com/nats-io/nats-server/v2/server"
	"go.uber.org/zap"
)

// embedded is a message server in this process.
type embedded struct {
	*natsserver.Server
	starting sync.WaitGroup
}

// startEmbedded returns once the server has read its store and answers.
func startEmbedded(ctx context.Context, e Embedded, log *zap.Logger) (*embedded, error) {
	options := &natsserver.Options{
		ServerName:             "thawledger",
		JetStream:              true,
		StoreDir:               e.Dir,
		SyncAlways:             true,     // the default answers before it syncs, every two minutes
		JetStreamMaxStore:      1 << 50,  // bounded by Config.MaxBytes instead, which may be lowered from one start to the next
		JetStreamMaxMemory:     16 << 20, // unused; zero would mean three quarters of the machine
		DontListen:             e.Listen == "",
		NoSigs:                 true,
		DisableJetStreamBanner: true,
	}
	if e.Listen != "" {
		host, port, err := loopback(e.Listen)
		if err != nil {
			return nil, fmt.Errorf("listen on %q: %w", e.Listen, err)
		}
		options.Host, options.Port = host, port
	}
	srv, err := natsserver.NewServer(options)
	if err != nil {
		return nil, fmt.Errorf("set up embedded server: %w", err)
	}
	lines := &serverLog{log: log.Named("server"), fatal: make(chan string, 1)}
	srv.SetLoggerV2(lines, false, false, false)
	s := &embedded{Server: srv}
	s.starting.Go(srv.Start)
	for !srv.ReadyForConnections(100 * time.Millisecond) {
		select {
		case text := <-lines.fatal:
			err = errors.New(text)
		case <-ctx.Done():
			err = context.Cause(ctx)
		default:
			continue
		}
		return nil, errors.Join(fmt.Errorf("start embedded server in %s: %w", e.Dir, err), s.stop(context.WithoutCancel(ctx)))
	}
	return s, nil
}

// loopback splits an address and refuses one that other machines could reach.
func loopback(listen string) (host string, port int, err error) {
	host, text, err := net.SplitHostPort(listen)
	if err != nil {
		return "", 0, err
	}
	if ip := net.ParseIP(host); host != "localhost" && (ip == nil || !ip.IsLoopback()) {
		return "", 0, errors.New("the embedded server has no passwords and takes a loopback address only, such as 127.0.0.1:4222; several machines need a cluster")
	}
	n, err := strconv.ParseUint(text, 10, 16)
	if err != nil {
		return "", 0, fmt.Errorf("port %q is not a number from 0 to 65535", text)
	}
	if n == 0 {
		return host, natsserver.RANDOM_PORT, nil
	}
	return host, int(n), nil
}

func (s *embedded) url() string {
	if a := s.Addr(); a != nil {
		return "nats://" + a.String()
	}
	return ""
}

// stop shuts the server down, its store first, and waits for the end.
func (s *embedded) stop(ctx context.Context) error {
	gone := make(chan struct{})
	go func() {
		defer close(gone)
		s.starting.Wait()
		s.Shutdown()
		s.WaitForShutdown()
	}()
	select {
	case <-gone:
		return nil
	case <-ctx.Done():
		return fmt.Errorf("wait for embedded server to end: %w", context.Cause(ctx))
	}
}

// serverLog hands the server's log lines to zap. Its notices are of no use to
// the operator while all is well.
type serverLog struct {
	log   *zap.Logger
	fatal chan string // the first one; the server goes on after it, in no useful state
}

func (l *serverLog) Noticef(format string, v ...any) { l.write(l.log.Debug, format, v) }
func (l *serverLog) Debugf(format string, v ...any)  { l.write(l.log.Debug, format, v) }
func (l *serverLog) Tracef(format string, v ...any)  { l.write(l.log.Debug, format, v) }
func (l *serverLog) Warnf(format string, v ...any)   { l.write(l.log.Warn, format, v) }
func (l *serverLog) Errorf(format string, v ...any)  { l.write(l.log.Error, format, v) }

func (l *serverLog) Fatalf(format string, v ...any) {
	l.write(l.log.Error, format, v)
	select {
	case l.fatal <- fmt.Sprintf(format, v...):
	default:
	}
}

func (l *serverLog) write(to func(string, ...zap.Field), format string, v []any) {
	to("embedded server", zap.String("text", fmt.Sprintf(format, v...)))
}
