package fetch

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"net"
	"net/http"
	"net/url"
	"strconv"
	"sync"
	"time"
)

// temporaryError is trouble that may be over by itself.
type temporaryError struct {
	err   error
	after time.Duration // the server asks to be left alone for so long
}

func (e *temporaryError) Error() string { return e.err.Error() }
func (e *temporaryError) Unwrap() error { return e.err }

func temporary(err error, after time.Duration) error { return &temporaryError{err, after} }

// Temporary says whether trying again later makes sense without anybody doing
// anything.
func Temporary(err error) bool {
	var t *temporaryError
	return errors.As(err, &t)
}

var errRedirect = errors.New("redirect refused")

func redirect(req *http.Request, via []*http.Request) error {
	switch {
	case len(via) > 5:
		return fmt.Errorf("%w: more than five", errRedirect)
	case via[len(via)-1].URL.Scheme == "https" && req.URL.Scheme != "https":
		return fmt.Errorf("%w: from https to %s", errRedirect, req.URL.Scheme)
	}
	return nil
}

// trouble says what went wrong with a request. Addresses are left out: they may
// hold a token.
func (f *Fetcher) trouble(ctx context.Context, err error) error {
	var u *url.Error
	if errors.As(err, &u) {
		err = u.Err
	}
	switch {
	case errors.Is(err, errRedirect):
		return err
	case errors.Is(ctx.Err(), context.DeadlineExceeded):
		return temporary(fmt.Errorf("no answer within %s", f.Timeout), 0)
	case errors.Is(err, context.Canceled) && ctx.Err() != nil:
		return temporary(fmt.Errorf("nothing came for %s, or the request was broken off", f.Stall), 0)
	}
	return temporary(fmt.Errorf("ask %s: %w", f.host, err), 0)
}

// mostPatience caps what a server may ask to be left alone for.
const mostPatience = 10 * time.Minute

// refused says what a status that is no file means.
func refused(answer *http.Response) error {
	err := fmt.Errorf("the server answers %s", answer.Status)
	switch code := answer.StatusCode; {
	case code == http.StatusUnauthorized, code == http.StatusForbidden:
		return fmt.Errorf("%w; check user and password_file, or bearer_file", err)
	case code == http.StatusNotFound, code == http.StatusGone:
		return fmt.Errorf("%w; check the address", err)
	case code == http.StatusRequestTimeout, code == http.StatusTooEarly, code == http.StatusTooManyRequests, code >= 500:
		seconds, _ := strconv.Atoi(answer.Header.Get("Retry-After"))
		return temporary(err, min(time.Duration(max(seconds, 0))*time.Second, mostPatience))
	}
	return err
}

// backOff is a random pause that grows with the tries, at least what the server
// asked for ("full jitter").
func backOff(try int, asked time.Duration) time.Duration {
	most := time.Second << min(try, 6)
	return asked + time.Duration(rand.Int64N(int64(most)))
}

func pause(ctx context.Context, d time.Duration) error {
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-ctx.Done():
		return ctx.Err()
	case <-t.C:
		return nil
	}
}

func transport() *http.Transport {
	return &http.Transport{
		Proxy:       http.ProxyFromEnvironment,
		DialContext: (&net.Dialer{Timeout: 10 * time.Second}).DialContext, TLSHandshakeTimeout: 10 * time.Second,
		ResponseHeaderTimeout: 30 * time.Second, IdleConnTimeout: 30 * time.Second, MaxIdleConnsPerHost: 1, DisableCompression: true,
		MaxResponseHeaderBytes: 64 << 10,
	}
}

// Hosts lets one request at a time go to a host. The zero value is ready.
type Hosts struct {
	mu   sync.Mutex
	busy map[string]chan struct{}
}

func (h *Hosts) take(ctx context.Context, host string) (release func(), err error) {
	h.mu.Lock()
	if h.busy == nil {
		h.busy = map[string]chan struct{}{}
	}
	turn := h.busy[host]
	if turn == nil {
		turn = make(chan struct{}, 1)
		h.busy[host] = turn
	}
	h.mu.Unlock()
	select {
	case turn <- struct{}{}:
		return func() { <-turn }, nil
	case <-ctx.Done():
		return nil, ctx.Err()
	}
}
