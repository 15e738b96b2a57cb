package unpack_test

import (
	"bytes"
	"compress/gzip"
	"fmt"

	"strings"
	"testing"

	"github.com/klauspost/compress/zstd"

	"thawledger/ingest/unpack"
)

func gzipped(t testing.TB, text []byte) []byte {
	t.Helper()
	var b bytes.Buffer
	z := gzip.NewWriter(&b)
	if _, err := z.Write(text); err != nil {
		t.Fatal(err)
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func zstded(t testing.TB, text []byte) []byte {
	t.Helper()
	z, err := zstd.NewWriter(nil, zstd.WithEncoderConcurrency(1))
	if err != nil {
		t.Fatal(err)
	}
	defer z.Close()
	return z.EncodeAll(text, nil)
}

// hourlyText is n rows that no two are alike.
func hourlyText(n int) []byte {
	var b bytes.Buffer
	for i := range n {
		fmt.Fprintf(&b, "FELL,%d,%.2f\n", 1_900_000_000+3600*i, float64(i*7919%5000)/100-25)
	}
	return b.Bytes()
}

// Every way to cut a delivery short is a fault that says how far it got, but
// between two members or frames, where nothing shows it.
func TestCutShort(t *testing.T) {
	a, b := []byte("time,temp\n"), hourlyText(3)
	tests := []struct {
		name        string
		first, rest []byte
	}{
		{"gzip", gzipped(t, a), gzipped(t, b)},
		{"zstd", zstded(t, a), zstded(t, b)},
		{"zstd of the reference program", file(t, "fell.csv.zst"), file(t, "two_frames.csv.zst")},
		{"gzip of the reference program", file(t, "fell.csv.gz"), file(t, "fell.csv.gz")},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for cut := 4; cut < len(tt.first); cut++ {
				got, err := unpacked(bytes.NewReader(tt.first[:cut]), "", unpack.Limits{})
				checkFault(t, err, int64(cut), "ends before it is complete", fmt.Sprintf("after %d bytes of text", len(got)), "send it again whole")
			}
			whole, err := unpacked(bytes.NewReader(tt.first), "", unpack.Limits{})
			if err != nil {
				t.Fatal(err)
			}
			for cut := 2; cut < 12; cut++ {
				got, err := unpacked(bytes.NewReader(append(bytes.Clone(tt.first), tt.rest[:cut]...)), "", unpack.Limits{})
				checkFault(t, err, int64(len(tt.first)+cut), "ends before it is complete")
				if !strings.HasPrefix(got, whole) {
					t.Errorf("cut %d bytes into the second: got %q", cut, got)
				}
			}
		})
	}
}

// A changed byte gives a fault, or nothing that changes the text (as in gzip's
// file name and time); check sums see to that.
func TestDamage(t *testing.T) {
	text := hourlyText(50)
	for name, whole := range map[string][]byte{"gzip": gzipped(t, text), "zstd": zstded(t, text)} {
		faults := 0
		for i := 4; i < len(whole); i++ {
			bad := bytes.Clone(whole)
			bad[i] ^= 0x10
			got, err := unpacked(bytes.NewReader(bad), "", unpack.Limits{})
			if err == nil && got != string(text) {
				t.Fatalf("%s: byte %d changed, and other text came without a word", name, i)
			}
			if err != nil {
				faults++
				if !strings.Contains(err.Error(), "of the delivery: the "+name+" data") {
					t.Fatalf("%s: byte %d: %v", name, i, err)
				}
			}
		}
		if faults < len(whole)-20 {
			t.Errorf("%s: %d faults of %d bytes changed", name, faults, len(whole)-4)
		}
	}
}

func TestCompressionFaults(t *testing.T) {
	text := []byte("time,temp\n")
	gz, zst := gzipped(t, text), zstded(t, text)
	end := func(b []byte) int64 { return int64(len(b)) }
	sum := bytes.Clone(gz)
	sum[len(sum)-8] ^= 1
	join := func(parts ...[]byte) []byte { return bytes.Join(parts, nil) }
	tests := []struct {
		name     string
		delivery []byte
		offset   int64
		part     string
	}{
		{"plain after gzip", join(gz, []byte("FELL,1\n")), end(gz), "what follows it is no gzip"},
		{"one byte after gzip", join(gz, []byte("\n")), end(gz), "what follows it is no gzip"},
		{"zeros after gzip", join(gz, make([]byte, 512)), end(gz), "what follows it is no gzip"},
		{"zstd after gzip", join(gz, zst), end(gz), "send nothing after it"},
		{"plain after zstd", join(zst, []byte("FELL,1\n")), end(zst), "what follows it is no zstd"},
		{"one byte after zstd", join(zst, []byte("\n")), end(zst) + 1, "cut short or added to"},
		{"check sum of gzip", sum, end(gz), "the check sum is another"},
		{"no gzip after all", []byte("\x1f\x8b\x01time,temp\n"), 10, "no gzip header of RFC 1952"},
		{"no deflate", append(bytes.Clone(gz[:10]), 0xff, 0xff, 0xff), 11, "no deflate data"},
		{"zstd dictionary", file(t, "dictionary.csv.zst"), 10, "compress without one"},
		{"zstd window of 128 MiB", file(t, "window.csv.zst"), 6, "compress without --long"},
		{"zstd, one segment of 2 GiB", []byte("\x28\xb5\x2f\xfd\xa0\x00\x00\x00\x80\x01\x00\x00"), 9, "more than 33554432 bytes"},
		{"zstd, reserved block", []byte("\x28\xb5\x2f\xfd\x00\x58\x06\x00\x00"), 9, "damaged at or before here (invalid input: reserved block type"},
		{"only a skippable frame, and text", []byte("\x50\x2a\x4d\x18\x00\x00\x00\x00time,temp"), 8, "no zstd"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			_, err := unpacked(bytes.NewReader(tt.delivery), "", unpack.Limits{})
			checkFault(t, err, tt.offset, tt.part, "of the delivery")
		})
	}
}

