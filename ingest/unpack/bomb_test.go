package unpack_test

import (
	"bytes"
	"errors"
	"io"
	"runtime"
	"strings"
	"testing"

	"thawledger/ingest/unpack"
)

// endless gives head and then piece again and again, until most bytes were given.
type endless struct {
	head, piece, rest []byte
	given, most       int64
}

func (e *endless) Read(p []byte) (int, error) {
	if e.given >= e.most {
		return 0, io.EOF
	}
	if e.given == 0 {
		e.rest = e.head
	}
	if len(e.rest) == 0 {
		e.rest = e.piece
	}
	n := copy(p, e.rest)
	e.rest = e.rest[n:]
	e.given += int64(n)
	return n, nil
}

// gzipBomb is 10 GiB of zeros in 10,240 members.
func gzipBomb(t testing.TB) *endless {
	member := gzipped(t, make([]byte, 1<<20))
	return &endless{piece: member, most: 10 << 10 * int64(len(member))}
}

// zstdBomb is a frame with a window of 32 MiB and 81,920 blocks of one zero
// repeated 131,072 times: 10 GiB (RFC 8878, 3.1.1.1.2 and 3.1.1.2).
func zstdBomb(testing.TB) *endless {
	return &endless{head: []byte("\x28\xb5\x2f\xfd\x00\x78"), piece: []byte{0x02, 0x00, 0x10, 0x00}, most: 81_920 * 4}
}

// drained reads to the end and keeps nothing.
func drained(r io.Reader) (n int64, err error) {
	buf := make([]byte, 64<<10)
	for {
		k, err := r.Read(buf)
		n += int64(k)
		if err != nil {
			return n, err
		}
	}
}

func TestBombs(t *testing.T) {
	const mib = 1 << 20
	tests := []struct {
		name    string
		bomb    func(testing.TB) *endless
		limits  unpack.Limits
		text    int64 // most that may come
		taken   int64 // most that may be read of the delivery
		memory  uint64
		because string
	}{
		{"gzip, by ratio", gzipBomb, unpack.Limits{}, 2 * mib, 128 << 10, mib, "more than 200 times as many"},
		{"gzip, by bytes", gzipBomb, unpack.Limits{Bytes: 100 * mib, Ratio: 1 << 40}, 100 * mib, 256 << 10, mib, "more than 104857600 bytes"},
		{"zstd, by ratio", zstdBomb, unpack.Limits{}, 2 * mib, 128 << 10, 80 * mib, "more than 200 times as many"},
		{"zstd, by bytes", zstdBomb, unpack.Limits{Bytes: 300 * mib, Ratio: 1 << 40}, 300 * mib, 128 << 10, 80 * mib, "more than 314572800 bytes"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			bomb := tt.bomb(t)
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			r, err := unpack.Reader(bomb, "", tt.limits)
			if err != nil {
				t.Fatal(err)
			}
			defer r.Close()
			n, err := drained(r)
			runtime.ReadMemStats(&after)
			if f, ok := errors.AsType[*unpack.FaultError](err); !ok || !strings.Contains(f.Text, tt.because) {
				t.Errorf("got %v, want a fault with %q", err, tt.because)
			} else if f.Offset <= 0 || f.Offset > bomb.given || n < 200*f.Offset {
				t.Errorf("%d bytes of text are said to come of the first %d", n, f.Offset)
			}
			if n > tt.text || n < mib {
				t.Errorf("%d bytes of text came", n)
			}
			if bomb.given > tt.taken {
				t.Errorf("%d bytes of the delivery were read", bomb.given)
			}
			// All that was allocated, freed or not.
			if used := after.TotalAlloc - before.TotalAlloc; used > tt.memory {
				t.Errorf("%d bytes were allocated", used)
			}
			if k, again := r.Read(make([]byte, 10)); k != 0 || again != err {
				t.Errorf("read on: %d bytes, %v", k, again)
			}
		})
	}
}

// What expands to nothing ends with the delivery, in bounded memory.
func TestManyEmptyMembers(t *testing.T) {
	skippable := []byte("\x50\x2a\x4d\x18\x02\x00\x00\x00ab")
	for name, piece := range map[string][]byte{"gzip members": gzipped(t, nil), "zstd frames": zstded(t, []byte{}), "skippable frames": skippable} {
		if len(piece) == 0 {
			piece = []byte("\x28\xb5\x2f\xfd\x00\x00\x01\x00\x00") // one empty block
		}
		delivery := &endless{piece: piece, most: 100_000 * int64(len(piece))}
		before := kept()
		r, err := unpack.Reader(delivery, "", unpack.Limits{})
		if err != nil {
			t.Fatal(err)
		}
		if n, err := drained(r); n != 0 || err != io.EOF || delivery.given != delivery.most {
			t.Errorf("%s: %d bytes of text, %v, %d bytes read", name, n, err, delivery.given)
		}
		if after := kept(); after > before+1<<20 {
			t.Errorf("%s: %d bytes are kept", name, after-before)
		}
		r.Close()
	}
}

// kept is how much memory is in use after all that is not needed is freed.
func kept() uint64 {
	var m runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&m)
	return m.HeapAlloc
}

// A frame's claim of its size allocates nothing before the bytes come.
func TestClaimedSize(t *testing.T) {
	claim := []byte("\x28\xb5\x2f\xfd\xc0\x78\xff\xff\xff\xff\xff\xff\xff\x7f\x02\x00\x10\x00") // one block of 2^63-1 bytes claimed
	var before, after runtime.MemStats
	runtime.ReadMemStats(&before)
	_, err := unpacked(bytes.NewReader(claim), "", unpack.Limits{})
	runtime.ReadMemStats(&after)
	checkFault(t, err, int64(len(claim)), "ends before it is complete")
	if used := after.TotalAlloc - before.TotalAlloc; used > 80<<20 {
		t.Errorf("%d bytes were allocated", used)
	}
}
