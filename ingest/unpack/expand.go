package unpack

import (
	"bufio"
	"compress/gzip"
	"errors"
	"fmt"
	"io"

	"github.com/klauspost/compress/zstd"
)

const (
	readAhead = 64 << 10 // bytes of the delivery
	freeBytes = 1 << 20  // of text that come before its ratio counts

	// maxWindow is four times what RFC 8878, 3.1.1.1.2, recommends to support;
	// zstd needs more only with --long or beyond -20.
	maxWindow = 32 << 20
)

// counted is the delivery, and how much of it was read.
type counted struct {
	from io.Reader
	n    int64
	err  error // that reading ended with, but for io.EOF
}

func (c *counted) Read(p []byte) (int, error) {
	n, err := c.from.Read(p)
	c.n += int64(n)
	if err != nil && err != io.EOF {
		c.err = err
	}
	return n, err
}

// expanded is the text of a compressed delivery, within limits.
type expanded struct {
	kind   string
	in     *counted
	ahead  *bufio.Reader // reads in
	from   io.Reader     // reads ahead
	damage func(error) *FaultError
	limits Limits
	close  func()

	out int64 // bytes of text so far
	err error
}

func newExpanded(kind string, r io.Reader, limits Limits) *expanded {
	in := &counted{from: r}
	return &expanded{kind: kind, in: in, ahead: bufio.NewReaderSize(in, readAhead), limits: limits.orDefault()}
}

// used is how many bytes of the delivery the text so far came from.
func (x *expanded) used() int64 { return x.in.n - int64(x.ahead.Buffered()) }

func (x *expanded) Read(p []byte) (int, error) {
	if x.err != nil || len(p) == 0 {
		return 0, x.err
	}
	n, err := x.from.Read(p)
	x.out += int64(n)
	if err != nil {
		x.err = x.explain(err)
	}
	if over := x.out - x.limits.Bytes; over > 0 {
		n -= int(over)
		x.out = x.limits.Bytes
		x.err = fault(x.used(), ofDelivery, "the %s data up to here expands to more than %d bytes, the most that a delivery may; send it in parts", x.kind, x.limits.Bytes)
	} else if x.out > freeBytes && (x.out-1)/x.limits.Ratio >= x.used() {
		x.err = fault(x.used(), ofDelivery, "the %s data up to here expands to %d bytes, more than %d times as many; if they are meant, send them without compression", x.kind, x.out, x.limits.Ratio)
	}
	return n, x.err
}

// explain says of what reading ended with whether it is the end, the delivery's
// fault, or another's.
func (x *expanded) explain(err error) error {
	if x.in.err != nil {
		return fmt.Errorf("read delivery: %w", x.in.err)
	}
	if err == io.EOF {
		return err
	}
	if errors.Is(err, io.ErrUnexpectedEOF) {
		return fault(x.used(), ofDelivery, "the %s data ends before it is complete, after %d bytes of text; it was cut short or added to on its way, send it again whole", x.kind, x.out)
	}
	if f, ok := errors.AsType[*FaultError](err); ok {
		return f
	}
	return x.damage(err)
}

func (x *expanded) damaged(what string) *FaultError {
	return fault(x.used(), ofDelivery, "the %s data is damaged at or before here (%s), after %d bytes of text; send it again", x.kind, what, x.out)
}

func (x *expanded) surplus(at int64) *FaultError {
	return fault(at, ofDelivery, "the %s data ends there, and what follows it is no %s; send nothing after it", x.kind, x.kind)
}

func expandGzip(r io.Reader, limits Limits) *expanded {
	x := newExpanded("gzip", r, limits)
	x.from = &members{x: x}
	x.damage = func(err error) *FaultError {
		switch {
		case errors.Is(err, gzip.ErrChecksum):
			return x.damaged("the check sum is another")
		case errors.Is(err, gzip.ErrHeader):
			return x.damaged("it has no gzip header of RFC 1952")
		}
		return x.damaged("no deflate data")
	}
	x.close = func() {}
	return x
}

// members reads gzip members one after another. It finds each beginning itself,
// since compress/gzip calls whatever follows the last one a bad header.
type members struct {
	x *expanded
	z gzip.Reader
	// inside is whether z has begun a member and not ended it.
	inside bool
}

func (m *members) Read(p []byte) (int, error) {
	for {
		if !m.inside {
			if err := m.next(); err != nil {
				return 0, err
			}
		}
		n, err := m.z.Read(p)
		if err == io.EOF {
			m.inside, err = false, nil
		}
		if n > 0 || err != nil {
			return n, err
		}
	}
}

// next begins the next member; io.EOF if there is none.
func (m *members) next() error {
	start, err := m.x.ahead.Peek(2)
	if len(start) == 0 {
		return err
	}
	if string(start) != "\x1f\x8b" {
		return m.x.surplus(m.x.used())
	}
	if err := m.z.Reset(m.x.ahead); err != nil {
		return err
	}
	m.z.Multistream(false)
	m.inside = true
	return nil
}

func expandZstd(r io.Reader, limits Limits) (*expanded, error) {
	x := newExpanded("zstd", r, limits)
	z, err := zstd.NewReader(x.ahead, zstd.WithDecoderConcurrency(1), zstd.WithDecoderMaxMemory(maxWindow), zstd.WithDecoderMaxWindow(maxWindow))
	if err != nil {
		return nil, err
	}
	x.from, x.close = z, z.Close
	x.damage = func(err error) *FaultError {
		switch {
		case errors.Is(err, zstd.ErrMagicMismatch):
			return x.surplus(x.used() - 4)
		case errors.Is(err, zstd.ErrUnknownDictionary):
			return fault(x.used(), ofDelivery, "the zstd data needs a dictionary, which is not known here; compress without one")
		case errors.Is(err, zstd.ErrWindowSizeExceeded), errors.Is(err, zstd.ErrDecoderSizeExceeded):
			return fault(x.used(), ofDelivery, "the zstd data needs a window of more than %d bytes; compress without --long, at -20 at most", maxWindow)
		case errors.Is(err, zstd.ErrCRCMismatch):
			return x.damaged("the check sum is another")
		}
		return x.damaged(err.Error())
	}
	return x, nil
}
