package normal

import "fmt"

// maxOffsetS is the largest offset of a zone from UTC, east or west (zones in
// use go from -12:00 to +14:00).
const maxOffsetS = 14 * 3600

// ParseOffset reads a fixed offset of local time from UTC, such as "Z", "+03:00"
// or "-09:00", and returns it in s, + east of Greenwich.
func ParseOffset(text string) (int32, error) {
	if text == "Z" {
		return 0, nil
	}
	wrong := func(why string) (int32, error) {
		return 0, fmt.Errorf("%q is no offset from UTC such as Z, +03:00 or -09:00%s", text, why)
	}
	if len(text) != 6 || text[0] != '+' && text[0] != '-' || text[3] != ':' {
		return wrong("")
	}
	for _, i := range [...]int{1, 2, 4, 5} {
		if text[i] < '0' || text[i] > '9' {
			return wrong("")
		}
	}
	h := int32(text[1]-'0')*10 + int32(text[2]-'0')
	m := int32(text[4]-'0')*10 + int32(text[5]-'0')
	s := h*3600 + m*60
	if m > 59 {
		return wrong(": minutes are 00 to 59")
	}
	if s > maxOffsetS {
		return wrong(": the largest is 14:00")
	}
	if text[0] == '-' {
		s = -s
	}
	return s, nil
}
