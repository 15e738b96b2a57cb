package unpack_test

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"strings"
	"testing"
	"unicode/utf8"

	"golang.org/x/text/encoding"
	"golang.org/x/text/encoding/charmap"
	"golang.org/x/text/encoding/unicode"
	"pgregory.net/rapid"

	"thawledger/ingest/unpack"
)

// undefined1252 are the bytes for which Microsoft's table of code page 1252
// (unicode.org, CP1252.TXT) has no character; from memory, and so does iconv of
// glibc 2.36.
const undefined1252 = "\x81\x8d\x8f\x90\x9d"

// Each byte against golang.org/x/text, whose tables are made from the WHATWG's
// indexes.
func TestEveryByte(t *testing.T) {
	tests := []struct {
		name      string
		reference *charmap.Charmap
		undefined string
	}{
		{"latin-1", charmap.ISO8859_1, ""},
		{"windows-1252", charmap.Windows1252, undefined1252},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			for b := range 256 {
				text := string([]byte{'a', 'b', 'c', 'd', 'e', byte(b), 'f'})
				got, err := unpacked(strings.NewReader(text), tt.name, unpack.Limits{})
				if strings.IndexByte(tt.undefined, byte(b)) >= 0 {
					checkFault(t, err, 5, fmt.Sprintf("0x%02X stands for no character in %s", b, tt.name))
					if got != "abcde" {
						t.Errorf("0x%02X: got %q before the fault", b, got)
					}
					continue
				}
				if want := "abcde" + string(tt.reference.DecodeByte(byte(b))) + "f"; err != nil || got != want {
					t.Errorf("0x%02X: got %q, %v, want %q", b, got, err, want)
				}
			}
		})
	}
}

// The control characters of ISO 8859-1 are not the WHATWG's latin1.
func TestLatin1IsNotWindows1252(t *testing.T) {
	for encoding, want := range map[string]string{"latin-1": "\u0080 \u0096", "windows-1252": "€ –"} {
		if got, err := unpacked(strings.NewReader("\x80 \x96"), encoding, unpack.Limits{}); err != nil || got != want {
			t.Errorf("%s: got %q, %v", encoding, got, err)
		}
	}
}

// Text in which characters of every length come at any place, against
// golang.org/x/text, which writes what is read here.
func TestReadsWhatIsWrittenByOthers(t *testing.T) {
	utf16 := func(e unicode.Endianness, m unicode.BOMPolicy) encoding.Encoding { return unicode.UTF16(e, m) }
	tests := []struct {
		name, declared, runes string
		by                    encoding.Encoding
	}{
		{"latin-1", "latin-1", "a;\n°Äÿ\u0080", charmap.ISO8859_1},
		{"windows-1252", "windows-1252", "a;\n°Äÿ€–", charmap.Windows1252},
		{"utf-16 little endian, mark", "utf-16", "a;\n°Ä€\ufeff\U0001f321", utf16(unicode.LittleEndian, unicode.UseBOM)},
		{"utf-16 big endian, mark", "utf-16", "a;\n°Ä€\ufffe\U0010ffff", utf16(unicode.BigEndian, unicode.UseBOM)},
		{"utf-16le", "utf-16le", "a;\n°Ä€\uffff\U00010000", utf16(unicode.LittleEndian, unicode.IgnoreBOM)},
		{"utf-16be", "utf-16be", "a;\n°Ä€\ud7ff\ue000\U0001f321", utf16(unicode.BigEndian, unicode.IgnoreBOM)},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			rapid.Check(t, func(t *rapid.T) {
				// Longer than any buffer, so that characters lie across their ends.
				want := "x" + strings.Repeat(rapid.StringOfN(rapid.RuneFrom([]rune(tt.runes)), 1, 40, -1).Draw(t, "text"), rapid.IntRange(1, 400).Draw(t, "times"))
				text, err := tt.by.NewEncoder().String(want)
				if err != nil {
					t.Fatal(err)
				}
				if got, err := unpacked(strings.NewReader(text), tt.declared, unpack.Limits{}); err != nil || got != want {
					t.Fatalf("got %d bytes, %v, want %d", len(got), err, len(want))
				}
			})
		})
	}
}

func TestUTF16Faults(t *testing.T) {
	units := func(list ...uint16) []byte {
		var b []byte
		for _, u := range list {
			b = binary.BigEndian.AppendUint16(b, u)
		}
		return b
	}
	const half, alone = "ends with half a character", "stands alone"
	long := bytes.Repeat(units('a'), 10_000)
	tests := []struct {
		name   string
		text   []byte
		offset int64
		before string
		part   string
	}{
		{"odd byte", append(units('a', 'b'), 0), 4, "ab", half},
		{"only one byte", []byte{0}, 0, "", half},
		{"after the mark", units(0xfeff, 'a', 0xdc00), 4, "a", "U+DC00 " + alone},
		{"low surrogate first", units('a', 0xdc00, 0xd800), 2, "a", "U+DC00 " + alone},
		{"high surrogate before a letter", units('a', 0xd800, 'b'), 2, "a", "U+D800 " + alone},
		{"two high surrogates", units(0xdbff, 0xd83c, 0xdf21), 0, "", "U+DBFF " + alone},
		{"high surrogate at the end", units('a', 0xd83c), 2, "a", "U+D83C " + alone},
		{"high surrogate and a byte", append(units('a', 0xd83c), 0xdf), 2, "a", "U+D83C " + alone},
		{"low surrogate after a pair", units(0xd83c, 0xdf21, 0xdf21), 4, "\U0001f321", "U+DF21 " + alone},
		{"far on", append(bytes.Clone(long), units(0xdfff, 'b')...), 20_000, strings.Repeat("a", 10_000), "byte 20000 of the text"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := unpacked(bytes.NewReader(tt.text), "utf-16be", unpack.Limits{})
			checkFault(t, err, tt.offset, tt.part, "of the text")
			if got != tt.before {
				t.Errorf("got %q before the fault, want %q", got, tt.before)
			}
		})
	}
}

// Every single unit, and every pair of kinds of unit, is a character or a fault,
// as the D91 of the Unicode Standard (chapter 3.9) has it.
func TestEveryUnit(t *testing.T) {
	for u := range 1 << 16 {
		surrogate := u >= 0xd800 && u < 0xe000
		got, err := unpacked(bytes.NewReader([]byte{'a', 0, byte(u), byte(u >> 8)}), "utf-16le", unpack.Limits{})
		if surrogate != (err != nil) {
			t.Fatalf("U+%04X: got %q, %v", u, got, err)
		}
		if !surrogate && got != "a"+string(rune(u)) || !utf8.ValidString(got) {
			t.Fatalf("U+%04X: got %q", u, got)
		}
	}
}
