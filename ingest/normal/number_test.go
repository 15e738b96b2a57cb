package normal_test

import (
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

func TestParseNumber(t *testing.T) {
	tests := []struct {
		name, text string
		want       float64
		err        string
	}{
		{name: "whole", text: "12", want: 12},
		{name: "negative", text: "-12.5", want: -12.5},
		{name: "plus", text: "+0.1", want: 0.1},
		{name: "blanks around", text: " \t-9999.0 ", want: -9999},
		{name: "no digit before the point", text: "-.234", want: -0.234},
		{name: "no digit after the point", text: "23.", want: 23},
		{name: "exponent", text: "1.25e+1", want: 12.5},
		{name: "negative exponent", text: "125E-1", want: 12.5},
		{name: "leading zeros", text: "000000000000000000000000000012.5", want: 12.5},
		{name: "many digits", text: "0.349065850398866123456789", want: 0.349065850398866123456789},
		{name: "too small", text: "1e-999", want: 0},

		{name: "empty", text: "", err: "there is no number; one such as -12.5 is right"},
		{name: "blank", text: "  ", err: "there is no number; one such as -12.5 is right"},
		{name: "sign only", text: "-", err: `"-" is no number such as -12.5: it ends where a digit is right`},
		{name: "point only", text: ".", err: `"." is no number such as -12.5: it ends where a digit is right`},
		{name: "decimal comma", text: "12,5", err: `"12,5" is no number such as -12.5: found ',' at character 3; the decimal mark is a point where the layout does not say decimal: ",", and thousands have none`},
		{name: "thousands", text: "1,234.5", err: `"1,234.5" is no number such as -12.5: found ',' at character 2; the decimal mark is a point where the layout does not say decimal: ",", and thousands have none`},
		{name: "not a number", text: "NaN", err: `"NaN" is no number such as -12.5: found 'N' at character 1; a text that stands for no value is declared as missing`},
		{name: "infinity", text: "-inf", err: `"-inf" is no number such as -12.5: found 'i' at character 2; a text that stands for no value is declared as missing`},
		{name: "trace", text: "T", err: `"T" is no number such as -12.5: found 'T' at character 1; a text that stands for no value is declared as missing`},
		{name: "hexadecimal", text: "0x1p4", err: `"0x1p4" is no number such as -12.5: found 'x' at character 2`},
		{name: "underscore", text: "1_000", err: `"1_000" is no number such as -12.5: found '_' at character 2`},
		{name: "flag in the cell", text: "-3.5E", err: `"-3.5E" is no number such as -12.5: it ends where a digit is right`},
		{name: "minus that is none", text: "−3", err: `"−3" is no number such as -12.5: found '−' at character 1; a text that stands for no value is declared as missing`},
		{name: "two points", text: "1.2.3", err: `"1.2.3" is no number such as -12.5: found '.' at character 4`},
		{name: "blank inside", text: "1 2", err: `"1 2" is no number such as -12.5: found ' ' at character 2`},
		{name: "too large", text: "1e400", err: `"1e400" is too large a number`},
		{name: "long", text: strings.Repeat("9", 70) + "x", err: `"` + strings.Repeat("9", 60) + `"... is no number such as -12.5: found 'x' at character 71`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := normal.ParseNumber([]byte(tt.text))
			if errText(err) != tt.err {
				t.Fatalf("error\n got %s\nwant %s", errText(err), tt.err)
			}
			if got != tt.want {
				t.Errorf("got %v, want %v", got, tt.want)
			}
		})
	}
}

func TestParseDecimalComma(t *testing.T) {
	tests := []struct {
		name, text string
		want       float64
		err        string
	}{
		{name: "comma", text: "-12,5", want: -12.5},
		{name: "no digit before the comma", text: ",5", want: 0.5},
		{name: "no digit after the comma", text: "23,", want: 23},
		{name: "exponent", text: "1,25e+1", want: 12.5},
		{name: "whole", text: "12", want: 12},
		{name: "many digits", text: "0,349065850398866123456789", want: 0.349065850398866123456789},
		{name: "point", text: "12.5", err: `"12.5" is no number such as -12,5: found '.' at character 3; the layout says decimal: ",", and thousands have no mark`},
		{name: "thousands", text: "1.234,5", err: `"1.234,5" is no number such as -12,5: found '.' at character 2; the layout says decimal: ",", and thousands have no mark`},
		{name: "two commas", text: "1,2,3", err: `"1,2,3" is no number such as -12,5: found ',' at character 4`},
		{name: "comma only", text: ",", err: `"," is no number such as -12,5: it ends where a digit is right`},
		{name: "empty", text: "", err: "there is no number; one such as -12,5 is right"},
		{name: "too large", text: "1,5e400", err: `"1,5e400" is too large a number`},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := normal.ParseDecimal([]byte(tt.text), ',')
			if errText(err) != tt.err || got != tt.want {
				t.Errorf("got %v, %s\nwant %v, %s", got, errText(err), tt.want, tt.err)
			}
		})
	}
}

