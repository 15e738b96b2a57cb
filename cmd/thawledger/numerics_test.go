package main

import (
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
	"testing"
)

var numericsColumns = []string{"method", "source", "check value", "ours", "difference", "test"}

// numerics returns the rows of the table of DEVELOPERS.md's section Numerics.
func numerics(t *testing.T) (rows [][]string) {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "DEVELOPERS.md"))
	if err != nil {
		t.Fatal(err)
	}
	_, section, ok := strings.Cut(string(text), "\n## Numerics\n")
	if !ok {
		t.Fatal("DEVELOPERS.md has no section Numerics")
	}
	section, _, _ = strings.Cut(section, "\n## ")
	for line := range strings.Lines(section) {
		if line = strings.TrimSpace(line); !strings.HasPrefix(line, "|") {
			continue
		}
		cells := strings.Split(strings.Trim(line, "|"), "|")
		for i := range cells {
			cells[i] = strings.TrimSpace(cells[i])
		}
		rows = append(rows, cells)
	}
	if len(rows) < 3 || !slices.Equal(rows[0], numericsColumns) || strings.Trim(strings.Join(rows[1], ""), "-") != "" {
		t.Fatalf("the section has no table with the columns %q", numericsColumns)
	}
	return rows[2:]
}

// testFile is a file of tests.
type testFile struct{ folder, text string }

// testFiles returns the files that each test stands in, by its name.
func testFiles(t *testing.T) map[string][]testFile {
	t.Helper()
	root, out := filepath.Join("..", ".."), map[string][]testFile{}
	function := regexp.MustCompile(`(?m)^func (Test[A-Z]\w*)\(t \*testing\.T\)`)
	err := filepath.WalkDir(root, func(path string, e os.DirEntry, err error) error {
		if err != nil || !strings.HasSuffix(path, "_test.go") {
			return err
		}
		text, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		folder, err := filepath.Rel(root, filepath.Dir(path))
		for _, m := range function.FindAllSubmatch(text, -1) {
			out[string(m[1])] = append(out[string(m[1])], testFile{filepath.ToSlash(folder), string(text)})
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return out
}

// TestNumericsTable: every row says what is computed, by whose word it is right,
// and which test holds it to that; figures in code type stand in the test. Every
// package of arithmetic has a row.
func TestNumericsTable(t *testing.T) {
	named := regexp.MustCompile("`(Test\\w+)`(?: of `([\\w/]+)`)?")
	figure := regexp.MustCompile("`([^`]+)`")
	files, seen := testFiles(t), map[string]bool{}
	rows, figures := numerics(t), 0
	for _, row := range rows {
		what := strings.Join(row, " | ")
		if len(row) != len(numericsColumns) {
			t.Errorf("%d columns instead of %d: %s", len(row), len(numericsColumns), what)
			continue
		}
		for i, cell := range row {
			if strings.Trim(cell, "-–?. ") == "" {
				t.Errorf("no %s: %s", numericsColumns[i], what)
			}
		}
		// a source has a year, a number or a page, or it is said that there is none
		if source := row[1]; !strings.ContainsAny(source, "0123456789") && !strings.Contains(source, "no source") && !strings.Contains(source, "from memory") {
			t.Errorf("%q is no source: %s", source, what)
		}
		var text strings.Builder
		tests := named.FindAllStringSubmatch(row[5], -1)
		if len(tests) == 0 {
			t.Errorf("no test: %s", what)
		}
		for _, m := range tests {
			found := slices.DeleteFunc(slices.Clone(files[m[1]]), func(f testFile) bool { return m[2] != "" && f.folder != m[2] })
			if len(found) != 1 {
				t.Errorf("%d tests are called %s in %q: %s", len(found), m[1], m[2], what)
				continue
			}
			seen[found[0].folder] = true
			text.WriteString(found[0].text)
		}
		for _, m := range figure.FindAllStringSubmatch(row[2], -1) {
			figures++
			if !regexp.MustCompile(`(^|[^\d.])` + regexp.QuoteMeta(m[1]) + `($|[^\d])`).MatchString(text.String()) {
				t.Errorf("%s is not in the test: %s", m[1], what)
			}
		}
	}
	if len(rows) < 60 || figures < 60 {
		t.Errorf("%d rows with %d figures that stand in tests: some are gone", len(rows), figures)
	}
	for _, folder := range pure {
		if !seen[folder] && !slices.Contains([]string{"pipeline", "ingest/csvfeed"}, folder) { // pipeline's units are tested where they are used
			t.Errorf("no row of the table is tested in %s", folder)
		}
	}
}
