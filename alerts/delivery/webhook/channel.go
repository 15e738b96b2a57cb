package webhook

import (
	"bytes"
	"cmp"
	"context"
	"crypto/tls"
	"errors"
	"fmt"
	"io"
	"net"
	"net/http"
	"net/url"
	"strconv"
	"strings"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/text"
)

// Channel posts notices to a web address.
type Channel struct {
	settings Settings
	texts    *text.Texts
	client   *http.Client
}

const (
	maxAnswer  = 4 << 10 // bytes of a receiver's answer that are read
	maxHeaders = 64 << 10
	maxHops    = 3 // redirects
)

// New returns a channel, or everything that is wrong with its settings. It does
// not look for the receiver.
func New(s Settings, texts *text.Texts) (*Channel, error) {
	if err := s.Check(); err != nil {
		return nil, fmt.Errorf("webhook settings: %w", err)
	}
	return &Channel{settings: s, texts: texts, client: &http.Client{
		CheckRedirect: sameHostOnly,
		Transport: &http.Transport{
			Proxy:               http.ProxyFromEnvironment,
			DialContext:         (&net.Dialer{Timeout: s.timeout()}).DialContext,
			TLSClientConfig:     &tls.Config{MinVersion: tls.VersionTLS12, RootCAs: s.Authorities},
			TLSHandshakeTimeout: s.timeout(), ResponseHeaderTimeout: s.timeout(), MaxResponseHeaderBytes: maxHeaders,
			// Deliveries are rare: a kept connection would mostly be found dead.
			DisableKeepAlives: true, ForceAttemptHTTP2: true,
		},
	}}, nil
}

// sameHostOnly follows a redirect only to the same scheme and host, and only if
// it still posts: a signed notice is meant for one receiver.
func sameHostOnly(next *http.Request, before []*http.Request) error {
	first := before[0]
	if len(before) > maxHops || next.Method != http.MethodPost || next.URL.Scheme != first.URL.Scheme || next.URL.Host != first.URL.Host {
		return http.ErrUseLastResponse
	}
	return nil
}

// Deliver posts the notice once. It blocks until the receiver has answered, ctx
// is done or the time limit of the settings is over.
func (c *Channel) Deliver(ctx context.Context, n delivery.Notice) delivery.Outcome {
	w, err := c.texts.Write(n)
	if err != nil {
		return delivery.Failed(false, err.Error())
	}
	payload, err := body(n, w)
	if err != nil {
		return delivery.Failed(false, err.Error())
	}
	address := cmp.Or(c.settings.Address, n.Recipient.Address)
	if err := c.settings.checkAddress(address); err != nil {
		return delivery.Failed(false, err.Error())
	}
	ctx, cancel := context.WithTimeout(ctx, c.settings.timeout())
	defer cancel()
	request, err := c.request(ctx, address, n.Key, payload)
	if err != nil {
		return delivery.Failed(true, err.Error())
	}
	response, err := c.client.Do(request)
	if err != nil {
		return delivery.Failed(true, reason(ctx, err))
	}
	defer response.Body.Close()
	// What was read before the answer broke off is good enough for the record.
	answer, _ := io.ReadAll(io.LimitReader(response.Body, maxAnswer))
	return c.outcome(response, string(answer))
}

func (c *Channel) request(ctx context.Context, address, key string, payload []byte) (*http.Request, error) {
	secret, err := ReadSecret(c.settings.SecretFile)
	if err != nil {
		return nil, err
	}
	request, err := http.NewRequestWithContext(ctx, http.MethodPost, address, bytes.NewReader(payload))
	if err != nil {
		return nil, fmt.Errorf("make request: %w", err)
	}
	sentAt := instant(c.settings.Now())
	request.Header.Set("Content-Type", "application/json")
	request.Header.Set("User-Agent", "thawledger")
	request.Header.Set(TimeHeader, sentAt)
	request.Header.Set(KeyHeader, key)
	request.Header.Set(ProofHeader, Proof(secret, sentAt, payload))
	return request, nil
}

// reason words an error of the connection without the address, whose query may
// hold a password.
func reason(ctx context.Context, err error) string {
	if wrapped := new(url.Error); errors.As(err, &wrapped) {
		err = wrapped.Err
	}
	if ctx.Err() != nil {
		return fmt.Sprintf("%v: %v", context.Cause(ctx), err)
	}
	return err.Error()
}

func (c *Channel) outcome(r *http.Response, answer string) delivery.Outcome {
	said := strings.TrimSpace(r.Status + " " + answer)
	switch code := r.StatusCode; {
	case code >= 200 && code < 300:
		return delivery.Taken(said)
	case code >= 300 && code < 400:
		return delivery.Failed(false, r.Status+": not followed; set the address that it leads to")
	case code == http.StatusRequestTimeout, code == http.StatusTooEarly, code == http.StatusTooManyRequests, code >= 500:
		out := delivery.Failed(true, said)
		out.After = c.after(r.Header.Get("Retry-After"))
		return out
	}
	return delivery.Failed(false, said)
}

// after reads a Retry-After header: seconds or a date (RFC 9110, section
// 10.2.3). What cannot be read, and what lies in the past, is no wait.
func (c *Channel) after(header string) time.Duration {
	var wait time.Duration
	if seconds, err := strconv.ParseUint(strings.TrimSpace(header), 10, 63); err == nil || errors.Is(err, strconv.ErrRange) {
		wait = time.Duration(min(seconds, uint64(c.settings.longestWait()/time.Second)+1)) * time.Second
	} else if at, err := http.ParseTime(header); err == nil {
		wait = at.Sub(c.settings.Now())
	}
	return min(max(wait, 0), c.settings.longestWait())
}