var grammar = regexp.MustCompile(`^[ \t]*[+-]?([0-9]+\.?[0-9]*|\.[0-9]+)([eE][+-]?[0-9]+)?[ \t]*$`)

// checkNumber compares ParseNumber with the grammar and the standard library.
func checkNumber(t interface{ Fatalf(string, ...any) }, text string) {
	got, err := normal.ParseNumber([]byte(text))
	want, wantErr := strconv.ParseFloat(strings.Trim(text, " \t"), 64)
	if ok := grammar.MatchString(text) && wantErr == nil; ok != (err == nil) {
		t.Fatalf("%q: got %v, %v; want %v, %v", text, got, err, want, wantErr)
	}
	if err == nil && math.Float64bits(got) != math.Float64bits(want) {
		t.Fatalf("%q: got %v, want %v", text, got, want)
	}
	comma, commaErr := normal.ParseDecimal([]byte(strings.ReplaceAll(text, ".", ",")), ',')
	if plain := !strings.Contains(text, ","); plain && (math.Float64bits(comma) != math.Float64bits(got) || (commaErr == nil) != (err == nil)) {
		t.Fatalf("%q with a comma: got %v, %v; want %v, %v", text, comma, commaErr, got, err)
	}
}

func TestNumbersAgainstStandardLibrary(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		checkNumber(t, rapid.StringMatching(`[+-]?[0-9]{0,18}\.?[0-9]{0,18}([eE][+-]?[0-9]{1,3})?`).Draw(t, "text"))
	})
}

func FuzzNumber(f *testing.F) {
	for _, s := range []string{"-12.5", "+.5e-3", " 9007199254740993 ", "1e23", "0x1p4", "1_0", "NaN", "-Inf", "12,5", "\x00", "0e99999999999999999999"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) { checkNumber(t, text) })
}

func TestCelsius(t *testing.T) {
	tests := []struct {
		name string
		v    float64
		unit pipeline.TempUnit
		want float64
		err  string
	}{
		{name: "celsius", v: -12.5, unit: pipeline.DegC, want: -12.5},
		// 0 degC = 32 degF = 273.15 K: BIPM SI Brochure, 9th edition, 2019, section 2.3.1; NIST SP 811, appendix B.
		{name: "fahrenheit", v: 32, unit: pipeline.DegF, want: 0},
		{name: "kelvin", v: 273.15, unit: pipeline.Kelvin, want: 0},
		{name: "tenths", v: -125, unit: pipeline.TenthsDegC, want: -12.5},
		{name: "lowest", v: -100, unit: pipeline.DegC, want: -100},
		{name: "highest", v: 100, unit: pipeline.DegC, want: 100},
		{name: "below", v: -9999, unit: pipeline.DegC, err: "-9999 degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value"},
		{name: "above", v: 100.5, unit: pipeline.DegC, err: "100.5 degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value"},
		{name: "fahrenheit above", v: 400, unit: pipeline.DegF, err: "400 degF is 204.444 degC, outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value"},
		{name: "unknown unit", v: 1, unit: "degR", err: `unknown temperature unit "degR"`},
		{name: "no number", v: math.NaN(), unit: pipeline.DegC, err: "NaN degC is outside -100 to +100 degC; check the unit, or declare the text as missing if it stands for no value"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			got, err := normal.Celsius(tt.v, tt.unit)
			if errText(err) != tt.err {
				t.Fatalf("error\n got %s\nwant %s", errText(err), tt.err)
			}
			if got != tt.want {
				t.Errorf("got %v, want %v", got, tt.want)
			}
		})
	}
	if c, _ := normal.Celsius(math.Copysign(0, -1), pipeline.DegC); math.Signbit(c) {
		t.Error("a negative zero came through")
	}
}

func TestParseOffset(t *testing.T) {
	tests := []struct {
		text string
		want int32
		err  string
	}{
		{text: "Z", want: 0},
		{text: "+00:00", want: 0},
		{text: "+03:00", want: 10800},
		{text: "-09:00", want: -32400},
		{text: "-03:30", want: -12600},
		{text: "+14:00", want: 50400},
		{text: "", err: `"" is no offset from UTC such as Z, +03:00 or -09:00`},
		{text: "UTC", err: `"UTC" is no offset from UTC such as Z, +03:00 or -09:00`},
		{text: "-9:00", err: `"-9:00" is no offset from UTC such as Z, +03:00 or -09:00`},
		{text: "+0a:00", err: `"+0a:00" is no offset from UTC such as Z, +03:00 or -09:00`},
		{text: "+03:60", err: `"+03:60" is no offset from UTC such as Z, +03:00 or -09:00: minutes are 00 to 59`},
		{text: "-14:01", err: `"-14:01" is no offset from UTC such as Z, +03:00 or -09:00: the largest is 14:00`},
	}
	for _, tt := range tests {
		t.Run(tt.text, func(t *testing.T) {
			got, err := normal.ParseOffset(tt.text)
			if errText(err) != tt.err || got != tt.want {
				t.Errorf("got %d, %q; want %d, %q", got, errText(err), tt.want, tt.err)
			}
		})
	}
}