// Compression is undone once.
func TestWithinOneAnother(t *testing.T) {
	inner := gzipped(t, []byte("time,temp\n"))
	for name, outer := range map[string][]byte{"gzip": gzipped(t, inner), "zstd": zstded(t, inner)} {
		if got, err := unpacked(bytes.NewReader(outer), "", unpack.Limits{}); err != nil || got != string(inner) {
			t.Errorf("%s: got %q, %v", name, got, err)
		}
	}
	if got, err := unpacked(bytes.NewReader(gzipped(t, nil)), "", unpack.Limits{}); err != nil || got != "" {
		t.Errorf("of nothing: got %q, %v", got, err)
	}
}

// A compressed delivery's faults of encoding are placed in its text.
func TestEncodingWithinCompression(t *testing.T) {
	utf16 := file(t, "fell.utf-16.csv")
	if got, err := unpacked(bytes.NewReader(gzipped(t, utf16)), "utf-16", unpack.Limits{}); err != nil || got != string(file(t, "fell.csv")) {
		t.Errorf("got %q, %v", got, err)
	}
	_, err := unpacked(bytes.NewReader(zstded(t, utf16)), "", unpack.Limits{})
	checkFault(t, err, 0, "the text is UTF-16, declare encoding: utf-16")
	_, err = unpacked(bytes.NewReader(gzipped(t, append(hourlyText(1000), 0x81))), "windows-1252", unpack.Limits{})
	checkFault(t, err, int64(len(hourlyText(1000))), "of the text: 0x81")
}

func TestBytesLimit(t *testing.T) {
	text := hourlyText(10_000)
	for name, delivery := range map[string][]byte{"gzip": gzipped(t, text), "zstd": zstded(t, text)} {
		size := int64(len(text))
		if got, err := unpacked(bytes.NewReader(delivery), "", unpack.Limits{Bytes: size}); err != nil || got != string(text) {
			t.Errorf("%s: as much as is allowed: %d bytes, %v", name, len(got), err)
		}
		for _, most := range []int64{1, 3, 5, 1000, size - 1} {
			got, err := unpacked(bytes.NewReader(delivery), "", unpack.Limits{Bytes: most})
			if got != string(text[:len(got)]) || int64(len(got)) > most {
				t.Errorf("%s: %d bytes came, at most %d are right", name, len(got), most)
			}
			if err == nil || !strings.Contains(err.Error(), fmt.Sprintf("more than %d bytes, the most", most)) {
				t.Errorf("%s: at most %d: got %v", name, most, err)
			}
		}
	}
}

// Ratio counts once more than 1 MiB has come, and to the byte.
func TestRatioLimit(t *testing.T) {
	const mib = 1 << 20
	zeros := gzipped(t, make([]byte, mib))
	if got, err := unpacked(bytes.NewReader(zeros), "", unpack.Limits{Ratio: 2}); err != nil || len(got) != mib {
		t.Errorf("1 MiB of zeros: %d bytes, %v", len(got), err)
	}
	_, err := unpacked(bytes.NewReader(append(bytes.Clone(zeros), gzipped(t, []byte{0})...)), "", unpack.Limits{Ratio: 2})
	if err == nil || !strings.Contains(err.Error(), "more than 2 times as many") {
		t.Errorf("1 MiB and a byte: %v", err)
	}
	text := hourlyText(100_000)
	for name, delivery := range map[string][]byte{"gzip": gzipped(t, text), "zstd": zstded(t, text)} {
		ratio := int64(len(text)/len(delivery)) + 2 // the beginning may be a little denser than the whole
		if _, err := unpacked(bytes.NewReader(delivery), "", unpack.Limits{Ratio: ratio}); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if _, err := unpacked(bytes.NewReader(delivery), "", unpack.Limits{Ratio: ratio - 3}); err == nil {
			t.Errorf("%s: came to its end at a ratio of %d", name, ratio-3)
		}
		if _, err := unpacked(bytes.NewReader(delivery), "", unpack.Limits{Ratio: 1<<63 - 1, Bytes: 1<<63 - 1}); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
}
