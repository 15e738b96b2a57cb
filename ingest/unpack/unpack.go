package unpack

import (
	"fmt"
	"io"
	"io/fs"
	"slices"
	"strings"

	"golang.org/x/text/transform"
)

// Limits caps what a delivery may expand to. What is not compressed is not
// limited.
type Limits struct {
	Bytes int64 // of text in all; 4 GiB if it is 0
	Ratio int64 // of text to delivery, once the first MiB has come; 200 if it is 0
}

const (
	defaultBytes = 4 << 30 // some 60 million rows
	defaultRatio = 200     // judgement, no source; hourly rows come to 5, a year of nothing but missing values to 80 by zstd -3
)

func (l Limits) orDefault() Limits {
	if l.Bytes <= 0 {
		l.Bytes = defaultBytes
	}
	if l.Ratio <= 0 {
		l.Ratio = defaultRatio
	}
	return l
}

// Encodings lists the names that settings accept.
var Encodings = []string{"utf-8", "utf-16", "utf-16le", "utf-16be", "latin-1", "windows-1252"}

// FaultError is a fault of the delivery itself: trying again does not help, and
// its batch is to be held back.
type FaultError struct {
	Offset int64  // bytes before the fault, of the delivery or of its text before it became UTF-8
	Text   string // says which of the two, what is wrong and what would be right
}

func (e *FaultError) Error() string { return e.Text }

// What an offset counts.
const (
	ofDelivery = "delivery" // as received
	ofText     = "text"     // expanded, not yet UTF-8
)

func fault(offset int64, of, format string, args ...any) *FaultError {
	return &FaultError{offset, fmt.Sprintf("byte %d of the %s: ", offset, of) + fmt.Sprintf(format, args...)}
}

// Reader returns the delivery's text. An empty encoding means utf-8. It reads the
// first bytes of r before it returns. A *FaultError, from here or from Read, is
// about the delivery, any other from Read about r. Close leaves r open.
func Reader(r io.Reader, encoding string, limits Limits) (io.ReadCloser, error) {
	if encoding == "" {
		encoding = "utf-8"
	}
	if !slices.Contains(Encodings, encoding) {
		return nil, fmt.Errorf("encoding %q is none of %s", encoding, strings.Join(Encodings, ", "))
	}
	t := begin(r, nil)
	switch {
	case t.starts("PK\x03\x04"), t.starts("PK\x05\x06"), t.starts("PK\x07\x08"):
		return nil, fault(0, ofDelivery, "a zip archive; send gzip or zstd, or unpack it; an .xlsx workbook is one too, save it as CSV")
	case t.starts(gzipMark):
		x := expandGzip(t, limits)
		t = begin(x, x.close)
	case t.starts(zstdMark), len(t.head) == headBytes && t.head[0]&0xf0 == 0x50 && string(t.head[1:]) == "\x2a\x4d\x18":
		x, err := expandZstd(t, limits)
		if err != nil {
			return nil, fmt.Errorf("open zstd: %w", err)
		}
		t = begin(x, x.close)
	}
	if err := t.decode(encoding); err != nil {
		t.Close()
		return nil, err
	}
	return t, nil
}

// Compressed says whether a delivery begins as a compressed one does.
func Compressed(r io.ReaderAt) bool {
	head := make([]byte, headBytes)
	n, _ := r.ReadAt(head, 0) // what cannot be read is not compressed
	t := text{head: head[:n]}
	return t.starts(gzipMark) || t.starts(zstdMark)
}

const (
	gzipMark = "\x1f\x8b"
	zstdMark = "\x28\xb5\x2f\xfd"
)

// headBytes is how much is looked at to tell what something is.
const headBytes = 4

// emptyReads is how many reads in a row may bring neither bytes nor an error.
const emptyReads = 100

// text is what is read from a reader, the first bytes of which were looked at.
type text struct {
	head    []byte
	err     error // what reading the head ended with
	from    io.Reader
	release func()
}

func begin(r io.Reader, release func()) *text {
	t := &text{from: r, release: release}
	head := make([]byte, headBytes)
	have := 0
	for have < headBytes && t.err == nil {
		var n int
		n, t.err = read(r, head[have:])
		have += n
	}
	t.head = head[:have]
	return t
}

// read reads from r, and not for ever from one that stands still.
func read(r io.Reader, p []byte) (int, error) {
	for range emptyReads {
		if n, err := r.Read(p); n > 0 || err != nil || len(p) == 0 {
			return n, err
		}
	}
	return 0, io.ErrNoProgress
}

func (t *text) starts(with string) bool { return strings.HasPrefix(string(t.head), with) }

func (t *text) Read(p []byte) (int, error) {
	if len(t.head) > 0 {
		n := copy(p, t.head)
		t.head = t.head[n:]
		return n, nil
	}
	if t.err != nil {
		return 0, t.err
	}
	return read(t.from, p)
}

// WriteTo lets io.Copy reach what the text is read from.
func (t *text) WriteTo(w io.Writer) (int64, error) {
	var written int64
	if len(t.head) > 0 {
		n, err := w.Write(t.head)
		t.head, written = t.head[n:], int64(n)
		if err != nil {
			return written, err
		}
	}
	if t.err == io.EOF {
		return written, nil
	}
	if t.err != nil {
		return written, t.err
	}
	n, err := io.Copy(w, t.from)
	return written + n, err
}

// Close releases everything; what is read after it is fs.ErrClosed.
func (t *text) Close() error {
	if t.release != nil {
		t.release()
	}
	*t = text{err: fs.ErrClosed}
	return nil
}

// decode makes t read as UTF-8.
func (t *text) decode(encoding string) error {
	mark, err := t.mark(encoding)
	if err != nil {
		return err
	}
	var by transform.Transformer
	switch encoding {
	case "utf-8":
		return nil
	case "latin-1":
		by = &bytewise{name: encoding, high: latin1}
	case "windows-1252":
		by = &bytewise{name: encoding, high: windows1252}
	default:
		at := int64(len(mark))
		t.head = t.head[at:]
		by = &pairs{big: encoding == "utf-16be" || mark == bigEndianMark, at: at}
	}
	from := &text{head: t.head, err: t.err, from: t.from}
	t.head, t.err, t.from = nil, nil, transform.NewReader(from, by)
	return nil
}
