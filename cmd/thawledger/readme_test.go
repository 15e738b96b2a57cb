package main

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// readme returns the fenced blocks of README.md, by language.
func readme(t *testing.T) map[string][]string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "README.md"))
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]string{}
	for _, m := range regexp.MustCompile("(?ms)^```([a-z]+)\n(.*?)^```$").FindAllStringSubmatch(string(text), -1) {
		out[m[1]] = append(out[m[1]], m[2])
	}
	return out
}

// TestReadme does what README.md tells its reader to do, and sees what it says
// that he will see.
func TestReadme(t *testing.T) {
	blocks := readme(t)
	if len(blocks["yaml"]) != 1 || len(blocks["csv"]) != 1 || len(blocks["text"]) != 2 || len(blocks["sql"]) < 5 {
		t.Fatal("README.md has other blocks than this test knows")
	}
	p := newPlace(t, blocks["yaml"][0], map[string]string{"arrivals/tarn_2025.csv": blocks["csv"][0]})
	has(t, p.run(t, "run", "--until-idle"), blocks["text"][1])
	has(t, p.run(t, "standing"), blocks["text"][0])
	for _, block := range blocks["sql"] {
		for _, sql := range strings.SplitAfter(strings.TrimSpace(block), ";") {
			if sql = strings.TrimSuffix(strings.TrimSpace(sql), ";"); sql != "" && len(p.rows(t, sql)) == 0 {
				t.Errorf("nothing comes of %s", sql)
			}
		}
	}
}

// has compares without regard to blanks at the ends of lines.
func has(t *testing.T, got, want string) {
	t.Helper()
	blanks := regexp.MustCompile(`(?m)[ \t]+$`)
	if !strings.Contains(blanks.ReplaceAllString(got, ""), strings.TrimSpace(blanks.ReplaceAllString(want, ""))) {
		t.Errorf("README.md says\n%s\nit is\n%s", want, got)
	}
}

// DEVELOPERS.md names tests and files; they are there.
func TestDevelopersNamesWhatThereIs(t *testing.T) {
	root := filepath.Join("..", "..")
	text, err := os.ReadFile(filepath.Join(root, "DEVELOPERS.md"))
	if err != nil {
		t.Fatal(err)
	}
	var code strings.Builder
	err = filepath.WalkDir(root, func(path string, e os.DirEntry, err error) error {
		if err == nil && strings.HasSuffix(path, "_test.go") {
			b, err := os.ReadFile(path)
			code.Write(b)
			return err
		}
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	names := regexp.MustCompile(`\b(Test|Fuzz)[A-Z]\w+`).FindAllString(string(text), -1)
	if len(names) < 20 {
		t.Errorf("only %d tests named", len(names))
	}
	for _, name := range names {
		if !strings.Contains(code.String(), "func "+name+"(") {
			t.Errorf("DEVELOPERS.md names %s, which there is not", name)
		}
	}
	for _, m := range regexp.MustCompile("`((?:pipeline|ingest|indices|alerts|cmd|deploy|testdata)/[\\w./]+\\w)`").FindAllStringSubmatch(string(text), -1) {
		if _, err := os.Stat(filepath.Join(root, m[1])); err != nil {
			t.Errorf("DEVELOPERS.md: %v", err)
		}
	}
}
