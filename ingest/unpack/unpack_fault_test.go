package unpack_test

import (
	"bytes"
	"errors"
	"io"
	"testing"
	"testing/iotest"

	"thawledger/ingest/unpack"
)

var errFolder = errors.New("the folder is gone")

// A delivery that cannot be read is not a delivery with a fault, wherever reading
// ends, and never looks like one that came to its end.
func TestReadingFails(t *testing.T) {
	deliveries := []struct {
		name, encoding string
		bytes          []byte
	}{
		{"plain", "utf-8", file(t, "fell.csv")},
		{"gzip", "", file(t, "two_members.csv.gz")},
		{"zstd", "", file(t, "two_frames.csv.zst")},
		{"utf-16", "utf-16", file(t, "fell.utf-16.csv")},
		{"windows-1252", "windows-1252", file(t, "fell.windows-1252.csv")},
		{"utf-16 in gzip", "utf-16", gzipped(t, file(t, "fell.utf-16.csv"))},
	}
	for _, d := range deliveries {
		t.Run(d.name, func(t *testing.T) {
			for _, cause := range []error{errFolder, io.ErrUnexpectedEOF} {
				for cut := range len(d.bytes) + 1 {
					broken := io.MultiReader(bytes.NewReader(d.bytes[:cut]), iotest.ErrReader(cause))
					_, err := unpacked(broken, d.encoding, unpack.Limits{})
					if _, fault := errors.AsType[*unpack.FaultError](err); fault || !errors.Is(err, cause) {
						t.Fatalf("after %d bytes: got %v, want %v", cut, err, cause)
					}
				}
			}
		})
	}
}

// stuck brings neither bytes nor an error.
type stuck struct{}

func (stuck) Read([]byte) (int, error) { return 0, nil }

func TestReadingStandsStill(t *testing.T) {
	for name, begin := range map[string]string{"at once": "", "gzip": "\x1f\x8b\x08\x00", "zstd": "\x28\xb5\x2f\xfd"} {
		_, err := unpacked(io.MultiReader(bytes.NewReader([]byte(begin)), stuck{}), "", unpack.Limits{})
		if !errors.Is(err, io.ErrNoProgress) {
			t.Errorf("%s: got %v", name, err)
		}
	}
}

// Writing that fails ends a copy, with what is left still to be read.
func TestWritingFails(t *testing.T) {
	r, err := unpack.Reader(bytes.NewReader([]byte("time,temp\n")), "", unpack.Limits{})
	if err != nil {
		t.Fatal(err)
	}
	if n, err := r.(io.WriterTo).WriteTo(full{}); n != 1 || !errors.Is(err, errFolder) {
		t.Errorf("wrote %d, %v", n, err)
	}
	if rest, err := io.ReadAll(r); string(rest) != "ime,temp\n" || err != nil {
		t.Errorf("left %q, %v", rest, err)
	}
}

// full takes one byte of each write.
type full struct{}

func (full) Write([]byte) (int, error) { return 1, errFolder }
