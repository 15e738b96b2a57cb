package bus

import (
	"bytes"
	"encoding/binary"
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// anyPart draws a part within the limits.
func anyPart(t *rapid.T) *pipeline.Part {
	text := func(least int) *rapid.Generator[string] { return rapid.StringN(least, 80, MaxTextBytes) }
	series := rapid.SliceOfN(rapid.Custom(func(t *rapid.T) pipeline.Series {
		return pipeline.Series{
			Sensor:   text(0).Draw(t, "sensor"),
			Variable: pipeline.Variable(rapid.Uint8Range(1, uint8(len(pipeline.Variables))).Draw(t, "variable")),
			LevelM:   rapid.Float64().Draw(t, "level"),
			SpanS:    rapid.Int32Min(0).Draw(t, "span"),
		}
	}), 1, 8).Draw(t, "series")
	return &pipeline.Part{
		Batch:   rapid.Int64Min(1).Draw(t, "batch"),
		Number:  rapid.Int32Min(1).Draw(t, "number"),
		Attempt: rapid.Int32Min(1).Draw(t, "attempt"),
		Feed:    text(1).Draw(t, "feed"),
		Station: text(1).Draw(t, "station"),
		Series:  series,
		Readings: rapid.SliceOfN(rapid.Custom(func(t *rapid.T) pipeline.Reading {
			return pipeline.Reading{
				Series:  rapid.Uint16Range(0, uint16(len(series)-1)).Draw(t, "place"),
				Quality: pipeline.Quality(rapid.Uint8Range(0, 7).Draw(t, "quality")),
				Row:     rapid.Int32Min(1).Draw(t, "row"),
				StartS:  rapid.Int64Range(minStartS, maxStartS).Draw(t, "start"),
				ValueC:  rapid.Float64().Draw(t, "value"),
			}
		}), 1, 600).Draw(t, "readings"),
	}
}

func TestRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		want := anyPart(t)
		before := rapid.SliceOf(rapid.Byte()).Draw(t, "before")
		b, err := Encode(bytes.Clone(before), want)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.HasPrefix(b, before) || len(b)-len(before) > MaxEncodedBytes {
			t.Fatalf("%d bytes, the buffer's own kept: %v", len(b), bytes.HasPrefix(b, before))
		}
		got, err := Decode(b[len(before):])
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(want, got); diff != "" {
			t.Fatal(diff)
		}
	})
}

// Whatever single bit flips and wherever the end is cut, nothing is read.
func TestSpoiledIsRefused(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b, err := Encode(nil, anyPart(t))
		if err != nil {
			t.Fatal(err)
		}
		flipped := bytes.Clone(b)
		i := rapid.IntRange(0, len(b)-1).Draw(t, "byte")
		flipped[i] ^= 1 << rapid.IntRange(0, 7).Draw(t, "bit")
		if _, err := Decode(flipped); !named(err) {
			t.Fatalf("bit flipped in byte %d: %v", i, err)
		}
		cut := rapid.IntRange(0, len(b)-1).Draw(t, "cut")
		if _, err := Decode(b[:cut]); !errors.Is(err, ErrTruncated) && !errors.Is(err, ErrChecksum) {
			t.Fatalf("cut to %d of %d: %v", cut, len(b), err)
		}
	})
}

func named(err error) bool {
	return isAny(err, []error{
		ErrNotPart, ErrVersion, ErrChecksum, ErrTruncated, ErrTrailing,
		ErrTooLong, ErrNotFinite, ErrSeries, ErrRange, ErrForm,
	})
}

// golden is a part and its encoding, set down byte by byte from the description
// at Encode.
func golden() (*pipeline.Part, []byte) {
	p := &pipeline.Part{
		Batch: 300, Number: 2, Attempt: 1, Feed: "f", Station: "né",
		Series: []pipeline.Series{
			{Sensor: "a", Variable: pipeline.AirTempMean, LevelM: 2, SpanS: 3600},
			{Sensor: "", Variable: pipeline.AirTemp, LevelM: -0.5, SpanS: 0},
		},
		Readings: []pipeline.Reading{
			{Series: 0, Row: 1, StartS: 100, Quality: 0, ValueC: 1.5},
			{Series: 1, Row: 66, StartS: 36, Quality: 4, ValueC: -2},
		},
	}
	b := []byte{
		'T', 'L', 'P', 1,
		0xAC, 0x02, // 300 = 0b10_0101100
		2,
		1,
		1, 'f',
		3, 'n', 0xC3, 0xA9,
		2,
		1, 'a', 2, 0, 0, 0, 0, 0, 0, 0, 0x40, 0x90, 0x1C, // 2.0; 3600 = 0b11100_0010000
		0, 1, 0, 0, 0, 0, 0, 0, 0xE0, 0xBF, 0, // -0.5
		2,
		0, 0xC8, 0x01, 2, 0, 0, 0, 0, 0, 0, 0, 0xF8, 0x3F, // +100 is 200; +1 is 2; 1.5
		1, 0x7F, 0x82, 0x01, 4, 0, 0, 0, 0, 0, 0, 0, 0xC0, // -64 is 127; +65 is 130; -2.0
	}
	return p, binary.LittleEndian.AppendUint32(b, slowSum(b))
}

// slowSum is the CRC-32C by its definition: polynomial 0x1EDC6F41 bit-reversed,
// start and final inversion (RFC 3720, section 12.1).
func slowSum(b []byte) uint32 {
	sum := ^uint32(0)
	for _, c := range b {
		sum ^= uint32(c)
		for range 8 {
			if sum&1 != 0 {
				sum = sum>>1 ^ 0x82F63B78
			} else {
				sum >>= 1
			}
		}
	}
	return ^sum
}

