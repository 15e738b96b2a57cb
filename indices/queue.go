package indices

import (
	"context"
	"sync"

	"thawledger/pipeline/bus"
)

// queue holds what was taken off the bus, a list a station. A station is with
// one worker at a time, so that workers do not wait for its lock; stations come
// up in the order in which their first part came.
type queue struct {
	most int // readings

	mu       sync.Mutex
	changed  *sync.Cond
	lists    map[string][]bus.Delivery
	order    []string // stations with parts, neither twice
	busy     map[string]bool
	readings int
	closed   bool
}

func newQueue(most int) *queue {
	q := &queue{most: most, lists: map[string][]bus.Delivery{}, busy: map[string]bool{}}
	q.changed = sync.NewCond(&q.mu)
	return q
}

// room waits until fewer readings wait than the queue is for; false once ctx is over.
func (q *queue) room(ctx context.Context) bool {
	stop := context.AfterFunc(ctx, func() {
		q.mu.Lock()
		defer q.mu.Unlock()
		q.changed.Broadcast()
	})
	defer stop()
	q.mu.Lock()
	defer q.mu.Unlock()
	for q.readings >= q.most && ctx.Err() == nil {
		q.changed.Wait()
	}
	return ctx.Err() == nil
}

func (q *queue) put(d bus.Delivery) {
	q.mu.Lock()
	defer q.mu.Unlock()
	if len(q.lists[d.Station]) == 0 {
		q.order = append(q.order, d.Station)
	}
	q.lists[d.Station] = append(q.lists[d.Station], d)
	q.readings += len(d.Part.Readings)
	q.changed.Broadcast()
}

// next waits for a station with parts that no worker has in hand, and returns
// about as many readings' worth of them as most says, at least one part. The
// station is busy until release. It returns false once the queue is closed.
func (q *queue) next(most int) (station string, ds []bus.Delivery, ok bool) {
	q.mu.Lock()
	defer q.mu.Unlock()
	for {
		if q.closed {
			return "", nil, false
		}
		for i, station := range q.order {
			if q.busy[station] {
				continue
			}
			list, n, readings := q.lists[station], 0, 0
			for n < len(list) && (n == 0 || readings+len(list[n].Part.Readings) <= most) {
				readings += len(list[n].Part.Readings)
				n++
			}
			q.readings -= readings
			q.order = append(q.order[:i], q.order[i+1:]...)
			if n < len(list) {
				q.lists[station] = list[n:]
				q.order = append(q.order, station)
			} else {
				delete(q.lists, station)
			}
			q.busy[station] = true
			q.changed.Broadcast()
			return station, list[:n], true
		}
		q.changed.Wait()
	}
}

func (q *queue) release(station string) {
	q.mu.Lock()
	defer q.mu.Unlock()
	delete(q.busy, station)
	q.changed.Broadcast()
}

// close sends the workers home once they have finished what they have in hand,
// and returns what no one has.
func (q *queue) close() []bus.Delivery {
	q.mu.Lock()
	defer q.mu.Unlock()
	q.closed = true
	var left []bus.Delivery
	for _, station := range q.order {
		left = append(left, q.lists[station]...)
	}
	q.order, q.lists = nil, map[string][]bus.Delivery{}
	q.changed.Broadcast()
	return left
}
