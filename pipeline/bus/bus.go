package bus

import (
	"context"
	"errors"
	"fmt"
	"os"
	"sync"
	"sync/atomic"
	"time"

	"github.com/nats-io/nats.go"
	"github.com/nats-io/nats.go/jetstream"
	"go.uber.org/zap"
)

// Config says which server carries the messages. Exactly one of URL and
// Embedded is set.
type Config struct {
	// URL of a cluster's servers, comma-separated. Its servers must be of
	// version 2.10.4 or later, and keep messages on disk.
	URL string
	// CredentialsFile is read anew at every connect; with URL only.
	CredentialsFile string
	// Replicas is on how many servers of the cluster each message is kept, 1 to
	// 5, odd numbers being of use. Default 1.
	Replicas int
	// Embedded runs the server inside this process.
	Embedded *Embedded

	// MaxBytes is how much room on disk waiting parts may take before new ones
	// are refused. Default 8 GiB. Announcements may take up to a sixteenth of
	// it more (64 MiB at most); of them the oldest give way.
	//
	// Keep it below the free space of the disk: a server whose disk is full
	// stops keeping messages until it is started again.
	MaxBytes int64
	// WorkTime is how long a taken part may be worked on without a word before
	// it is given to another taker. Default 60 s. All processes on one bus
	// should say the same; the last to open decides. It must be well above the
	// time that everything taken in one go needs, or StillWorking must be said.
	WorkTime time.Duration
	// Name shows in the server's list of connections. Default "thawledger".
	Name string
	// Log may be nil.
	Log *zap.Logger
}

// Embedded is a server inside this process.
type Embedded struct {
	Dir string // its folder; the caller holds a lock on it
	// Listen is a loopback address, host:port, for further processes of this
	// machine; port 0 picks a free one (see Bus.URL). There are no passwords, so
	// other than loopback is refused. Empty: this process only.
	Listen string
}

// Bus is a connection to the server, and the server if it is embedded. All its
// methods may be called from several goroutines.
type Bus struct {
	log      *zap.Logger
	conf     Config
	server   *embedded // nil for a cluster
	conn     *nats.Conn
	js       jetstream.JetStream
	setup    sync.Mutex // held while what is missing is made again
	restored atomic.Uint64

	slots  chan struct{} // one taken for each part published and not yet answered for
	mu     sync.Mutex
	sent   map[*nats.Msg]*sent
	closed chan struct{}
}

// Open starts the embedded server or connects to the cluster, and brings what
// the server keeps into line with this program: what is missing is made, what
// differs is changed, and what cannot be changed is an error.
//
// It blocks until that is done or ctx is over; an embedded server first reads
// its store, which for gigabytes takes seconds and is not cut short. A cluster that is out of reach
// is an error at once (Temporary); later losses of the connection are not.
func Open(ctx context.Context, c Config) (*Bus, error) {
	if err := c.complete(); err != nil {
		return nil, fmt.Errorf("open bus: %w", err)
	}
	b := &Bus{
		log:    c.Log,
		conf:   c,
		slots:  make(chan struct{}, maxOutstanding),
		sent:   map[*nats.Msg]*sent{},
		closed: make(chan struct{}),
	}
	if err := b.open(ctx); err != nil {
		return nil, fmt.Errorf("open bus: %w", errors.Join(told(err), b.Close(context.WithoutCancel(ctx))))
	}
	return b, nil
}

func (c *Config) complete() error {
	c.MaxBytes = defaultTo(c.MaxBytes, 8<<30)
	c.WorkTime = defaultTo(c.WorkTime, time.Minute)
	c.Replicas = defaultTo(c.Replicas, 1)
	c.Name = defaultTo(c.Name, "thawledger")
	c.Log = defaultTo(c.Log, zap.NewNop())
	switch {
	case (c.URL == "") == (c.Embedded == nil):
		return errors.New("exactly one of a URL and an embedded server must be set")
	case c.Embedded != nil && c.Embedded.Dir == "":
		return errors.New("the embedded server has no folder")
	case c.Embedded != nil && (c.Replicas != 1 || c.CredentialsFile != ""):
		return errors.New("replicas and a credentials file are for a cluster, not for the embedded server")
	case c.Replicas < 1 || c.Replicas > 5:
		return fmt.Errorf("replicas %d, not 1 to 5", c.Replicas)
	case c.MaxBytes < 1<<20:
		return fmt.Errorf("room for waiting parts %d bytes, not 1 MiB or more", c.MaxBytes)
	case c.WorkTime < time.Second:
		return fmt.Errorf("work time %v, not 1 s or more", c.WorkTime)
	}
	if c.CredentialsFile != "" {
		if _, err := os.ReadFile(c.CredentialsFile); err != nil {
			return fmt.Errorf("read credentials: %w", err)
		}
	}
	return nil
}

func defaultTo[T comparable](v, otherwise T) T {
	var zero T
	if v == zero {
		return otherwise
	}
	return v
}

func (b *Bus) open(ctx context.Context) error {
	if b.conf.Embedded != nil {
		s, err := startEmbedded(ctx, *b.conf.Embedded, b.log)
		if err != nil {
			return err
		}
		b.server = s
	}
	if err := b.connect(ctx); err != nil {
		return err
	}
	_, err := b.bringIntoLine(ctx)
	return err
}

// URL returns the address at which an embedded server listens, for the URL of
// other processes on this machine; "" when it does not listen or is a cluster.
func (b *Bus) URL() string {
	if b.server == nil {
		return ""
	}
	return b.server.url()
}

// Connected says whether the server is in reach just now, as far as the client
// has noticed.
func (b *Bus) Connected() bool { return b.conn.IsConnected() }

// Restored returns how often something that Open had set up was found missing
// on the server and made again. Anything but 0 means that other hands are at
// work on it, and that parts may have been lost with what was deleted.
func (b *Bus) Restored() uint64 { return b.restored.Load() }

// Close ends the connection, then the embedded server, and waits until both are
// gone or ctx is over; the server then ends in the background. Answers given to
// deliveries are sent out first. Publishers still waiting get ErrClosed; parts
// taken and not answered are given out again after the next Open. Closing twice
// does nothing.
func (b *Bus) Close(ctx context.Context) error {
	b.mu.Lock()
	select {
	case <-b.closed:
		b.mu.Unlock()
		return nil
	default:
		close(b.closed)
	}
	b.mu.Unlock()
	if b.conn != nil {
		if b.conn.IsConnected() {
			flush, cancel := context.WithTimeout(ctx, 2*time.Second)
			if err := b.conn.FlushWithContext(flush); err != nil {
				b.log.Warn("bus closed without the last answers, their parts will come again", zap.Error(err))
			}
			cancel()
		}
		if b.js != nil {
			b.js.CleanupPublisher()
		}
		b.conn.Close()
	}
	b.settleAll(ErrClosed)
	if b.server != nil {
		if err := b.server.stop(ctx); err != nil {
			return fmt.Errorf("close bus: %w", err)
		}
	}
	return nil
}

func (b *Bus) closing() bool {
	select {
	case <-b.closed:
		return true
	default:
		return false
	}
}
