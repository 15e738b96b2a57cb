package unpack_test

import (
	"bytes"
	"errors"
	"io"
	"strings"
	"testing"
	"testing/iotest"
	"unicode/utf8"

	"golang.org/x/text/encoding"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"

	"thawledger/ingest/unpack"
)

// references are what golang.org/x/text has for the encodings.
var references = map[string]encoding.Encoding{
	"utf-16":       unicode.UTF16(unicode.LittleEndian, unicode.UseBOM),
	"utf-16le":     unicode.UTF16(unicode.LittleEndian, unicode.UseBOM), // the other mark is refused before
	"utf-16be":     unicode.UTF16(unicode.BigEndian, unicode.UseBOM),
	"latin-1":      charmap.ISO8859_1,
	"windows-1252": charmap.Windows1252,
}

func compressed(delivery []byte) bool {
	for _, magic := range []string{"\x1f\x8b", "\x28\xb5\x2f\xfd"} {
		if strings.HasPrefix(string(delivery), magic) {
			return true
		}
	}
	return len(delivery) >= 4 && delivery[0]&0xf0 == 0x50 && string(delivery[1:4]) == "\x2a\x4d\x18"
}

// FuzzReader: any bytes give bounded text or a fault; the text is valid unless it
// is passed through, and what golang.org/x/text makes of it; and it does not
// matter in what pieces the bytes come.
func FuzzReader(f *testing.F) {
	text := hourlyText(20)
	for i, name := range []string{"fell.csv", "fell.utf-16.csv", "fell.utf-16le.csv", "fell.utf-16be.csv", "fell.latin-1.csv", "fell.windows-1252.csv"} {
		f.Add(file(f, name), uint8(i))
		f.Add(gzipped(f, file(f, name)), uint8(i))
	}
	for _, name := range []string{"two_members.csv.gz", "fell.csv.zst", "two_frames.csv.zst", "skippable_first.csv.zst", "dictionary.csv.zst"} {
		f.Add(file(f, name), uint8(0))
	}
	f.Add(zstded(f, bytes.Repeat(text, 100)), uint8(4))
	f.Add(gzipped(f, make([]byte, 100_000)), uint8(1))
	limits := unpack.Limits{Bytes: 1 << 16, Ratio: 20}
	f.Fuzz(func(t *testing.T, delivery []byte, which uint8) {
		declared := unpack.Encodings[int(which)%len(unpack.Encodings)]
		got, err := unpacked(bytes.NewReader(delivery), declared, limits)
		if _, fault := errors.AsType[*unpack.FaultError](err); err != nil && !fault {
			t.Fatal(err)
		}
		most := len(delivery)
		if compressed(delivery) {
			most = int(limits.Bytes)
		}
		if declared != "utf-8" {
			most *= 3
			if !utf8.ValidString(got) {
				t.Fatalf("%q is not UTF-8", got)
			}
		}
		if len(got) > most {
			t.Fatalf("%d bytes of text came, at most %d are right", len(got), most)
		}
		again, againErr := unpacked(iotest.OneByteReader(bytes.NewReader(delivery)), declared, limits)
		if again != got || (err == nil) != (againErr == nil) {
			t.Fatalf("byte by byte: got %q, %v, want %q, %v", again, againErr, got, err)
		}
		if compressed(delivery) || err != nil {
			return
		}
		want := string(delivery)
		if by := references[declared]; by != nil {
			b, err := io.ReadAll(by.NewDecoder().Reader(bytes.NewReader(delivery)))
			if err != nil {
				t.Fatal(err)
			}
			want = string(b)
		}
		if got != want {
			t.Fatalf("got %q, want %q", got, want)
		}
	})
}
