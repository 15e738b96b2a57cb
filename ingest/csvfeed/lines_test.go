package csvfeed

import (
	"bytes"
	"io"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// allLines reads all lines of r; one that is too long is marked with a star.
func allLines(t *testing.T, r io.Reader) []string {
	t.Helper()
	var got []string
	for l := newLines(r); ; {
		line, long, err := l.next(t.Context())
		if err == io.EOF {
			return got
		}
		if err != nil {
			t.Fatal(err)
		}
		s := string(line)
		if long {
			s = "*" + s
		}
		got = append(got, s)
	}
}

func TestLines(t *testing.T) {
	tests := []struct {
		name, text string
		want       []string
	}{
		{name: "empty", text: ""},
		{name: "one without end", text: "a", want: []string{"a"}},
		{name: "LF", text: "a\nb\n", want: []string{"a", "b"}},
		{name: "CRLF", text: "a\r\nb\r\n", want: []string{"a", "b"}},
		{name: "CR", text: "a\rb\r", want: []string{"a", "b"}},
		{name: "mixed", text: "a\rb\nc\r\nd", want: []string{"a", "b", "c", "d"}},
		{name: "empty lines", text: "\n\r\n\r\r\n\n", want: []string{"", "", "", "", ""}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if got := allLines(t, strings.NewReader(tt.text)); !slices.Equal(got, tt.want) {
				t.Errorf("got %q, want %q", got, tt.want)
			}
			if got := allLines(t, iotest.OneByteReader(strings.NewReader(tt.text))); !slices.Equal(got, tt.want) {
				t.Errorf("byte by byte: got %q, want %q", got, tt.want)
			}
		})
	}
}

// TestLinesAnyShape: whatever the ends and however the bytes arrive, the lines
// are those of the text with its line ends made one.
func TestLinesAnyShape(t *testing.T) {
	rapid.Check(t, func(rt *rapid.T) {
		text := rapid.StringMatching(`([a-c]{0,3}(\n|\r|\r\n)){0,8}[a-c]?`).Draw(rt, "text")
		text = strings.Repeat(text, rapid.SampledFrom([]int{1, 2, firstBuffer / max(1, len(text))}).Draw(rt, "times"))
		plain := strings.ReplaceAll(strings.ReplaceAll(text, "\r\n", "\n"), "\r", "\n")
		want := strings.Split(plain, "\n")
		if want[len(want)-1] == "" {
			want = want[:len(want)-1]
		}
		r := io.Reader(strings.NewReader(text))
		if rapid.Bool().Draw(rt, "halves") {
			r = iotest.HalfReader(r)
		}
		if got := allLines(t, iotest.DataErrReader(r)); !slices.Equal(got, want) {
			rt.Fatalf("got %d lines, want %d", len(got), len(want))
		}
	})
}

func TestLineThatIsTooLong(t *testing.T) {
	for _, end := range []string{"\n", "\r\n", "\r"} {
		for _, length := range []int{MaxLine - 1, MaxLine, MaxLine + 1, 2*MaxLine - 1, 2 * MaxLine, 5 * MaxLine} {
			long := strings.Repeat("x", length)
			want := long
			if length > MaxLine {
				want = "*" + long[:pipeline.MaxRaw]
			}
			for _, before := range []string{"", "a" + end} {
				got := allLines(t, strings.NewReader(before+long+end+"b"))
				if n := len(got); got[n-1] != "b" || got[n-2] != want || n != 2+len(before)/2 {
					t.Errorf("%d bytes, end %q, after %q: got %d lines", length, end, before, n)
				}
				if got = allLines(t, strings.NewReader(before+long)); got[len(got)-1] != want {
					t.Errorf("%d bytes without end, after %q: got %d lines", length, before, len(got))
				}
			}
		}
	}
}

// endless is a reader of a line of n bytes.
type endless struct{ n int }

func (e *endless) Read(b []byte) (int, error) {
	if e.n == 0 {
		return 0, io.EOF
	}
	n := min(len(b), e.n)
	e.n -= n
	copy(b, bytes.Repeat([]byte("x"), n))
	return n, nil
}

func TestLongLineInBoundedMemory(t *testing.T) {
	l := newLines(&endless{n: 1024 * MaxLine}) // 1 GiB
	line, long, err := l.next(t.Context())
	if len(line) != pipeline.MaxRaw || !long || err != nil {
		t.Fatalf("got %d bytes, %v, %v", len(line), long, err)
	}
	if cap(l.buf) > 2*MaxLine {
		t.Errorf("the buffer has grown to %d bytes", cap(l.buf))
	}
}

func TestCellsOfALongLine(t *testing.T) {
	plan := planForFuzz(t, ",")
	s := &counter{}
	text := "time,temp\n2031-07-20 13:00," + strings.Repeat("1", MaxLine) + "\n2031-07-20 14:00,1\n# " + strings.Repeat("x", MaxLine) + "\n"
	c, err := plan.Decode(t.Context(), strings.NewReader(text), "", s)
	if err != nil || c.Check() != nil {
		t.Fatal(err, c.Check())
	}
	if c.Lines != 4 || c.Comments != 1 || c.RowsSetAside != 1 || c.RowsRead != 1 {
		t.Errorf("got %+v", c)
	}
	if s.last.Code != pipeline.LineTooLong || len(s.last.Raw) != pipeline.MaxRaw || s.last.Text != tooLong || s.last.Line != 2 {
		t.Errorf("got %+v", s.last)
	}
	text = "time,temp\n2031-07-20 13:00,5," + strings.Repeat("1", pipeline.MaxRaw) + "\n"
	if _, err := plan.Decode(t.Context(), strings.NewReader(text), "", s); err != nil {
		t.Fatal(err)
	}
	if s.last.Code != pipeline.WrongWidth || len(s.last.Raw) != pipeline.MaxRaw {
		t.Errorf("got %d bytes of %s", len(s.last.Raw), s.last.Code)
	}
}
