package text

import (
	"flag"
	"html"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

var update = flag.Bool("update", false, "write golden files anew; look at what changed")

func load(t *testing.T) *Texts {
	t.Helper()
	x, err := Load("")
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// What people read, word for word. The files are looked at when they change.
func TestGolden(t *testing.T) {
	x := load(t)
	for _, n := range delivery.Samples() {
		w, err := x.Write(n)
		if err != nil {
			t.Fatal(err)
		}
		golden(t, n.Key+".txt", "Subject: "+w.Subject+"\n\n"+w.Plain)
		if n.Key == "n-31-0821-1" || n.Key == "n-31-0821-8" {
			golden(t, n.Key+".html", w.HTML)
		}
	}
}

func golden(t *testing.T, name, got string) {
	t.Helper()
	file := filepath.Join("testdata", "golden", name)
	if *update {
		if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), got); diff != "" {
		t.Errorf("%s (-want +got); run with -update if it is meant:\n%s", name, diff)
	}
}

func TestSubjects(t *testing.T) {
	x := load(t)
	for key, want := range map[string]string{
		"n-31-0821-1":  "Fellmoor airstrip, runway: thaw index past its design value (1703 of 1700 degC.d)",
		"n-31-0821-2":  "Fellmoor airstrip, runway: thaw index past its design value (3066 of 3060 degF.d)",
		"n-31-0821-4":  "Fellmoor airstrip, runway: thaw index expected to pass its design value about 2 September (1551 of 1700 degC.d)",
		"n-31-0821-5":  "Fellmoor airstrip, runway: thaw index may be past its design value, days are missing (1648 to 1741 of 1700 degC.d)",
		"n-31-0821-6":  "Withdrawn: Fellmoor airstrip, runway: thaw index not past its design value after all, but near it (1699.7 of 1700 degC.d)",
		"n-31-0821-7":  "Cold Bight, ice road: freezing index fell short of its design value (2288 of 2400 degC.d)",
		"n-31-0821-8":  "Fellmoor airstrip, runway: thaw index past its design value (1703 of 1700 degC.d) and 2 more",
		"n-31-0821-9":  "Reminder: Fellmoor airstrip, runway: thaw index past its design value (1703 of 1700 degC.d)",
		"n-31-0821-10": "Exercise: Fellmoor airstrip, runway: thaw index, exercise only (0 of 1700 degC.d)",
	} {
		for _, n := range delivery.Samples() {
			if n.Key != key {
				continue
			}
			w, err := x.Write(n)
			if err != nil {
				t.Fatal(err)
			}
			if w.Subject != want {
				t.Errorf("%s: %q, want %q", key, w.Subject, want)
			}
		}
	}
}

// Plain text and HTML say the same: every line of the plain text that is a
// sentence is in the HTML.
func TestHTMLSaysTheSame(t *testing.T) {
	x := load(t)
	tags := regexp.MustCompile(`(?s)<style>.*</style>|<[^>]*>`)
	for _, n := range delivery.Samples() {
		w, err := x.Write(n)
		if err != nil {
			t.Fatal(err)
		}
		page := html.UnescapeString(tags.ReplaceAllString(w.HTML, ""))
		for line := range strings.Lines(w.Plain) {
			line = strings.TrimSpace(line)
			if label, rest, found := strings.Cut(line, ": "); found && (strings.ToUpper(label) == label || label == "Seen" || label == "Put off") {
				line = rest
			}
			if len(line) < 20 || strings.HasPrefix(line, "---") || strings.HasPrefix(line, "https:") || strings.HasPrefix(line, "REMINDER.") || strings.HasPrefix(line, "EXERCISE.") {
				continue
			}
			for part := range strings.SplitSeq(line, ": ") { // the page has figures on a line of their own
				if !strings.Contains(page, part) {
					t.Errorf("%s: the page lacks %q", n.Key, part)
				}
			}
		}
		if strings.Contains(w.HTML, "ZgotmplZ") {
			t.Errorf("%s: the page has an address that was refused", n.Key)
		}
	}
}

// What people type in comes out as text.
func TestTypedInTextStaysText(t *testing.T) {
	n := delivery.Samples()[0]
	n.Items[0].SiteName = `<img src=x onerror=alert(1)>` + "\r\nBcc: all"
	n.Items[0].Instruction = "</p><script>alert(2)</script>\r\n\r\nsecond line"
	n.SeenURL = "javascript:alert(3)"
	w, err := load(t).Write(n)
	if err != nil {
		t.Fatal(err)
	}
	if strings.ContainsAny(w.Subject, "\r\n") {
		t.Errorf("subject has two lines: %q", w.Subject)
	}
	for _, bad := range []string{"<img src=x", "<script>", `href="javascript`} {
		if strings.Contains(w.HTML, bad) {
			t.Errorf("the page has %s", bad)
		}
	}
	if !strings.Contains(w.Plain, "second line") {
		t.Error("an instruction's second line is lost")
	}
}

func TestPicturesAreThoseThatThePageShows(t *testing.T) {
	x := load(t)
	for _, n := range delivery.Samples()[6:8] {
		w, err := x.Write(n)
		if err != nil {
			t.Fatal(err)
		}
		pictures, err := Pictures(n)
		if err != nil {
			t.Fatal(err)
		}
		if got, want := len(pictures), strings.Count(w.HTML, "<img "); got != want {
			t.Errorf("%s: %d pictures, %d on the page", n.Key, got, want)
		}
		for _, p := range pictures {
			if !strings.Contains(w.HTML, `src="cid:`+p.ID+`"`) || !strings.Contains(html.UnescapeString(w.HTML), p.Alt) {
				t.Errorf("%s: the page lacks %s or its words", n.Key, p.ID)
			}
		}
	}
}

func TestOwnTemplates(t *testing.T) {
	for _, test := range []struct {
		name, file, content string
		wrong               string // what the error has; empty for none
	}{
		{"shorter text", "notice.txt", "{{range .Items}}{{.Where}}: {{.Claim}}\n{{end}}{{.Caution}}", ""},
		{"own subject", "subject.txt", "[thaw] {{.Headline}}", ""},
		{"field that is not there", "notice.txt", "{{range .Items}}\n{{.Wher}}\n{{end}}{{.Caution}}", "notice.txt:2:2: "},
		{"unclosed", "notice.html", "<p>\n{{range .Items}}\n{{.Where}}\n", "notice.html:4: "},
		{"no such function", "subject.txt", "{{shout .Headline}}", "subject.txt:1: "},
		{"half a tag", "notice.html", "<p>{{.Caution}}</p>\n<a href=\n{{if .Mark}}\"{{end}}>", "notice.html:3"},
		{"no caution", "notice.txt", "{{range .Items}}{{.Where}}{{end}}", "notice.txt: does not show {{.Caution}}"},
		{"no caution on the page", "notice.html", "<p>{{.Headline}}</p>", "notice.html: does not show {{.Caution}}"},
		{"nothing", "subject.txt", "{{/* later */}}", "subject.txt: writes nothing"},
		{"misspelt name", "notice.text", "x", "notice.text: is none of"},
		{"only with a chart", "notice.txt", "{{(index .Items 0).Chart.Alt}}{{.Caution}}", "notice.txt:1:"},
		{"without end", "notice.txt", "{{range 2000000}}filling the memory{{end}}", "notice.txt: it writes more than"},
	} {
		t.Run(test.name, func(t *testing.T) {
			folder := t.TempDir()
			if err := os.WriteFile(filepath.Join(folder, test.file), []byte(test.content), 0o600); err != nil {
				t.Fatal(err)
			}
			x, err := Load(folder)
			switch {
			case test.wrong == "" && err != nil:
				t.Fatal(err)
			case test.wrong == "":
				if _, err := x.Write(delivery.Samples()[0]); err != nil {
					t.Error(err)
				}
			case err == nil || !strings.Contains(err.Error(), test.wrong) || !strings.HasPrefix(err.Error(), filepath.Join(folder, test.file)):
				t.Errorf("%v does not begin with the file and say %q", err, test.wrong)
			}
		})
	}
}

func TestFolderThatIsNotThere(t *testing.T) {
	if _, err := Load(filepath.Join(t.TempDir(), "none")); err == nil {
		t.Error("loaded from nowhere")
	}
}

// Every text ends in the caution, with every state, and no text shows a state's
// code in place of words.
func TestEveryTextEndsInTheCaution(t *testing.T) {
	x := load(t)
	for _, n := range delivery.Samples() {
		w, err := x.Write(n)
		if err != nil {
			t.Fatal(err)
		}
		if !strings.HasSuffix(strings.TrimSpace(w.Plain), pipeline.Caution) {
			t.Errorf("%s: the caution is not last", n.Key)
		}
		if strings.Contains(w.Plain, "fell_short") || strings.Contains(w.Plain, "not_above") || strings.Contains(w.Plain, "%!") {
			t.Errorf("%s: codes show:\n%s", n.Key, w.Plain)
		}
	}
}