func TestGolden(t *testing.T) {
	// 32 bytes of zero give aa 36 91 8a, lowest byte first (RFC 3720, appendix B.4).
	if got := slowSum(make([]byte, 32)); got != 0x8A9136AA {
		t.Fatalf("check value of the checksum is %08x", got)
	}
	p, want := golden()
	got, err := Encode(nil, p)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(got, want) {
		t.Errorf("encoded\n% x, want\n% x", got, want)
	}
	back, err := Decode(want)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(p, back); diff != "" {
		t.Error(diff)
	}
}

func TestEncodeRefuses(t *testing.T) {
	for _, c := range []struct {
		name  string
		spoil func(p *pipeline.Part)
		err   error
	}{
		{"no batch", func(p *pipeline.Part) { p.Batch = 0 }, ErrRange},
		{"negative batch", func(p *pipeline.Part) { p.Batch = -1 }, ErrRange},
		{"no number", func(p *pipeline.Part) { p.Number = 0 }, ErrRange},
		{"no attempt", func(p *pipeline.Part) { p.Attempt = 0 }, ErrRange},
		{"no feed", func(p *pipeline.Part) { p.Feed = "" }, ErrRange},
		{"no station", func(p *pipeline.Part) { p.Station = "" }, ErrRange},
		{"long station", func(p *pipeline.Part) { p.Station = strings.Repeat("x", 256) }, ErrTooLong},
		{"feed not UTF-8", func(p *pipeline.Part) { p.Feed = "\xff" }, ErrForm},
		{"no series", func(p *pipeline.Part) { p.Series = nil }, ErrTooLong},
		{"many series", func(p *pipeline.Part) { p.Series = make([]pipeline.Series, MaxSeries+1) }, ErrTooLong},
		{"no readings", func(p *pipeline.Part) { p.Readings = nil }, ErrTooLong},
		{"many readings", func(p *pipeline.Part) { p.Readings = make([]pipeline.Reading, MaxReadings+1) }, ErrTooLong},
		{"long sensor", func(p *pipeline.Part) { p.Series[0].Sensor = strings.Repeat("x", 256) }, ErrTooLong},
		{"unknown variable", func(p *pipeline.Part) { p.Series[0].Variable = 200 }, ErrRange},
		{"negative span", func(p *pipeline.Part) { p.Series[0].SpanS = -1 }, ErrRange},
		{"level not a number", func(p *pipeline.Part) { p.Series[0].LevelM = math.NaN() }, ErrNotFinite},
		{"value not a number", func(p *pipeline.Part) { p.Readings[1].ValueC = math.NaN() }, ErrNotFinite},
		{"value infinite", func(p *pipeline.Part) { p.Readings[1].ValueC = math.Inf(-1) }, ErrNotFinite},
		{"series not listed", func(p *pipeline.Part) { p.Readings[1].Series = 2 }, ErrSeries},
		{"no row", func(p *pipeline.Part) { p.Readings[1].Row = 0 }, ErrRange},
		{"before year 1", func(p *pipeline.Part) { p.Readings[1].StartS = minStartS - 1 }, ErrRange},
		{"after year 9999", func(p *pipeline.Part) { p.Readings[1].StartS = maxStartS + 1 }, ErrRange},
		{"unknown quality", func(p *pipeline.Part) { p.Readings[1].Quality = 8 }, ErrRange},
	} {
		t.Run(c.name, func(t *testing.T) {
			p, _ := golden()
			c.spoil(p)
			b, err := Encode([]byte("kept"), p)
			if !errors.Is(err, c.err) || string(b) != "kept" {
				t.Errorf("%v, buffer %q", err, b)
			}
		})
	}
}

// The largest part there can be fits into the bytes allowed, and comes back.
func TestLargestPart(t *testing.T) {
	p := &pipeline.Part{
		Batch: math.MaxInt64, Number: math.MaxInt32, Attempt: math.MaxInt32,
		Feed: strings.Repeat("f", MaxTextBytes), Station: strings.Repeat("s", MaxTextBytes),
	}
	for range MaxSeries {
		p.Series = append(p.Series, pipeline.Series{Sensor: strings.Repeat("x", MaxTextBytes), Variable: 1, SpanS: math.MaxInt32})
	}
	for i := range MaxReadings {
		r := pipeline.Reading{Series: MaxSeries - 1, Row: 1, StartS: minStartS, ValueC: math.MaxFloat64}
		if i%2 == 0 {
			r.Row, r.StartS = math.MaxInt32, maxStartS
		}
		p.Readings = append(p.Readings, r)
	}
	b, err := Encode(nil, p)
	if err != nil || len(b) > MaxEncodedBytes {
		t.Fatalf("%d bytes: %v", len(b), err)
	}
	back, err := Decode(b)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(p, back); diff != "" {
		t.Error(diff)
	}
}

func TestEncodeIntoRoomAllocatesNothing(t *testing.T) {
	p, buf := part(1, 1, pipeline.PartReadings), make([]byte, 0, MaxEncodedBytes)
	if n := testing.AllocsPerRun(10, func() { _, _ = Encode(buf, p) }); n != 0 {
		t.Errorf("%v allocations", n)
	}
}

func BenchmarkEncode(b *testing.B) {
	p, buf := part(1, 1, pipeline.PartReadings), []byte(nil)
	b.ReportAllocs()
	for b.Loop() {
		buf, _ = Encode(buf[:0], p)
	}
	b.ReportMetric(float64(b.N)*pipeline.PartReadings/b.Elapsed().Seconds(), "readings/s")
	b.ReportMetric(float64(len(buf))/pipeline.PartReadings, "B/reading")
}
