package push

import (
	"context"
	"errors"
	"fmt"
	"net"
	"net/http"
	"time"
)

// Server says where files are taken.
type Server struct {
	Address         string
	CertificateFile string // with KeyFile: TLS
	KeyFile         string
	Plain           bool // without TLS on other than loopback addresses
	Handler         http.Handler
}

// stopTime is how long requests under way get when the server stops.
const stopTime = 10 * time.Second

// Run serves until ctx ends, and lets what is under way come to its end. ready is
// called with the address once it listens.
func (s Server) Run(ctx context.Context, ready func(net.Addr)) error {
	if s.CertificateFile == "" && !s.Plain && !loopback(s.Address) {
		return fmt.Errorf("tokens would go unencrypted to %s: give certificate_file and key_file, listen on a loopback address, or say plain: true", s.Address)
	}
	listener, err := net.Listen("tcp", s.Address)
	if err != nil {
		return fmt.Errorf("listen for pushed files: %w", err)
	}
	server := &http.Server{Handler: s.Handler, ReadHeaderTimeout: 10 * time.Second, ReadTimeout: 10 * time.Minute, WriteTimeout: 10 * time.Minute,
		IdleTimeout: time.Minute, MaxHeaderBytes: 64 << 10}
	ended := make(chan error, 1)
	go func() {
		if s.CertificateFile != "" {
			ended <- server.ServeTLS(listener, s.CertificateFile, s.KeyFile)
			return
		}
		ended <- server.Serve(listener)
	}()
	ready(listener.Addr())
	select {
	case err := <-ended:
		return fmt.Errorf("take pushed files: %w", err)
	case <-ctx.Done():
	}
	last, cancel := context.WithTimeout(context.WithoutCancel(ctx), stopTime)
	defer cancel()
	err = server.Shutdown(last)
	if errors.Is(err, context.DeadlineExceeded) {
		err = server.Close()
	}
	<-ended
	return err
}

func loopback(address string) bool {
	host, _, err := net.SplitHostPort(address)
	if err != nil {
		return false
	}
	ip := net.ParseIP(host)
	return host == "localhost" || ip != nil && ip.IsLoopback()
}
