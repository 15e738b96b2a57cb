package unpack_test

import (
	"bytes"
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"go.uber.org/goleak"

	"thawledger/ingest/unpack"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// unpacked returns all text of a delivery, and what reading it ended with.
func unpacked(delivery io.Reader, encoding string, limits unpack.Limits) (string, error) {
	r, err := unpack.Reader(delivery, encoding, limits)
	if err != nil {
		return "", err
	}
	got, err := io.ReadAll(r)
	return string(got), errors.Join(err, r.Close())
}

// checkFault checks that err is a fault at offset whose text has all of parts.
func checkFault(t *testing.T, err error, offset int64, parts ...string) {
	t.Helper()
	f, ok := errors.AsType[*unpack.FaultError](err)
	if !ok {
		t.Fatalf("got %v, want a fault", err)
	}
	if f.Offset != offset {
		t.Errorf("offset %d, want %d: %s", f.Offset, offset, f.Text)
	}
	for _, part := range parts {
		if !strings.Contains(f.Error(), part) {
			t.Errorf("got %q, want %q in it", f.Error(), part)
		}
	}
}

func file(t testing.TB, name string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// The files were made of fell.csv by GNU gzip 1.12, zstd 1.5.4, pzstd of the same
// (which puts a skippable frame first) and iconv of glibc 2.36.
func TestFilesOfOtherPrograms(t *testing.T) {
	tests := []struct {
		name, file, encoding string
	}{
		{"plain", "fell.csv", "utf-8"},
		{"encoding not said", "fell.csv", ""},
		{"gzip", "fell.csv.gz", ""},
		{"gzip, one member after another", "two_members.csv.gz", ""},
		{"zstd", "fell.csv.zst", ""},
		{"zstd, one frame after another", "two_frames.csv.zst", ""},
		{"zstd, a skippable frame first", "skippable_first.csv.zst", ""},
		{"zstd, window of 32 MiB", "window20.csv.zst", ""},
		{"utf-16 by its mark", "fell.utf-16.csv", "utf-16"},
		{"utf-16 without a mark is little endian", "fell.utf-16le.csv", "utf-16"},
		{"utf-16le with its mark", "fell.utf-16.csv", "utf-16le"},
		{"utf-16le", "fell.utf-16le.csv", "utf-16le"},
		{"utf-16be", "fell.utf-16be.csv", "utf-16be"},
		{"latin-1", "fell.latin-1.csv", "latin-1"},
		{"windows-1252", "fell.windows-1252.csv", "windows-1252"},
	}
	want := string(file(t, "fell.csv"))
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for how, r := range map[string]io.Reader{
				"at once": bytes.NewReader(file(t, tt.file)), "byte by byte": iotest.OneByteReader(bytes.NewReader(file(t, tt.file))),
				"end with the last bytes": iotest.DataErrReader(bytes.NewReader(file(t, tt.file))),
			} {
				got, err := unpacked(r, tt.encoding, unpack.Limits{})
				if err != nil {
					t.Fatalf("%s: %v", how, err)
				}
				if diff := cmp.Diff(want, got); diff != "" {
					t.Errorf("%s: %s", how, diff)
				}
			}
		})
	}
}

func TestPlainTextIsLetBe(t *testing.T) {
	tests := []struct {
		name, text string
	}{
		{"nothing", ""},
		{"one byte", "a"},
		{"as many as are looked at", "FELL"},
		{"byte order mark", "\ufefftime,temp\n"},
		{"not UTF-8", "time,temp\n\xff,\x00\n"},
		{"begins as gzip does", "\x1f"},
		{"PK without more", "PK,temp\n"},
		{"begins as a skippable frame does", "P*M"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got, err := unpacked(strings.NewReader(tt.text), "", unpack.Limits{Bytes: 1, Ratio: 1}); err != nil || got != tt.text {
				t.Errorf("got %q, %v", got, err)
			}
			r, err := unpack.Reader(strings.NewReader(tt.text), "", unpack.Limits{})
			if err != nil {
				t.Fatal(err)
			}
			var got strings.Builder
			if n, err := io.Copy(&got, r); err != nil || got.String() != tt.text || n != int64(len(tt.text)) {
				t.Errorf("copied %q, %d bytes, %v", got.String(), n, err)
			}
		})
	}
}

// passer is a reader that knows how to write itself.
type passer struct {
	io.Reader
	passed bool
}

func (p *passer) WriteTo(w io.Writer) (int64, error) {
	p.passed = true
	return io.Copy(w, p.Reader)
}

