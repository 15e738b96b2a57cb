package bus

import (
	"context"
	"errors"
	"fmt"
	"reflect"
	"time"

	"github.com/nats-io/nats.go/jetstream"
	"go.uber.org/zap"
)

// What is kept on the server. The names are part of the contract with other
// versions of this program and with subscribers.
const (
	readingsName  = "thawledger-readings"
	announceName  = "thawledger-announcements"
	takerName     = "indices"
	sameIDWindow  = 2 * time.Minute
	announceAge   = 90 * 24 * time.Hour
	maxInWork     = 2000 // parts with takers at a time, those put off included
	announceBytes = 64 << 20
)

func announcementBytes(maxBytes int64) int64 { return min(maxBytes/16, announceBytes) }

// readingsStream keeps parts until they are done. When full it refuses new
// ones; dropping old ones would lose readings.
func (b *Bus) readingsStream() jetstream.StreamConfig {
	return jetstream.StreamConfig{
		Name:              readingsName,
		Description:       "parts of batches, from ingest to indices",
		Subjects:          []string{readingsSubject + "*"},
		Retention:         jetstream.WorkQueuePolicy,
		Storage:           jetstream.FileStorage,
		Discard:           jetstream.DiscardNew,
		MaxBytes:          b.conf.MaxBytes,
		MaxMsgs:           -1,
		MaxMsgsPerSubject: -1,
		MaxMsgSize:        maxMessageBytes,
		Duplicates:        sameIDWindow,
		Replicas:          b.conf.Replicas,
	}
}

// announceStream keeps announcements for whoever asks; the oldest give way.
func (b *Bus) announceStream() jetstream.StreamConfig {
	return jetstream.StreamConfig{
		Name:              announceName,
		Description:       "changes of standings, for subscribers",
		Subjects:          []string{standingSubject + ">"},
		Retention:         jetstream.LimitsPolicy,
		Storage:           jetstream.FileStorage,
		Discard:           jetstream.DiscardOld,
		MaxBytes:          announcementBytes(b.conf.MaxBytes),
		MaxMsgs:           -1,
		MaxMsgsPerSubject: -1,
		MaxMsgSize:        maxMessageBytes,
		MaxAge:            announceAge,
		Duplicates:        sameIDWindow,
		Replicas:          b.conf.Replicas,
	}
}

// taker is the one place that remembers who has what; all takers of all
// processes share it.
func (b *Bus) taker() jetstream.ConsumerConfig {
	return jetstream.ConsumerConfig{
		Durable:       takerName,
		Description:   "takers of the index service",
		DeliverPolicy: jetstream.DeliverAllPolicy,
		AckPolicy:     jetstream.AckExplicitPolicy,
		AckWait:       b.conf.WorkTime,
		MaxDeliver:    -1, // the service decides when to give up
		MaxAckPending: maxInWork,
	}
}

// bringIntoLine makes what is missing, changes what differs, and says how much
// it had to make.
func (b *Bus) bringIntoLine(ctx context.Context) (made int, err error) {
	b.setup.Lock()
	defer b.setup.Unlock()
	for _, want := range []jetstream.StreamConfig{b.readingsStream(), b.announceStream()} {
		n, err := b.stream(ctx, want)
		made += n
		if err != nil {
			return made, fmt.Errorf("set up %s: %w", want.Name, err)
		}
	}
	_, err = b.js.Consumer(ctx, readingsName, takerName)
	if errors.Is(err, jetstream.ErrConsumerNotFound) {
		made++
	}
	if _, err := b.js.CreateOrUpdateConsumer(ctx, readingsName, b.taker()); err != nil {
		return made, fmt.Errorf("set up takers of %s: %w", readingsName, err)
	}
	return made, nil
}

func (b *Bus) stream(ctx context.Context, want jetstream.StreamConfig) (made int, err error) {
	s, err := b.js.Stream(ctx, want.Name)
	if errors.Is(err, jetstream.ErrStreamNotFound) {
		_, err = b.js.CreateStream(ctx, want)
		if !errors.Is(err, jetstream.ErrStreamNameAlreadyInUse) {
			return 1, err
		}
		s, err = b.js.Stream(ctx, want.Name) // another process was quicker
	}
	if err != nil {
		return 0, err
	}
	have := s.CachedInfo().Config
	if have.Retention != want.Retention || have.Storage != want.Storage {
		return 0, fmt.Errorf("it is there with retention %v on %v and cannot be changed to %v on %v; remove it when it is empty",
			have.Retention, have.Storage, want.Retention, want.Storage)
	}
	// Only what this program depends on is changed: where a cluster places the
	// data, for one, is its operator's affair.
	next := have
	next.Description, next.Subjects, next.Discard = want.Description, want.Subjects, want.Discard
	next.DiscardNewPerSubject = false
	next.MaxBytes, next.MaxMsgs, next.MaxMsgsPerSubject = want.MaxBytes, want.MaxMsgs, want.MaxMsgsPerSubject
	next.MaxMsgSize, next.MaxAge, next.Duplicates = want.MaxMsgSize, want.MaxAge, want.Duplicates
	next.Replicas = want.Replicas
	if reflect.DeepEqual(have, next) {
		return 0, nil
	}
	b.log.Info("bus brought into line", zap.String("name", want.Name))
	_, err = b.js.UpdateStream(ctx, next)
	return 0, err
}

// restore is called when the server turned out to lack something.
func (b *Bus) restore(ctx context.Context, cause error) error {
	made, err := b.bringIntoLine(ctx)
	if made > 0 {
		b.restored.Add(uint64(made))
		b.log.Error("bus was incomplete and has been made whole; parts may be lost", zap.Int("made", made), zap.NamedError("cause", cause))
	}
	if err != nil {
		return fmt.Errorf("make bus whole: %w", told(err))
	}
	return nil
}
