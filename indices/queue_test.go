package indices

import (
	"context"
	"fmt"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
	"thawledger/pipeline/bus"
)

// arrived is a part of a station as it comes off the bus.
func arrived(station string, number int32, readings int) bus.Delivery {
	p := &pipeline.Part{Batch: 1, Number: number, Attempt: 1, Station: station, Readings: make([]pipeline.Reading, readings)}
	return bus.Delivery{Part: p, ID: bus.IDOf(p), Station: station}
}

func numbers(ds []bus.Delivery) (out []int32) {
	for _, d := range ds {
		out = append(out, d.Part.Number)
	}
	return out
}

// asked asks for parts and sends what next gives out, as "FELL [1 2] true".
func asked(q *queue, most int) <-chan string {
	got := make(chan string, 1)
	go func() {
		station, ds, ok := q.next(most)
		got <- fmt.Sprint(station, " ", numbers(ds), " ", ok)
	}()
	return got
}

func receive[T any](t *testing.T, from <-chan T) T {
	t.Helper()
	select {
	case v := <-from:
		return v
	case <-time.After(patience):
		t.Fatalf("nothing within %v", patience)
		panic("not reached")
	}
}

func handed(t *testing.T, q *queue, most int) string {
	t.Helper()
	return receive(t, asked(q, most))
}

func TestQueueOrder(t *testing.T) {
	q := newQueue(100)
	for _, d := range []bus.Delivery{
		arrived("FELL", 1, 5), arrived("TARN", 2, 5), arrived("FELL", 3, 5), arrived("FELL", 4, 5), arrived("SCAR", 5, 50), arrived("TARN", 6, 5),
	} {
		q.put(d)
	}
	var got []string
	got = append(got, handed(t, q, 10)) // FELL keeps a part for later, at the end of the line
	q.release("FELL")
	got = append(got, handed(t, q, 10), handed(t, q, 10))
	q.put(arrived("TARN", 7, 5)) // in hand
	got = append(got, handed(t, q, 10))
	q.release("TARN")
	got = append(got, handed(t, q, 10))
	want := []string{"FELL [1 3] true", "TARN [2 6] true", "SCAR [5] true", "FELL [4] true", "TARN [7] true"}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
}

// A station that a worker has in hand is given to no other, and is waited for.
func TestQueueStationWithOneWorker(t *testing.T) {
	q := newQueue(100)
	q.put(arrived("FELL", 1, 1))
	q.put(arrived("FELL", 2, 1))
	if got := handed(t, q, 1); got != "FELL [1] true" {
		t.Fatal(got)
	}
	second := asked(q, 1)
	q.put(arrived("TARN", 3, 1))
	if got := receive(t, second); got != "TARN [3] true" {
		t.Fatalf("beside FELL in hand: %s", got)
	}
	second = asked(q, 1)
	q.release("FELL")
	if got := receive(t, second); got != "FELL [2] true" {
		t.Errorf("after FELL was released: %s", got)
	}
}

func TestQueueClose(t *testing.T) {
	q := newQueue(100)
	for i := range int32(3) {
		q.put(arrived("FELL", i+1, 1))
		q.put(arrived("TARN", i+11, 1))
	}
	if got := handed(t, q, 2); got != "FELL [1 2] true" {
		t.Fatal(got)
	}
	idle := newQueue(100)
	waiting := asked(idle, 1)
	idle.close()
	if got := receive(t, waiting); got != " [] false" {
		t.Errorf("waiting worker of a closed queue got %s", got)
	}
	if diff := cmp.Diff([]int32{11, 12, 13, 3}, numbers(q.close())); diff != "" {
		t.Errorf("left: %s", diff)
	}
	if got := handed(t, q, 2); got != " [] false" {
		t.Errorf("after close %s", got)
	}
	if left := q.close(); len(left) != 0 {
		t.Errorf("left twice: %v", numbers(left))
	}
}

func TestQueueRoom(t *testing.T) {
	q := newQueue(10)
	q.put(arrived("FELL", 1, 9))
	if !q.room(t.Context()) {
		t.Fatal("no room below the most")
	}
	q.put(arrived("FELL", 2, 9))
	ctx, cancel := context.WithTimeout(t.Context(), 20*time.Millisecond)
	defer cancel()
	if q.room(ctx) {
		t.Error("room in a full queue")
	}
	full := make(chan bool, 1)
	go func() { full <- q.room(t.Context()) }()
	if got := handed(t, q, 10); got != "FELL [1] true" { // 9 wait, one below the most
		t.Fatal(got)
	}
	if !receive(t, full) {
		t.Error("no room after parts were handed out")
	}
}

// Whatever comes and goes: each part is handed out once, a station's in the
// order in which they came, to one worker at a time, and what is left is
// counted to the reading.
func TestQueueHandsOutOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q := newQueue(1000)
		put, got := map[string][]int32{}, map[string][]int32{}
		var busy []string
		number, waiting, readings := int32(0), 0, 0
		for range rapid.IntRange(1, 60).Draw(t, "steps") {
			switch step := rapid.IntRange(0, 2).Draw(t, "step"); {
			case step == 0:
				number++
				d := arrived(rapid.SampledFrom([]string{"FELL", "TARN", "SCAR"}).Draw(t, "station"), number, rapid.IntRange(0, 9).Draw(t, "readings"))
				put[d.Station] = append(put[d.Station], number)
				waiting, readings = waiting+1, readings+len(d.Part.Readings)
				q.put(d)
			case step == 1 && free(put, got, busy):
				most := rapid.IntRange(0, 20).Draw(t, "most")
				station, ds, ok := q.next(most)
				sum := 0
				for i, d := range ds {
					if sum += len(d.Part.Readings); i > 0 && sum > most || d.Station != station {
						t.Fatalf("%d readings of %s for %s, most %d", sum, d.Station, station, most)
					}
				}
				readings -= sum
				for _, s := range busy {
					if s == station {
						t.Fatalf("%s is in hand twice", station)
					}
				}
				if !ok || len(ds) == 0 {
					t.Fatalf("got nothing of %s, %t", station, ok)
				}
				busy, waiting = append(busy, station), waiting-len(ds)
				got[station] = append(got[station], numbers(ds)...)
			case step == 2 && len(busy) > 0:
				q.release(busy[0])
				busy = busy[1:]
			}
			if q.readings != readings {
				t.Fatalf("%d readings wait, the queue counts %d", readings, q.readings)
			}
		}
		left := q.close()
		if len(left) != waiting {
			t.Fatalf("%d left, want %d", len(left), waiting)
		}
		for _, d := range left {
			got[d.Station] = append(got[d.Station], d.Part.Number)
		}
		if diff := cmp.Diff(put, got); diff != "" {
			t.Fatal(diff)
		}
	})
}

// free says whether a station has parts that no worker keeps from being handed out.
func free(put, got map[string][]int32, busy []string) bool {
	for station := range put {
		inHand := false
		for _, s := range busy {
			inHand = inHand || s == station
		}
		if !inHand && len(put[station]) > len(got[station]) {
			return true
		}
	}
	return false
}
