package bus

import (
	"encoding/binary"
	"errors"
	"fmt"
	"hash/crc32"
	"math"
	"unicode/utf8"

	"thawledger/pipeline"
)

// Limits of version 1 of the encoding. Encode refuses a part beyond them, and
// Decode a message. They stay as they are while the version does: a worker of an
// older program must read what a newer one sends.
const (
	MaxTextBytes    = 255          // of a feed, a station or a sensor
	MaxSeries       = 500          // of one part
	MaxReadings     = 4000         // of one part; ingest sends pipeline.PartReadings at most
	MaxEncodedBytes = 256 << 10    // of one part
	minStartS       = -62135596800 // 0001-01-01T00:00:00Z
	maxStartS       = 253402300799 // 9999-12-31T23:59:59Z
)

const (
	version         = 1
	minSeriesBytes  = 1 + 1 + 8 + 1     // empty sensor, variable, level, short span
	minReadingBytes = 1 + 1 + 1 + 1 + 8 // short numbers, quality, value
	sumBytes        = 4
)

const _ = uint(MaxReadings - pipeline.PartReadings) // a part as ingest makes it fits

var (
	magic      = [3]byte{'T', 'L', 'P'}
	castagnoli = crc32.MakeTable(crc32.Castagnoli)
)

// Encode appends version 1 of the binary form of a part to dst and returns the
// longer slice. A part outside the limits, without readings, or with a value
// that is not finite is refused with an error that names the reading; dst is
// then returned as it was. Encode allocates nothing when dst has room.
//
// The form, byte by byte. There are no gaps and no padding.
//
//	bytes    what
//	3        "TLP"
//	1        version, 1
//	uvarint  batch, 1 to 2^63-1
//	uvarint  part number, 1 to 2^31-1
//	uvarint  attempt, 1 to 2^31-1
//	text     feed
//	text     station
//	uvarint  number of series, 1 to 500; then for each
//	  text     sensor, may be empty
//	  1        variable, as numbered in package pipeline
//	  8        level, m: float64 bits, little-endian
//	  uvarint  span, s, 0 to 2^31-1
//	uvarint  number of readings, 1 to 4000; then for each
//	  uvarint  series: place in the list above, from 0
//	  varint   start, s since 1970-01-01T00:00:00Z, less that of the reading
//	           before (of the first: less 0); the years 0001 to 9999
//	  varint   row, 1 to 2^31-1, less that of the reading before (less 0)
//	  1        quality, 0 to 7
//	  8        value, degC: float64 bits, little-endian, finite
//	4        CRC-32C (Castagnoli) of every byte before, little-endian
//
// A uvarint is a number in groups of 7 bits, the lowest first, with the top bit
// set in every byte but the last, in as few bytes as will do. A varint is a
// signed number n as the uvarint of 2n, or of -2n-1 if n is negative. A text is
// a uvarint length, 0 to 255, and so many bytes of UTF-8; feed and station have
// at least one. One part has exactly one encoding: what Decode accepts, Encode
// writes again byte for byte.
func Encode(dst []byte, p *pipeline.Part) ([]byte, error) {
	if err := check(p); err != nil {
		return dst, fmt.Errorf("encode part %d/%d/%d: %w", p.Batch, p.Number, p.Attempt, err)
	}
	from := len(dst)
	b := append(dst, magic[:]...)
	b = append(b, version)
	b = binary.AppendUvarint(b, uint64(p.Batch))
	b = binary.AppendUvarint(b, uint64(p.Number))
	b = binary.AppendUvarint(b, uint64(p.Attempt))
	b = appendText(b, p.Feed)
	b = appendText(b, p.Station)
	b = binary.AppendUvarint(b, uint64(len(p.Series)))
	for i := range p.Series {
		s := &p.Series[i]
		b = appendText(b, s.Sensor)
		b = append(b, byte(s.Variable))
		b = binary.LittleEndian.AppendUint64(b, math.Float64bits(s.LevelM))
		b = binary.AppendUvarint(b, uint64(s.SpanS))
	}
	b = binary.AppendUvarint(b, uint64(len(p.Readings)))
	var startS, row int64
	for i := range p.Readings {
		r := &p.Readings[i]
		b = binary.AppendUvarint(b, uint64(r.Series))
		b = binary.AppendVarint(b, r.StartS-startS)
		b = binary.AppendVarint(b, int64(r.Row)-row)
		b = append(b, byte(r.Quality))
		b = binary.LittleEndian.AppendUint64(b, math.Float64bits(r.ValueC))
		startS, row = r.StartS, int64(r.Row)
	}
	return binary.LittleEndian.AppendUint32(b, crc32.Checksum(b[from:], castagnoli)), nil
}

