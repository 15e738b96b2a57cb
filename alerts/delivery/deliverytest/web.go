package deliverytest

import (
	"crypto/tls"
	"crypto/x509"
	"io"
	"net"
	"net/http"
	"sync"
	"time"
)

// Post is what a web receiver was sent.
type Post struct {
	Header http.Header
	Body   []byte
}

// Web is a receiver of posts over https.
type Web struct {
	Address     string
	Authorities *x509.CertPool
	Stalled     chan struct{} // gets a value when a delivery has come to a stop

	taken[Post]
	server *http.Server
	done   sync.WaitGroup
	quit   chan struct{}
}

// StartWeb starts a receiver on 127.0.0.1. answer, if not nil, answers in place
// of the behaviour, after the body has been read.
func StartWeb(b Behaviour, answer http.HandlerFunc) (*Web, error) {
	certificate, pool, err := Certificate()
	if err != nil {
		return nil, err
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return nil, err
	}
	r := &Web{Address: "https://" + l.Addr().String() + "/thaw", Authorities: pool, Stalled: make(chan struct{}, 100), quit: make(chan struct{})}
	r.server = &http.Server{
		ReadHeaderTimeout: time.Minute,
		TLSConfig:         &tls.Config{Certificates: []tls.Certificate{certificate}, MinVersion: tls.VersionTLS12},
		ErrorLog:          nil,
		Handler: http.HandlerFunc(func(w http.ResponseWriter, q *http.Request) {
			body, err := io.ReadAll(q.Body)
			if err != nil {
				return
			}
			if answer != nil {
				r.add(Post{q.Header, body})
				answer(w, q)
				return
			}
			r.answer(b, w, Post{q.Header, body})
		}),
	}
	r.done.Go(func() { _ = r.server.ServeTLS(l, "", "") })
	return r, nil
}

func (r *Web) answer(b Behaviour, w http.ResponseWriter, p Post) {
	switch b {
	case Takes:
		r.add(p)
		_, _ = io.WriteString(w, "thanks, "+Words)
	case RefusesForNow:
		w.Header().Set("Retry-After", "120")
		http.Error(w, "put off "+Words, http.StatusServiceUnavailable)
	case RefusesForGood:
		http.Error(w, "not wanted, "+Words, http.StatusForbidden)
	case ClosesEarly:
		panic(http.ErrAbortHandler) // net/http's way to cut the connection
	case Stalls:
		r.Stalled <- struct{}{}
		<-r.quit
	}
}

// Close stops the receiver.
func (r *Web) Close() {
	close(r.quit)
	_ = r.server.Close()
	r.done.Wait()
}
