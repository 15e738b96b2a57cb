package bus

import (
	"context"
	"errors"
	"fmt"
	"strings"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
)

// ErrClosed says that the bus was closed. It is final.
var ErrClosed = errors.New("the bus is closed")

// ErrFull says that the bus has no room on disk. It passes when waiting parts
// are taken and done.
var ErrFull = errors.New("the bus has no room")

// ErrUnreachable says that the server is out of reach. It passes by itself.
var ErrUnreachable = errors.New("the bus is out of reach")

// Temporary says whether the same call may succeed later with nothing changed
// in the program or its settings: the server is out of reach or slow, or has no
// room. It is false for nil, for a closed bus, for a caller that gave up
// (context.Canceled), for a wrong part or setting, and for an encoding that
// cannot be read.
func Temporary(err error) bool {
	if err == nil || errors.Is(err, ErrClosed) || errors.Is(err, context.Canceled) {
		return false
	}
	if errors.Is(err, ErrFull) || errors.Is(err, ErrUnreachable) || errors.Is(err, context.DeadlineExceeded) {
		return true
	}
	if api, ok := errors.AsType[*jetstream.APIError](err); ok {
		return api.Code == 503 || api.ErrorCode == codeCreateFailed || missing(err)
	}
	return isAny(err, weather) || missing(err)
}

// weather lists the client's errors that pass by themselves.
var weather = []error{
	nats.ErrTimeout, nats.ErrNoServers, nats.ErrDisconnected,
	nats.ErrConnectionReconnecting, nats.ErrReconnectBufExceeded, nats.ErrStaleConnection,
	nats.ErrMaxConnectionsExceeded, jetstream.ErrAsyncPublishTimeout,
	jetstream.ErrNoHeartbeat, jetstream.ErrServerShutdown, jetstream.ErrConsumerLeadershipChanged,
}

// away lists those of them that mean that nothing reached the server.
var away = []error{
	nats.ErrNoServers, nats.ErrDisconnected, nats.ErrConnectionReconnecting, nats.ErrReconnectBufExceeded,
	nats.ErrStaleConnection, jetstream.ErrServerShutdown,
}

// Codes of the server's answers.
const (
	codeNoResources   = 10023 // server or account has no room
	codeNoFileStorage = 10047 // storage limit of server or account
	codeCreateFailed  = 10049 // also while what was there before is still being deleted
	codeStoreFailed   = 10077 // the limit set at Open, or the disk, or a fault of either
)

// told gives the client's errors the names of this package, so that callers
// need not know the client. The cause stays in the chain.
func told(err error) error {
	if err == nil {
		return nil
	}
	if isAny(err, []error{nats.ErrConnectionClosed, jetstream.ErrConnectionClosed, jetstream.ErrJetStreamPublisherClosed}) {
		return fmt.Errorf("%w: %w", ErrClosed, err)
	}
	if api, ok := errors.AsType[*jetstream.APIError](err); ok {
		switch api.ErrorCode {
		case codeNoResources, codeNoFileStorage:
			return fmt.Errorf("%w: %w", ErrFull, err)
		case codeStoreFailed:
			if strings.Contains(api.Description, "maximum") || strings.Contains(api.Description, "no space") {
				return fmt.Errorf("%w: %w", ErrFull, err)
			}
		}
		return err
	}
	if isAny(err, away) {
		return fmt.Errorf("%w: %w", ErrUnreachable, err)
	}
	return err
}

// missing says whether the server lacks what Open had set up.
func missing(err error) bool {
	return isAny(err, []error{
		nats.ErrNoResponders, jetstream.ErrNoStreamResponse, jetstream.ErrConsumerDeleted,
		jetstream.ErrConsumerNotFound, jetstream.ErrStreamNotFound, jetstream.ErrConsumerDoesNotExist,
	})
}

func isAny(err error, targets []error) bool {
	for _, t := range targets {
		if errors.Is(err, t) {
			return true
		}
	}
	return false
}
