package deliverytest

import (
	"net"
	"sync"
)

// Behaviour is how a receiver treats what it is sent.
type Behaviour int

// The behaviours.
const (
	Takes          Behaviour = iota // takes everything
	Stalls                          // takes the connection and then says nothing more
	RefusesForNow                   // says that it cannot take it at the moment
	RefusesForGood                  // says that it will never take it
	ClosesEarly                     // hangs up in the middle
)

// Words is what receivers give as the reason of a refusal, or as thanks.
const Words = "by the test's receiver"

// taken keeps what a receiver took, in order.
type taken[T any] struct {
	mutex sync.Mutex
	all   []T
}

func (t *taken[T]) add(v T) {
	t.mutex.Lock()
	defer t.mutex.Unlock()
	t.all = append(t.all, v)
}

// All returns what was taken so far.
func (t *taken[T]) All() []T {
	t.mutex.Lock()
	defer t.mutex.Unlock()
	return append([]T(nil), t.all...)
}

// FreePort returns an address on which nothing listens.
func FreePort() (string, error) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return "", err
	}
	address := l.Addr().String()
	return address, l.Close()
}
