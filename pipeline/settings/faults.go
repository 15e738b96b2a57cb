package settings

import (
	"cmp"
	"fmt"
	"slices"
	"strings"
)

// Fault is one thing that is wrong in the settings.
type Fault struct {
	File      string
	Line, Col int
	Path      string // as stations[2].utc_offset
	Wrong     string
	Right     string // "" where nothing can be said
}

// String returns file:line:col: path: what is wrong; what would be right.
func (f Fault) String() string {
	s := fmt.Sprintf("%s:%d:%d: ", f.File, f.Line, f.Col)
	if f.Path != "" {
		s += f.Path + ": "
	}
	s += f.Wrong
	if f.Right != "" {
		s += "; " + f.Right
	}
	return s
}

// Faults is everything that is wrong, in the order of the file.
type Faults []Fault

// Error returns one fault a line.
func (f Faults) Error() string {
	lines := make([]string, len(f))
	for i := range f {
		lines[i] = f[i].String()
	}
	return strings.Join(lines, "\n")
}

func (f Faults) sorted() Faults {
	slices.SortStableFunc(f, func(a, b Fault) int {
		return cmp.Or(cmp.Compare(a.File, b.File), cmp.Compare(a.Line, b.Line), cmp.Compare(a.Col, b.Col))
	})
	return f
}

// nearest returns the known word that is closest to one, if any is close.
func nearest(word string, known []string) string {
	best, least := "", 3
	for _, k := range known {
		if d := distance(word, k); d < least || d == least && len(k) > 8 && best == "" {
			best, least = k, d
		}
	}
	return best
}

// distance is the number of letters to put in, leave out or change (V. I.
// Levenshtein, 1966).
func distance(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		corner := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := corner
			if a[i] != b[j] {
				change++
			}
			corner = row[j+1]
			row[j+1] = min(change, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
