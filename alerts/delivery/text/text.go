package text

import (
	"embed"
	"errors"
	"fmt"
	htmltemplate "html/template"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"text/template"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/chart"
	"thawledger/pipeline"
)

//go:embed templates
var builtIn embed.FS

// The files of a set of templates.
const (
	subjectFile = "subject.txt"
	plainFile   = "notice.txt"
	htmlFile    = "notice.html"
)

// Texts writes notices by a set of templates. It may be used by several
// goroutines.
type Texts struct {
	subject, plain *template.Template
	html           *htmltemplate.Template
}

// Written is a notice in words.
type Written struct {
	Subject string // one line
	Plain   string
	HTML    string // refers to its pictures as cid:ID
}

// Picture is a chart, as PNG.
type Picture struct {
	ID  string // as the HTML refers to it
	Alt string // the same in words
	PNG []byte
}

const (
	maxSubject = 200
	maxText    = 1 << 20 // bytes that a template may write
	maxCharts  = 4       // pictures that one message carries
)

// Load reads the templates in folder, takes the built-in ones for those that are
// not there (for all if folder is ""), and tries them on every sample notice. An
// error names the file and, where there is one, the line.
func Load(folder string) (*Texts, error) {
	if folder != "" {
		if err := onlyTemplates(folder); err != nil {
			return nil, err
		}
	}
	t := &Texts{}
	for _, file := range []string{subjectFile, plainFile, htmlFile} {
		name, source, err := read(folder, file)
		if err != nil {
			return nil, err
		}
		switch file {
		case subjectFile:
			t.subject, err = template.New(name).Option("missingkey=error").Parse(source)
		case plainFile:
			t.plain, err = template.New(name).Option("missingkey=error").Parse(source)
		case htmlFile:
			t.html, err = htmltemplate.New(name).Option("missingkey=error").Parse(source)
		}
		if err != nil {
			return nil, placed(err)
		}
	}
	return t, t.try()
}

// onlyTemplates refuses a folder with files that are none of the three: a
// misspelt name would leave the built-in text in force without a word.
func onlyTemplates(folder string) error {
	entries, err := os.ReadDir(folder)
	if err != nil {
		return fmt.Errorf("read templates: %w", err)
	}
	known := []string{subjectFile, plainFile, htmlFile}
	for _, e := range entries {
		if !slices.Contains(known, e.Name()) && !strings.HasPrefix(e.Name(), ".") {
			return fmt.Errorf("%s: is none of the templates %s", filepath.Join(folder, e.Name()), strings.Join(known, ", "))
		}
	}
	return nil
}

func read(folder, file string) (name, source string, err error) {
	if folder != "" {
		name = filepath.Join(folder, file)
		text, err := os.ReadFile(name)
		if err == nil {
			return name, string(text), nil
		}
		if !errors.Is(err, fs.ErrNotExist) {
			return "", "", fmt.Errorf("read template: %w", err)
		}
	}
	text, err := builtIn.ReadFile("templates/" + file)
	return "built-in " + file, string(text), err
}

// placed puts an error of the template packages into the form file:line: what.
func placed(err error) error {
	s := err.Error()
	for _, prefix := range []string{"template: ", "html/template: ", "html/template:"} {
		s = strings.TrimPrefix(s, prefix)
	}
	return errors.New(s)
}

func (t *Texts) try() error {
	for _, n := range delivery.Samples() {
		w, err := t.write(n)
		if err != nil {
			return fmt.Errorf("%w (tried on a sample notice of kind %s)", err, n.Kind)
		}
		if !strings.Contains(w.Plain, pipeline.Caution) {
			return fmt.Errorf("%s: does not show {{.Caution}}, which every notice has to", t.plain.Name())
		}
		if !strings.Contains(w.HTML, pipeline.Caution) {
			return fmt.Errorf("%s: does not show {{.Caution}}, which every notice has to", t.html.Name())
		}
	}
	return nil
}

// Write puts a notice into words. It fails if the notice does not pass its check,
// or if a template fails on it.
func (t *Texts) Write(n delivery.Notice) (Written, error) {
	if err := n.Check(); err != nil {
		return Written{}, err
	}
	return t.write(n)
}

// Pictures draws the charts that the HTML of a notice refers to.
func Pictures(n delivery.Notice) ([]Picture, error) {
	var out []Picture
	for _, item := range charted(n) {
		png, err := chart.Draw(item, n.Recipient.Unit)
		if err != nil {
			return nil, fmt.Errorf("draw chart of %s: %w", item.About, err)
		}
		out = append(out, Picture{ID: chartID(n.Key, item.About), Alt: alt(item, unitOf(n.Recipient.Unit)), PNG: png})
	}
	return out, nil
}

// charted returns the items whose charts go into the message, the most serious
// first.
func charted(n delivery.Notice) []*delivery.Item {
	var out []*delivery.Item
	items := mostSeriousFirst(n.Items)
	for i := range items {
		if c := items[i].Chart; c != nil && len(c.Season) >= 2 && len(out) < maxCharts {
			out = append(out, &items[i])
		}
	}
	return out
}

// chartID is unique in a mailbox, as a Content-ID has to be (RFC 2392).
func chartID(key, about string) string { return "chart." + about + "." + key + "@thawledger" }

// write executes the templates.
func (t *Texts) write(n delivery.Notice) (Written, error) {
	drawn := charted(n)
	view := NewView(n, func(about string) string {
		if !slices.ContainsFunc(drawn, func(i *delivery.Item) bool { return i.About == about }) {
			return ""
		}
		return "cid:" + chartID(n.Key, about)
	})
	var w Written
	for _, part := range []struct {
		by interface {
			Execute(to io.Writer, data any) error
			Name() string
		}
		into *string
	}{{t.subject, &w.Subject}, {t.plain, &w.Plain}, {t.html, &w.HTML}} {
		text := bounded{left: maxText}
		if err := part.by.Execute(&text, view); err != nil {
			if text.left < 0 {
				err = fmt.Errorf("%s: %w", part.by.Name(), err)
			}
			return Written{}, placed(err)
		}
		*part.into = text.String()
		if strings.TrimSpace(*part.into) == "" {
			return Written{}, fmt.Errorf("%s: writes nothing", part.by.Name())
		}
	}
	w.Subject = delivery.OneLine(w.Subject, maxSubject)
	return w, nil
}

// bounded keeps a template from filling the memory.
type bounded struct {
	strings.Builder
	left int
}

func (b *bounded) Write(p []byte) (int, error) {
	if b.left -= len(p); b.left < 0 {
		return 0, fmt.Errorf("it writes more than %d bytes", maxText)
	}
	return b.Builder.Write(p)
}
