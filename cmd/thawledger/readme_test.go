package main

import (
	"bytes"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"thawledger/pipeline/localpg"
	"thawledger/pipeline/pipelinetest"
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
	pipelinetest.Server(t, "postgres") // says so where there is no server
	blocks := readme(t)
	if len(blocks["yaml"]) != 1 || len(blocks["csv"]) != 1 || len(blocks["text"]) != 2 || len(blocks["sql"]) < 5 {
		t.Fatal("README.md has other blocks than this test knows")
	}
	dir := publicFolder(t)
	file := filepath.Join(dir, "settings.yaml")
	write := func(path, text string) {
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	write(file, blocks["yaml"][0])
	if err := os.Mkdir(filepath.Join(dir, "arrivals"), 0o755); err != nil {
		t.Fatal(err)
	}
	write(filepath.Join(dir, "arrivals", "tarn_2025.csv"), blocks["csv"][0])

	var out, log bytes.Buffer
	p := program{out: &out, err: &log}
	if status := p.main(t.Context(), []string{"run", "--until-idle", "--settings", file}); status != 0 {
		t.Fatalf("status %d\n%s", status, log.String())
	}
	has(t, out.String(), blocks["text"][1])
	out.Reset()
	if status := p.main(t.Context(), []string{"standing", "--settings", file}); status != 0 {
		t.Fatalf("status %d\n%s", status, log.String())
	}
	has(t, out.String(), blocks["text"][0])

	set, err := p.load(file)
	if err != nil {
		t.Fatal(err)
	}
	_, done, err := p.reading(t.Context(), set)
	if err != nil {
		t.Fatal(err)
	}
	defer done()
	url := localpg.DSN(filepath.Join(dir, "data", "postgresql"), "postgres")
	for _, block := range blocks["sql"] {
		for _, sql := range strings.SplitAfter(strings.TrimSpace(block), ";") {
			if sql = strings.TrimSuffix(strings.TrimSpace(sql), ";"); sql == "" {
				continue
			}
			if rows := pipelinetest.Rows(t, url, sql); len(rows) == 0 {
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