func appendText(b []byte, s string) []byte {
	return append(binary.AppendUvarint(b, uint64(len(s))), s...)
}

// check says what keeps a part from being encoded. Decode asks it too, so that
// both ends hold to the same limits.
func check(p *pipeline.Part) error {
	if p.Batch < 1 || p.Number < 1 || p.Attempt < 1 {
		return fmt.Errorf("%w: batch, part number and attempt count from 1", ErrRange)
	}
	if err := errors.Join(checkText("feed", p.Feed, 1), checkText("station", p.Station, 1)); err != nil {
		return err
	}
	if n := len(p.Series); n < 1 || n > MaxSeries {
		return fmt.Errorf("%w: %d series, not 1 to %d", ErrTooLong, n, MaxSeries)
	}
	if n := len(p.Readings); n < 1 || n > MaxReadings {
		return fmt.Errorf("%w: %d readings, not 1 to %d", ErrTooLong, n, MaxReadings)
	}
	for i := range p.Series {
		if err := checkSeries(&p.Series[i]); err != nil {
			return fmt.Errorf("series %d: %w", i, err)
		}
	}
	for i := range p.Readings {
		if err := checkReading(&p.Readings[i], len(p.Series)); err != nil {
			return fmt.Errorf("reading %d: %w", i, err)
		}
	}
	return nil
}

func checkText(what, s string, least int) error {
	if len(s) < least {
		return fmt.Errorf("%w: no %s", ErrRange, what)
	}
	if len(s) > MaxTextBytes {
		return fmt.Errorf("%w: %s of %d bytes, at most %d", ErrTooLong, what, len(s), MaxTextBytes)
	}
	if !utf8.ValidString(s) {
		return fmt.Errorf("%w: %s is not UTF-8", ErrForm, what)
	}
	return nil
}

func checkSeries(s *pipeline.Series) error {
	if !finite(s.LevelM) {
		return fmt.Errorf("%w: level", ErrNotFinite)
	}
	if s.SpanS < 0 {
		return fmt.Errorf("%w: span %d s, not 0 or more", ErrRange, s.SpanS)
	}
	if _, ok := pipeline.Variables[s.Variable]; !ok {
		return fmt.Errorf("%w: %v is not known", ErrRange, s.Variable)
	}
	return checkText("sensor", s.Sensor, 0)
}

func checkReading(r *pipeline.Reading, series int) error {
	switch {
	case int(r.Series) >= series:
		return fmt.Errorf("%w: %d of %d", ErrSeries, r.Series, series)
	case !finite(r.ValueC):
		return fmt.Errorf("%w: value", ErrNotFinite)
	case r.StartS < minStartS || r.StartS > maxStartS:
		return fmt.Errorf("%w: start %d s, not in the years 0001 to 9999", ErrRange, r.StartS)
	case r.Row < 1:
		return fmt.Errorf("%w: row %d, not 1 or more", ErrRange, r.Row)
	case r.Quality > pipeline.QualityMissing:
		return fmt.Errorf("%w: quality mark %d, not 0 to 7", ErrRange, r.Quality)
	}
	return nil
}

func finite(v float64) bool { return v-v == 0 }
