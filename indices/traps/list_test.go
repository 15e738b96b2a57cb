package traps

import (
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// The list in doc.go has the twenty traps, and every test that it names is there.
func TestListNamesWhatThereIs(t *testing.T) {
	text, err := os.ReadFile("doc.go")
	if err != nil {
		t.Fatal(err)
	}
	trap := regexp.MustCompile(`^//\t *(\d+) \S`)
	named := regexp.MustCompile(`((?:[a-z]+/)*[a-z]+)\.(Test\w+)`)
	code := map[string]string{}
	count := []int{}
	for line := range strings.Lines(string(text)) {
		if m := trap.FindStringSubmatch(line); m != nil {
			if n, _ := strconv.Atoi(m[1]); n != len(count)+1 {
				t.Errorf("trap %d stands in place %d", n, len(count)+1)
			}
			count = append(count, 0)
			continue
		}
		for _, m := range named.FindAllStringSubmatch(line, -1) {
			count[len(count)-1]++
			if _, ok := code[m[1]]; !ok {
				code[m[1]] = tests(t, m[1])
			}
			if !strings.Contains(code[m[1]], "func "+m[2]+"(t *testing.T)") {
				t.Errorf("trap %d: there is no %s in %s", len(count), m[2], m[1])
			}
		}
	}
	if len(count) != 20 {
		t.Errorf("%d traps listed", len(count))
	}
	for i, n := range count {
		if n == 0 {
			t.Errorf("trap %d has no test", i+1)
		}
	}
}

// tests returns the test files of a folder.
func tests(t *testing.T, folder string) string {
	t.Helper()
	files, err := filepath.Glob(filepath.Join("..", "..", filepath.FromSlash(folder), "*_test.go"))
	if err != nil || len(files) == 0 {
		t.Errorf("no tests in %s (%v)", folder, err)
	}
	var all strings.Builder
	for _, f := range files {
		b, err := os.ReadFile(f)
		if err != nil {
			t.Fatal(err)
		}
		all.Write(b)
	}
	return all.String()
}
