package bus

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"math"

	"thawledger/pipeline"
)

// What may be wrong with an encoded part, or with a part to be encoded.
var (
	ErrNotPart   = errors.New("not an encoded part")
	ErrVersion   = errors.New("unknown version of the encoding")
	ErrChecksum  = errors.New("checksum does not match")
	ErrTruncated = errors.New("encoding ends too soon")
	ErrTrailing  = errors.New("bytes follow the encoding")
	ErrTooLong   = errors.New("length out of limits")
	ErrNotFinite = errors.New("value is not a finite number")
	ErrSeries    = errors.New("no such series")
	ErrRange     = errors.New("number out of range")
	ErrForm      = errors.New("malformed number or text")
)

// Decode reads the encoding that Encode writes, and nothing else: an unknown
// version, a wrong checksum, a missing or an extra byte, a length out of limits,
// a value that is not finite, a series that is not listed and any other form of
// the same number are refused with one of the errors above. When the checksum
// does not match, that is what is said, but for an encoding that was cut short
// (ErrTruncated, also when a spoiled length only makes it look so) or that is
// whole and has something behind it (ErrTrailing).
//
// The part shares no memory with data. However data was made up, Decode
// allocates no more than a few times its length.
func Decode(data []byte) (*pipeline.Part, error) {
	p, err := decode(data)
	if err != nil {
		return nil, fmt.Errorf("decode part: %w", err)
	}
	return p, nil
}

func decode(data []byte) (*pipeline.Part, error) {
	if n := min(len(data), len(magic)); string(data[:n]) != string(magic[:n]) {
		return nil, ErrNotPart
	}
	if len(data) > MaxEncodedBytes {
		return nil, fmt.Errorf("%w: %d bytes, at most %d", ErrTooLong, len(data), MaxEncodedBytes)
	}
	if len(data) < len(magic)+1+sumBytes {
		return nil, ErrTruncated
	}
	if v := data[len(magic)]; v != version {
		return nil, fmt.Errorf("%w: %d, known is %d", ErrVersion, v, version)
	}
	body := data[:len(data)-sumBytes]
	whole := sum(body) == binary.LittleEndian.Uint32(data[len(body):])
	d := decoder{rest: body[len(magic)+1:]}
	p := d.part()
	switch {
	case d.err != nil && (whole || errors.Is(d.err, ErrTruncated)):
		return nil, d.err
	case d.err != nil:
		return nil, ErrChecksum
	case whole && len(d.rest) > 0:
		return nil, fmt.Errorf("%w: %d", ErrTrailing, len(d.rest))
	case !whole:
		end := len(body) - len(d.rest)
		if extra := len(d.rest); extra > 0 && sum(data[:end]) == binary.LittleEndian.Uint32(data[end:]) {
			return nil, fmt.Errorf("%w: %d", ErrTrailing, extra)
		}
		return nil, ErrChecksum
	}
	if err := check(p); err != nil {
		return nil, err
	}
	return p, nil
}

func sum(b []byte) uint32 { return crc32.Checksum(b, castagnoli) }

// decoder takes one item after the other off rest. After an error every further
// item is zero; the first error stays.
type decoder struct {
	rest []byte
	err  error
}

func (d *decoder) part() *pipeline.Part {
	p := &pipeline.Part{
		Batch:   int64(d.uvarint(math.MaxInt64)),
		Number:  int32(d.uvarint(math.MaxInt32)),
		Attempt: int32(d.uvarint(math.MaxInt32)),
		Feed:    d.text(),
		Station: d.text(),
	}
	if n := d.count(MaxSeries, minSeriesBytes); n > 0 {
		p.Series = make([]pipeline.Series, n)
	}
	for i := range p.Series {
		p.Series[i] = pipeline.Series{
			Sensor:   d.text(),
			Variable: pipeline.Variable(d.byte()),
			LevelM:   d.float(),
			SpanS:    int32(d.uvarint(math.MaxInt32)),
		}
		if d.err != nil {
			return nil
		}
	}
	if n := d.count(MaxReadings, minReadingBytes); n > 0 {
		p.Readings = make([]pipeline.Reading, n)
	}
	var startS, row int64
	for i := range p.Readings {
		series := d.uvarint(math.MaxUint16)
		startS += d.varint()
		row += d.varint()
		if d.err == nil && (row < 1 || row > math.MaxInt32) {
			d.fail(fmt.Errorf("reading %d: %w: row %d", i, ErrRange, row))
		}
		if d.err == nil && (startS < minStartS || startS > maxStartS) {
			d.fail(fmt.Errorf("reading %d: %w: start %d s", i, ErrRange, startS))
		}
		p.Readings[i] = pipeline.Reading{
			Series:  uint16(series),
			StartS:  startS,
			Row:     int32(row),
			Quality: pipeline.Quality(d.byte()),
			ValueC:  d.float(),
		}
		if d.err != nil {
			return nil
		}
	}
	return p
}

// count reads how many items follow. No more are believed than rest can hold.
func (d *decoder) count(most, itemBytes int) int {
	n := int(d.uvarint(math.MaxInt32))
	switch {
	case d.err != nil:
		return 0
	case n > most:
		d.fail(fmt.Errorf("%w: %d, at most %d", ErrTooLong, n, most))
		return 0
	case n*itemBytes > len(d.rest):
		d.fail(ErrTruncated)
		return 0
	}
	return n
}

func (d *decoder) uvarint(most uint64) uint64 {
	if d.err != nil {
		return 0
	}
	v, n := binary.Uvarint(d.rest)
	switch {
	case n == 0:
		d.fail(ErrTruncated)
		return 0
	case n < 0 || (n > 1 && d.rest[n-1] == 0):
		d.fail(fmt.Errorf("%w: number longer than need be", ErrForm))
		return 0
	case v > most:
		d.fail(fmt.Errorf("%w: %d, at most %d", ErrRange, v, most))
		return 0
	}
	d.rest = d.rest[n:]
	return v
}

func (d *decoder) varint() int64 {
	u := d.uvarint(math.MaxUint64)
	v := int64(u >> 1)
	if u&1 != 0 {
		v = ^v
	}
	return v
}

func (d *decoder) text() string {
	n := d.uvarint(math.MaxInt32)
	if d.err == nil && n > MaxTextBytes {
		d.fail(fmt.Errorf("%w: text of %d bytes, at most %d", ErrTooLong, n, MaxTextBytes))
	}
	return string(d.take(int(n)))
}

func (d *decoder) byte() byte {
	if b := d.take(1); b != nil {
		return b[0]
	}
	return 0
}

func (d *decoder) float() float64 {
	if b := d.take(8); b != nil {
		return math.Float64frombits(binary.LittleEndian.Uint64(b))
	}
	return 0
}

func (d *decoder) take(n int) []byte {
	if d.err == nil && n > len(d.rest) {
		d.fail(ErrTruncated)
	}
	if d.err != nil {
		return nil
	}
	b := d.rest[:n]
	d.rest = d.rest[n:]
	return b
}

func (d *decoder) fail(err error) {
	if d.err == nil {
		d.err = err
	}
}
