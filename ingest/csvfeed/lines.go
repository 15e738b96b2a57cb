package csvfeed

import (
	"bytes"
	"context"
	"io"

	"thawledger/pipeline"
)

// MaxLine is the most bytes that a line may have, its end not counted.
const MaxLine = 1 << 20

// firstBuffer is what a lines begins with, in bytes; few files need more.
const firstBuffer = 64 << 10

// emptyReads is how many reads in a row may bring neither bytes nor an error.
const emptyReads = 100

// lines splits bytes into lines in bounded memory.
type lines struct {
	r   io.Reader
	err error // of the last read

	buf        []byte
	start, end int  // what of buf is read and not yet returned
	lf         int  // first LF from start on; end if there is none
	afterCR    bool // an LF at start belongs to the line before
}

func newLines(r io.Reader) *lines {
	return &lines{r: r, buf: make([]byte, firstBuffer)}
}

// next returns the next line without its end, valid until the following call,
// or io.EOF. Of a line longer than MaxLine it returns the first MaxRaw bytes
// and long.
func (l *lines) next(ctx context.Context) (line []byte, long bool, err error) {
	if l.afterCR {
		if l.start == l.end && !l.fill(ctx) {
			return nil, false, l.err
		}
		l.afterCR = false
		if l.buf[l.start] == '\n' {
			l.take(1)
		}
	}
	seen := 0 // bytes from start on that hold no line end
	for {
		if n := l.find(seen); n >= 0 {
			line = l.buf[l.start : l.start+n]
			l.afterCR = l.buf[l.start+n] == '\r'
			l.take(n + 1)
			if len(line) > MaxLine {
				return line[:pipeline.MaxRaw], true, nil
			}
			return line, false, nil
		}
		seen = l.end - l.start
		if seen > MaxLine {
			return l.skip(ctx)
		}
		if !l.fill(ctx) {
			if l.err != io.EOF || seen == 0 {
				return nil, false, l.err
			}
			line = l.buf[l.start:l.end]
			l.take(seen)
			return line, false, nil
		}
	}
}

// skip reads on to the end of a line that is too long and returns its beginning.
func (l *lines) skip(ctx context.Context) ([]byte, bool, error) {
	begin := append(make([]byte, 0, pipeline.MaxRaw), l.buf[l.start:l.start+pipeline.MaxRaw]...)
	for {
		l.take(l.end - l.start)
		if !l.fill(ctx) {
			if l.err == io.EOF {
				return begin, true, nil
			}
			return nil, false, l.err
		}
		if n := l.find(0); n >= 0 {
			l.afterCR = l.buf[l.start+n] == '\r'
			l.take(n + 1)
			return begin, true, nil
		}
	}
}

// find returns how many bytes from start on come before the next line end; -1 if
// none is read yet. The first seen of them are known to hold none.
func (l *lines) find(seen int) int {
	from := l.start + seen
	if l.lf < from {
		l.lf = l.end
		if n := bytes.IndexByte(l.buf[from:l.end], '\n'); n >= 0 {
			l.lf = from + n
		}
	}
	if n := bytes.IndexByte(l.buf[from:l.lf], '\r'); n >= 0 {
		return seen + n
	}
	if l.lf < l.end {
		return l.lf - l.start
	}
	return -1
}

// take steps over n bytes.
func (l *lines) take(n int) { l.start += n }

// fill reads more and reports whether any bytes came; if not, err says why.
// Called only when what is read holds no line end, or nothing is left.
func (l *lines) fill(ctx context.Context) bool {
	if l.err != nil {
		return false
	}
	if l.start > 0 {
		copy(l.buf, l.buf[l.start:l.end])
		l.end -= l.start
		l.start = 0
	}
	if l.end == len(l.buf) {
		grown := make([]byte, 2*len(l.buf))
		copy(grown, l.buf[:l.end])
		l.buf = grown
	}
	l.lf = -1
	if l.err = ctx.Err(); l.err != nil {
		return false
	}
	for range emptyReads {
		n, err := l.r.Read(l.buf[l.end:])
		l.end += n
		l.err = err
		if n > 0 {
			return true
		}
		if err != nil {
			return false
		}
	}
	l.err = io.ErrNoProgress
	return false
}
