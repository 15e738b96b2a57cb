package quality

import "testing"

func BenchmarkDaily(b *testing.B) {
	rec := invented(1, 30)
	for b.Loop() {
		Daily(rec, Options{})
	}
}

func BenchmarkDailyWithNeighbours(b *testing.B) {
	rec := invented(1, 30)
	opt := Options{Neighbours: []Record{invented(2, 30), invented(3, 30), invented(4, 30)}}
	for b.Loop() {
		Daily(rec, opt)
	}
}
