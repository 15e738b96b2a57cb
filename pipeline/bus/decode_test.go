package bus

import (
	"bytes"
	"encoding/binary"
	"errors"
	"testing"

	"thawledger/pipeline"
)

// summed appends the checksum that makes b an encoding, whatever b is.
func summed(b []byte) []byte {
	return binary.LittleEndian.AppendUint32(bytes.Clone(b), sum(b))
}

// Places in the encoding of golden.
const (
	atVersion  = 3
	atBatch    = 4
	atFeed     = 8
	atStation  = 10
	atSeries   = 14 // their number
	atVariable = 17
	atLevel    = 18
	atReadings = 39 // their number
	atPlace    = 40
	atRow      = 43
	atQuality  = 44
	atValue    = 45
)

func TestDecodeRefuses(t *testing.T) {
	p, whole := golden()
	body := whole[:len(whole)-sumBytes]
	set := func(at int, with ...byte) []byte { // with the right checksum
		b := bytes.Clone(body)
		copy(b[at:], with)
		return summed(b)
	}
	put := func(at, instead int, with ...byte) []byte {
		b := append(bytes.Clone(body[:at]), with...)
		return summed(append(b, body[at+instead:]...))
	}
	flip := func(at int) []byte {
		b := bytes.Clone(whole)
		b[at] ^= 0x10
		return b
	}
	for _, c := range []struct {
		name string
		data []byte
		err  error
	}{
		{"empty", nil, ErrTruncated},
		{"begins well", []byte("TL"), ErrTruncated},
		{"magic only", []byte("TLP"), ErrTruncated},
		{"other bytes", []byte("hello, here is a reading"), ErrNotPart},
		{"short other bytes", []byte("h"), ErrNotPart},
		{"version 0", set(atVersion, 0), ErrVersion},
		{"version 2", set(atVersion, 2), ErrVersion},
		{"too long", append(bytes.Clone(whole), make([]byte, MaxEncodedBytes)...), ErrTooLong},
		{"flip in a text", flip(atFeed + 1), ErrChecksum},
		{"flip in a value", flip(atValue), ErrChecksum},
		{"flip that makes a wrong number", flip(atQuality), ErrChecksum},
		{"flip in the sum", flip(len(whole) - 1), ErrChecksum},
		{"last byte missing", whole[:len(whole)-1], ErrTruncated},
		{"last reading missing", summed(body[:len(body)-13]), ErrTruncated},
		{"sum missing", body, ErrTruncated},
		{"byte more", append(bytes.Clone(whole), 0), ErrTrailing},
		{"twice", append(bytes.Clone(whole), whole...), ErrTrailing},
		{"byte more under the sum", summed(append(bytes.Clone(body), 0)), ErrTrailing},
		{"batch 0", put(atBatch, 2, 0), ErrRange},
		{"batch beyond 63 bits", put(atBatch, 2, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0x01), ErrRange},
		{"batch beyond 64 bits", put(atBatch, 2, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0x7F), ErrForm},
		{"batch longer than need be", put(atBatch, 2, 0xAC, 0x82, 0x00), ErrForm},
		{"no feed", put(atFeed, 2, 0), ErrRange},
		{"long feed", put(atFeed, 1, 0x80, 0x02), ErrTooLong},
		{"feed beyond the end", put(atFeed, 1, 0xFF, 0x01), ErrTruncated},
		{"station not UTF-8", set(atStation+2, 0x28), ErrForm},
		{"no series", put(atSeries, len(body)-atSeries, 0, 0), ErrTooLong},
		{"many series", put(atSeries, 1, binary.AppendUvarint(nil, MaxSeries+1)...), ErrTooLong},
		{"series beyond the end", put(atSeries, 1, binary.AppendUvarint(nil, MaxSeries)...), ErrTruncated},
		{"unknown variable", set(atVariable, 99), ErrRange},
		{"level not a number", set(atLevel, 0, 0, 0, 0, 0, 0, 0xF8, 0x7F), ErrNotFinite},
		{"no readings", put(atReadings, len(body)-atReadings, 0), ErrTooLong},
		{"many readings", put(atReadings, 1, binary.AppendUvarint(nil, MaxReadings+1)...), ErrTooLong},
		{"readings beyond the end", put(atReadings, 1, binary.AppendUvarint(nil, MaxReadings)...), ErrTruncated},
		{"series not listed", set(atPlace, 2), ErrSeries},
		{"row 0", set(atRow, 0), ErrRange},
		{"row beyond 31 bits", put(atRow, 1, 0x80, 0x80, 0x80, 0x80, 0x10), ErrRange},
		{"start beyond year 9999", put(atPlace+1, 2, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0xFF, 0x01), ErrRange},
		{"quality 8", set(atQuality, 8), ErrRange},
		{"value infinite", set(atValue, 0, 0, 0, 0, 0, 0, 0xF0, 0xFF), ErrNotFinite},
	} {
		t.Run(c.name, func(t *testing.T) {
			if p, err := Decode(c.data); !errors.Is(err, c.err) || p != nil {
				t.Errorf("%v, want %v", err, c.err)
			}
		})
	}
	if _, err := Decode(set(atPlace, byte(len(p.Series)-1))); err != nil { // the places are right
		t.Error(err)
	}
}

// Lengths that are not there cost next to nothing.
func TestDecodeAllocatesLittle(t *testing.T) {
	_, whole := golden()
	b := summed(binary.AppendUvarint(bytes.Clone(whole[:atReadings]), MaxReadings))
	if r := testing.Benchmark(func(b2 *testing.B) {
		b2.ReportAllocs()
		for b2.Loop() {
			_, _ = Decode(b)
		}
	}); r.AllocedBytesPerOp() > 1024 {
		t.Errorf("%d bytes allocated for %d that claim %d readings", r.AllocedBytesPerOp(), len(b), MaxReadings)
	}
}

// FuzzDecode feeds bytes as they are, and with a right checksum behind them so
// that the search gets past it. What is accepted is encoded to the same bytes.
func FuzzDecode(f *testing.F) {
	_, whole := golden()
	f.Add(whole)
	f.Add(whole[:len(whole)-sumBytes])
	long, err := Encode(nil, part(1, 1, pipeline.PartReadings))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(long)
	f.Fuzz(func(t *testing.T, data []byte) {
		for _, b := range [][]byte{data, summed(data)} {
			p, err := Decode(b)
			if err != nil {
				if !named(err) || p != nil {
					t.Fatalf("error without a name, or a part with one: %v", err)
				}
				continue
			}
			again, err := Encode(nil, p)
			if err != nil {
				t.Fatal(err)
			}
			if !bytes.Equal(again, b) {
				t.Fatalf("accepted\n% x, encoded\n% x", b, again)
			}
		}
	})
}

func BenchmarkDecode(b *testing.B) {
	data, err := Encode(nil, part(1, 1, pipeline.PartReadings))
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		_, _ = Decode(data)
	}
	b.ReportMetric(float64(b.N)*pipeline.PartReadings/b.Elapsed().Seconds(), "readings/s")
}
