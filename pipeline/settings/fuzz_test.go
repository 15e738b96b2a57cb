package settings

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// Any bytes give settings that are shown and read again to the same, or faults
// with their places.
func FuzzParse(f *testing.F) {
	f.Add([]byte(records(`{what: moved, on: 2020-01-01}`, "", goodJoined, "")))
	f.Add([]byte("a: &a [*a, *a]\nb: [*a, *a]\n"))
	f.Add([]byte("stations: {table: none.csv}\nfeeds: []\nlayouts: {}\n"))
	f.Add([]byte(forms(`widths: [4, 5], quote: none, preamble_ends: "^x", data_line: 3`, `columns: [[1, 2], 3], format: epoch, covers: instant`, "preamble: (x)", `{column: [2], when: {3: [a, ""]}, variable: air_temp, unit: degC, scale: 2}`)))
	f.Add([]byte(forms("", `columns: [[a, b], c], format: x, zone: A/b, ambiguous: later, skipped: shift, covers: instant`, "column: [a, b]", `{column: [c, d], variable: air_temp, unit: K, offset: -1, flag: {column: [e, f], marks: {}}}`)))
	f.Add([]byte("\xff\xfe"))
	f.Add([]byte("- 1\n"))
	region, err := os.ReadFile(filepath.Join("..", "..", "cmd", "thawledger", "region", "settings.yaml"))
	if err != nil {
		f.Fatal(err)
	}
	f.Add(region)
	f.Fuzz(func(t *testing.T, data []byte) {
		if strings.Contains(string(data), "_file") || strings.Contains(string(data), "table") {
			return // names of files: what is on this machine is nobody's input
		}
		s, _, err := Parse("s", data, "")
		if err != nil {
			for line := range strings.Lines(err.Error()) {
				if !strings.HasPrefix(line, "s:") && strings.TrimSpace(line) != "" && !strings.Contains(err.Error(), "s:") {
					t.Fatalf("without a place: %q", line)
				}
			}
			return
		}
		again, _, err := Parse("s", []byte(s.Text()), "")
		if err != nil {
			t.Fatalf("not read again: %v\n%s", err, s.Text())
		}
		if again.Hash != s.Hash {
			t.Fatalf("read again to something else:\n%s\n%s", s.Text(), again.Text())
		}
	})
}
