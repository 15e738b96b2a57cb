package unpack

import (
	"encoding/binary"
	"unicode/utf16"
	"unicode/utf8"

	"golang.org/x/text/transform"
)

const bigEndianMark = "\xfe\xff"

// marks are the byte order marks of Unicode, longest first.
var marks = []struct {
	bytes, means, declare string
	of                    []string // encodings that begin so
}{
	{"\xff\xfe\x00\x00", "UTF-32", "", nil},
	{"\x00\x00\xfe\xff", "UTF-32", "", nil},
	{"\xef\xbb\xbf", "UTF-8", "utf-8", []string{"utf-8"}},
	{"\xff\xfe", "UTF-16", "utf-16", []string{"utf-16", "utf-16le"}},
	{bigEndianMark, "UTF-16", "utf-16", []string{"utf-16", "utf-16be"}},
}

// mark returns the byte order mark that the text begins with, which must be the
// encoding's.
func (t *text) mark(encoding string) (string, error) {
	for _, m := range marks {
		if !t.starts(m.bytes) {
			continue
		}
		for _, of := range m.of {
			if of == encoding {
				return m.bytes, nil
			}
		}
		if m.declare == "" {
			return "", fault(0, ofText, "the text is %s, which is not read; send it as UTF-8", m.means)
		}
		return "", fault(0, ofText, "the text is %s, declare encoding: %s (its byte order mark is % X, and %s is declared)", m.means, m.declare, m.bytes, encoding)
	}
	return "", nil
}

// latin1 and windows1252 are the characters of 0x80 to 0xFF; 0 where there is
// none.
var (
	latin1      = highHalf("")
	windows1252 = highHalf("€\x00‚ƒ„…†‡ˆ‰Š‹Œ\x00Ž\x00\x00‘’“”•–—˜™š›œ\x00žŸ")
)

// highHalf is that of ISO 8859-1 with other characters from 0x80 on.
func highHalf(other string) *[128]rune {
	var high [128]rune
	for i := range high {
		high[i] = rune(0x80 + i)
	}
	copy(high[:], []rune(other))
	return &high
}

// bytewise makes UTF-8 of an encoding that has one byte a character.
type bytewise struct {
	transform.NopResetter
	name string
	high *[128]rune
	at   int64 // bytes before those of the next Transform
}

func (b *bytewise) Transform(dst, src []byte, _ bool) (nDst, nSrc int, err error) {
	defer func() { b.at += int64(nSrc) }()
	for nSrc < len(src) {
		c := src[nSrc]
		if c < utf8.RuneSelf {
			if nDst == len(dst) {
				return nDst, nSrc, transform.ErrShortDst
			}
			dst[nDst] = c
			nDst++
			nSrc++
			continue
		}
		r := b.high[c-utf8.RuneSelf]
		if r == 0 {
			return nDst, nSrc, fault(b.at+int64(nSrc), ofText, "0x%02X stands for no character in %s; declare the encoding that the text has, perhaps utf-8", c, b.name)
		}
		if nDst+utf8.RuneLen(r) > len(dst) {
			return nDst, nSrc, transform.ErrShortDst
		}
		nDst += utf8.EncodeRune(dst[nDst:], r)
		nSrc++
	}
	return nDst, nSrc, nil
}

// pairs makes UTF-8 of UTF-16. The decoder of golang.org/x/text puts U+FFFD where
// a surrogate stands alone or a byte is missing; here that is a fault.
type pairs struct {
	transform.NopResetter
	big bool
	at  int64 // bytes before those of the next Transform
}

func (u *pairs) unit(b []byte) rune {
	if u.big {
		return rune(binary.BigEndian.Uint16(b))
	}
	return rune(binary.LittleEndian.Uint16(b))
}

func (u *pairs) Transform(dst, src []byte, atEOF bool) (nDst, nSrc int, err error) {
	defer func() { u.at += int64(nSrc) }()
	for nSrc < len(src) {
		rest := src[nSrc:]
		if len(rest) < 2 {
			if !atEOF {
				return nDst, nSrc, transform.ErrShortSrc
			}
			return nDst, nSrc, fault(u.at+int64(nSrc), ofText, "the text ends with half a character of UTF-16; send it again whole, or declare the encoding that it has")
		}
		r, size := u.unit(rest), 2
		if utf16.IsSurrogate(r) {
			if len(rest) < 4 && !atEOF {
				return nDst, nSrc, transform.ErrShortSrc
			}
			second := rune(0)
			if len(rest) >= 4 {
				second = u.unit(rest[2:])
			}
			pair := utf16.DecodeRune(r, second)
			if pair == utf8.RuneError {
				return nDst, nSrc, fault(u.at+int64(nSrc), ofText, "the surrogate U+%04X stands alone, which UTF-16 does not allow; send the text again, or declare the encoding that it has", r)
			}
			r, size = pair, 4
		}
		if nDst+utf8.RuneLen(r) > len(dst) {
			return nDst, nSrc, transform.ErrShortDst
		}
		nDst += utf8.EncodeRune(dst[nDst:], r)
		nSrc += size
	}
	return nDst, nSrc, nil
}
