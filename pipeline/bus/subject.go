package bus

import (
	"errors"
	"fmt"
	"net/url"
)

// Subjects. Names in them are written by token.
const (
	readingsSubject = "thawledger.readings." // + station
	standingSubject = "thawledger.standing." // + site.surface
	changedSubject  = "thawledger.changed"
)

// token writes a name as one part of a subject: letters, digits, - and _ stand
// for themselves, every other byte becomes % and two hexadecimal digits. Thus
// "NO-12.b" becomes "NO-12%2Eb".
func token(what, name string) (string, error) {
	if name == "" {
		return "", fmt.Errorf("no %s", what)
	}
	if len(name) > MaxTextBytes {
		return "", fmt.Errorf("%w: %s of %d bytes, at most %d", ErrTooLong, what, len(name), MaxTextBytes)
	}
	const hex = "0123456789ABCDEF"
	b := make([]byte, 0, len(name))
	for i := range len(name) {
		c := name[i]
		if plain(c) {
			b = append(b, c)
		} else {
			b = append(b, '%', hex[c>>4], hex[c&15])
		}
	}
	return string(b), nil
}

func plain(c byte) bool {
	return 'a' <= c && c <= 'z' || 'A' <= c && c <= 'Z' || '0' <= c && c <= '9' || c == '-' || c == '_'
}

// untoken returns the name that token wrote.
func untoken(s string) (string, error) {
	name, err := url.PathUnescape(s)
	if err == nil && name == "" {
		err = errors.New("empty")
	}
	return name, err
}
