package normal

import (
	"fmt"
	"strconv"
	"strings"
)

// exactPowers holds the powers of ten that float64 has exactly.
var exactPowers = [...]float64{
	1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11,
	1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
}

// ParseNumber reads a decimal number: sign, digits with or without a point
// (".5" and "5.", as loggers write, included), exponent; sign and exponent may
// be left out, blanks around it are let be. It returns the float64 next to the
// number, always finite. Hexadecimal, underscores, infinities, NaN, thousands
// marks and the decimal comma are errors; ParseDecimal reads the latter.
//
// Up to 2^53 and ten to the 22nd both the digits and the power of ten are exact
// in float64, so one multiplication or division rounds right (W. D. Clinger, How
// to read floating point numbers accurately, 1990); all else is left to strconv.
func ParseNumber(text []byte) (float64, error) { return ParseDecimal(text, '.') }

// ParseDecimal is ParseNumber with another decimal mark: a point or a comma. The
// one that is not the mark is an error.
func ParseDecimal(text []byte, mark byte) (float64, error) {
	text = Trim(text)
	i := 0
	negative := false
	if i < len(text) && (text[i] == '-' || text[i] == '+') {
		negative = text[i] == '-'
		i++
	}
	var m uint64
	digits, scale := 0, 0
	point := false
	for ; i < len(text); i++ {
		c := text[i] - '0'
		if c <= 9 {
			digits++
			if m < 1e17 { // past it the rest is left to strconv, whatever digits follow
				m = m*10 + uint64(c)
			}
			if point {
				scale--
			}
			continue
		}
		if text[i] != mark || point {
			break
		}
		point = true
	}
	if digits == 0 {
		return 0, noNumber(text, i, digits, mark)
	}
	if i < len(text) && text[i]|0x20 == 'e' {
		i++
		down := false
		if i < len(text) && (text[i] == '-' || text[i] == '+') {
			down = text[i] == '-'
			i++
		}
		first, e := i, 0
		for ; i < len(text) && text[i]-'0' <= 9; i++ {
			e = min(e*10+int(text[i]-'0'), 1e6)
		}
		if i == first {
			return 0, noNumber(text, i, digits, mark)
		}
		if down {
			e = -e
		}
		scale += e
	}
	if i < len(text) {
		return 0, noNumber(text, i, digits, mark)
	}
	if m >= 1<<53 || scale < -22 || scale > 22 {
		return parseSlowly(text, mark)
	}
	v := float64(m)
	if scale < 0 {
		v /= exactPowers[-scale]
	} else {
		v *= exactPowers[scale]
	}
	if negative {
		v = -v
	}
	return v, nil
}

// parseSlowly reads what is known to be written as a number.
func parseSlowly(text []byte, mark byte) (float64, error) {
	v, err := strconv.ParseFloat(strings.Replace(string(text), string(rune(mark)), ".", 1), 64)
	if err != nil {
		return 0, fmt.Errorf("%s is too large a number", Quote(text))
	}
	return v, nil
}

// noNumber says where text stops being a number: at byte i, after so many digits.
func noNumber(text []byte, i, digits int, mark byte) error {
	example, other, words := "-12.5", byte(','), `the decimal mark is a point where the layout does not say decimal: ",", and thousands have none`
	if mark == ',' {
		example, other, words = "-12,5", '.', `the layout says decimal: ",", and thousands have no mark`
	}
	if len(text) == 0 {
		return fmt.Errorf("there is no number; one such as %s is right", example)
	}
	what := "it ends where a digit is right"
	if i < len(text) {
		what = found(text, i)
		switch {
		case text[i] == other:
			what += "; " + words
		case digits == 0:
			what += "; a text that stands for no value is declared as missing"
		}
	}
	return fmt.Errorf("%s is no number such as %s: %s", Quote(text), example, what)
}
