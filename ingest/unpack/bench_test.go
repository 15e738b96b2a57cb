package unpack_test

import (
	"bufio"
	"bytes"
	"io"
	"testing"

	"thawledger/ingest/unpack"
)

// onlyReader hides how a bytes.Reader writes itself, so that bytes are copied.
type onlyReader struct{ io.Reader }

// onlyWriter hides how io.Discard reads.
type onlyWriter struct{ io.Writer }

// BenchmarkReader measures bytes of the text as sent, before it is UTF-8.
func BenchmarkReader(b *testing.B) {
	text := hourlyText(200_000)
	wide := make([]byte, 0, 2*len(text))
	for _, c := range text {
		wide = append(wide, c, 0)
	}
	tests := []struct {
		name, encoding string
		delivery       []byte
		size           int
	}{
		{"plain", "utf-8", text, len(text)},
		{"gzip", "utf-8", gzipped(b, text), len(text)},
		{"zstd", "utf-8", zstded(b, text), len(text)},
		{"utf-16", "utf-16", wide, len(wide)},
		{"windows-1252", "windows-1252", text, len(text)},
	}
	b.Run("bare copy", func(b *testing.B) {
		b.SetBytes(int64(len(text)))
		b.ReportAllocs()
		for b.Loop() {
			if _, err := io.Copy(onlyWriter{io.Discard}, bufio.NewReaderSize(onlyReader{bytes.NewReader(text)}, 64<<10)); err != nil {
				b.Fatal(err)
			}
		}
	})
	for _, tt := range tests {
		b.Run(tt.name, func(b *testing.B) {
			b.SetBytes(int64(tt.size))
			b.ReportAllocs()
			for b.Loop() {
				r, err := unpack.Reader(onlyReader{bytes.NewReader(tt.delivery)}, tt.encoding, unpack.Limits{})
				if err != nil {
					b.Fatal(err)
				}
				if _, err := io.Copy(onlyWriter{io.Discard}, r); err != nil {
					b.Fatal(err)
				}
				r.Close()
			}
		})
	}
}
