package gather

import (
	"crypto/sha256"
	"encoding/hex"
	"strings"

	"thawledger/pipeline"
)

// About names a standing: one surface's index of one kind and definition against
// its design value, in one season. A design value that takes another's place
// leaves the name as it is. At most 80 of the characters a-z A-Z 0-9 . _ -
func About(site, surface string, kind pipeline.Kind, definition pipeline.Definition, of pipeline.Of, direction pipeline.Direction, season string) string {
	sum := sha256.Sum256([]byte(strings.Join([]string{site, surface, string(kind), string(definition), string(of), string(direction), season}, "\x00")))
	return readable(site) + "." + readable(surface) + "." + hex.EncodeToString(sum[:4]) + "." + readable(season)
}

// readable keeps enough of a name to be known by.
func readable(name string) string {
	var b strings.Builder
	for _, r := range name {
		if b.Len() == 20 {
			break
		}
		switch {
		case 'a' <= r && r <= 'z', 'A' <= r && r <= 'Z', '0' <= r && r <= '9', r == '_', r == '-':
			b.WriteRune(r)
		default:
			b.WriteByte('-')
		}
	}
	return b.String()
}