// TestPlainTextIsNotCopied: io.Copy reaches the delivery itself, and Read hands on
// the caller's buffer.
func TestPlainTextIsNotCopied(t *testing.T) {
	p := &passer{Reader: strings.NewReader("time,temp\n")}
	r, err := unpack.Reader(p, "", unpack.Limits{})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := io.Copy(io.Discard, r); err != nil || !p.passed {
		t.Errorf("the delivery's own WriteTo was called: %v, %v", p.passed, err)
	}
	text := bytes.Repeat([]byte("FELL,2031-07-20 13:00,5\n"), 1000)
	buf := make([]byte, len(text))
	n := testing.AllocsPerRun(10, func() {
		r, _ := unpack.Reader(bytes.NewReader(text), "", unpack.Limits{})
		io.ReadFull(r, buf)
	})
	if n > 5 {
		t.Errorf("%v allocations", n)
	}
}

func TestRefused(t *testing.T) {
	const zip = "a zip archive; send gzip or zstd, or unpack it"
	tests := []struct {
		name, delivery, encoding string
		parts                    []string
	}{
		{"zip", "PK\x03\x04\x14\x00", "", []string{zip, "of the delivery"}},
		{"empty zip", "PK\x05\x06\x00\x00", "latin-1", []string{zip}},
		{"zip in parts", "PK\x07\x08PK\x03\x04", "utf-16", []string{zip}},
		{"UTF-16 for utf-8", "\xff\xfea\x00", "utf-8", []string{"the text is UTF-16, declare encoding: utf-16", "of the text"}},
		{"UTF-16 big endian for utf-8", "\xfe\xff\x00a", "", []string{"the text is UTF-16, declare encoding: utf-16"}},
		{"UTF-16 for windows-1252", "\xff\xfea\x00", "windows-1252", []string{"declare encoding: utf-16", "windows-1252 is declared"}},
		{"big endian for utf-16le", "\xfe\xff\x00a", "utf-16le", []string{"declare encoding: utf-16"}},
		{"little endian for utf-16be", "\xff\xfea\x00", "utf-16be", []string{"declare encoding: utf-16"}},
		{"UTF-8 for latin-1", "\ufefftime", "latin-1", []string{"the text is UTF-8, declare encoding: utf-8"}},
		{"UTF-8 for utf-16", "\ufefftime", "utf-16", []string{"the text is UTF-8, declare encoding: utf-8"}},
		{"UTF-32", "\xff\xfe\x00\x00a\x00\x00\x00", "utf-16", []string{"UTF-32", "send it as UTF-8"}},
		{"UTF-32 big endian", "\x00\x00\xfe\xff\x00\x00\x00a", "", []string{"UTF-32"}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			_, err := unpacked(strings.NewReader(tt.delivery), tt.encoding, unpack.Limits{})
			checkFault(t, err, 0, tt.parts...)
		})
	}
}

func TestEncodingsAreThoseNamed(t *testing.T) {
	for _, name := range unpack.Encodings {
		if _, err := unpacked(strings.NewReader(""), name, unpack.Limits{}); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, name := range []string{"UTF-8", "latin1", "cp1252", "utf-7"} {
		_, err := unpack.Reader(strings.NewReader("a"), name, unpack.Limits{})
		if _, ok := errors.AsType[*unpack.FaultError](err); ok || err == nil || !strings.Contains(err.Error(), "utf-16le") {
			t.Errorf("%s: got %v, want an error that is not the delivery's and lists the names", name, err)
		}
	}
}

// closer fails the test if the delivery is closed, which is its owner's business.
type closer struct {
	io.Reader
	t *testing.T
}

func (c closer) Close() error {
	c.t.Error("closed")
	return nil
}

func TestClose(t *testing.T) {
	for _, name := range []string{"fell.csv", "fell.csv.gz", "fell.csv.zst", "fell.utf-16.csv"} {
		encoding := "utf-8"
		if name == "fell.utf-16.csv" {
			encoding = "utf-16"
		}
		r, err := unpack.Reader(closer{bytes.NewReader(file(t, name)), t}, encoding, unpack.Limits{})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := r.Read(make([]byte, 1)); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		for range 2 {
			if err := r.Close(); err != nil {
				t.Errorf("%s: %v", name, err)
			}
		}
		if n, err := r.Read(make([]byte, 1)); n != 0 || !errors.Is(err, fs.ErrClosed) {
			t.Errorf("%s: read %d bytes after Close, %v", name, n, err)
		}
	}
}

// goleak would not see what Close ends.
func TestNoGoroutineWhileOpen(t *testing.T) {
	for name, delivery := range map[string][]byte{"gzip": gzipped(t, hourlyText(50_000)), "zstd": zstded(t, hourlyText(50_000))} {
		before := goleak.IgnoreCurrent()
		r, err := unpack.Reader(bytes.NewReader(delivery), "windows-1252", unpack.Limits{})
		if err != nil {
			t.Fatal(err)
		}
		if _, err := io.ReadFull(r, make([]byte, 1000)); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if err := goleak.Find(before); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		r.Close()
	}
}
