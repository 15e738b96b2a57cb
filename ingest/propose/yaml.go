package propose

import (
	"fmt"
	"maps"
	"path"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"unicode"

	"thawledger/pipeline"
)

// YAML returns the proposal as entries for settings.yaml. Questions are comments
// that begin with "# ?", above the line that they are about. The stations are
// not among it: a person has to declare them.
func (p *Proposal) YAML() string {
	w := &writer{p: p, asked: make([]bool, len(p.Questions))}
	l := &p.Layout
	w.comment("", "# ", fmt.Sprintf("Proposed for %s. Of %d rows looked at: %d read, %d without value, %d set aside.", shown(p.file), p.Rows, p.Read, p.WithoutValue, p.SetAside))
	if p.FirstSetAside != "" {
		w.comment("", "# ", "First set aside: "+p.FirstSetAside)
	}
	for _, n := range p.Notes {
		w.comment("", "# ", "Note: "+n)
	}
	w.comment("", "# ", `"# ?" marks what the file does not say; the line below it is a guess until somebody has decided.`)
	w.stations()

	w.line("", "layouts:")
	w.line("  ", plain(l.Name)+":")
	w.line("    ", "delimiter: "+delimiterText(l.Delimiter))
	if l.Comment != "" {
		w.line("    ", "comment: "+quoted(l.Comment))
	}
	if l.NamesLine > 0 {
		w.line("    ", "names_line: "+strconv.Itoa(l.NamesLine))
	}
	w.ask("    ", Missing, "")
	if m := l.Values[0].Missing; len(m) > 0 {
		w.line("    ", "missing: "+list(m, quoted))
	}
	w.line("    ", "time:")
	w.line("      ", "columns: "+list(l.Time.Columns, plain))
	w.ask("      ", DayOrder, "")
	w.line("      ", "format: "+plain(l.Time.Format))
	w.ask("      ", Zone, "")
	w.line("      ", "zone: "+plain(l.Time.Zone))
	w.ask("      ", Covers, "")
	w.line("      ", "covers: "+string(l.Time.Covers))
	if l.Time.Covers == pipeline.CoversEnding || l.Time.Covers == pipeline.CoversBeginning {
		w.line("      ", "span: "+spanText(int64(l.Time.SpanS)))
	}
	w.station()
	w.values()

	w.line("", "feeds:")
	w.line("  ", "- name: "+plain(l.Name))
	w.line("    ", "folder: arrivals")
	if e := extension(p.file); e != ".csv" {
		w.line("    ", "pattern: "+quoted("*"+e))
	}
	w.line("    ", "layout: "+plain(l.Name))
	return w.b.String()
}

type writer struct {
	p     *Proposal
	b     strings.Builder
	asked []bool
}

func (w *writer) line(indent, text string) { w.b.WriteString(indent + text + "\n") }

// stations says what has to be declared beside the proposal.
func (w *writer) stations() {
	where := ""
	if w.p.where != "" {
		where = ", " + w.p.where
	}
	for i, id := range w.p.ids {
		if i == maxShown {
			w.comment("", "# ", fmt.Sprintf("... and %d stations more", len(w.p.ids)-i))
			break
		}
		w.line("", clean("# To be declared among the stations: {id: "+quoted(id)+where+", utc_offset: ..., daily_mean: ...}"))
	}
}

// maxShown is how many stations are written out.
const maxShown = 5

func (w *writer) station() {
	c := &w.p.Layout.Station
	w.line("    ", "station:")
	w.ask("      ", Station, "")
	switch {
	case c.Column != "":
		w.line("      ", "column: "+plain(c.Column))
	case c.FileName != "":
		w.line("      ", "file_name: "+quoted(c.FileName))
	default:
		w.line("      ", "constant: "+plain(c.Constant))
	}
	if len(c.Map) > 0 {
		w.line("      ", "map:")
		for _, from := range slices.Sorted(maps.Keys(c.Map)) {
			w.line("        ", quoted(from)+": "+quoted(c.Map[from]))
		}
	}
}

func (w *writer) values() {
	w.line("    ", "values:")
	for _, v := range w.p.Layout.Values {
		w.ask("      ", Variable, v.Column)
		w.ask("      ", Unit, v.Column)
		w.ask("      ", Flag, v.Column)
		w.line("      ", "- "+entry(&v))
	}
	for i := range w.p.others {
		w.line("      ", clean("# also a temperature: "+entry(&w.p.others[i])))
	}
}

func entry(v *pipeline.ValueColumn) string {
	text := fmt.Sprintf("{column: %s, variable: %s, unit: %s", plain(v.Column), v.Variable, plain(string(v.Unit)))
	if f := v.Flag; f != nil {
		text += ", flag: {column: " + plain(f.Column)
		if len(f.Marks) > 0 {
			var marks []string
			for _, m := range slices.Sorted(maps.Keys(f.Marks)) {
				marks = append(marks, quoted(m)+": "+f.Marks[m].String())
			}
			text += ", marks: {" + strings.Join(marks, ", ") + "}"
		}
		text += "}"
	}
	return text + "}"
}

// ask writes the questions about something.
func (w *writer) ask(indent string, about About, column string) {
	for i, q := range w.p.Questions {
		if q.About == about && q.Column == column && !w.asked[i] {
			w.asked[i] = true
			text := string(q.About) + ": " + q.Text
			if len(q.Options) > 1 && q.About != Flag {
				text += " [" + strings.Join(q.Options[:min(len(q.Options), 8)], " | ") + "]"
			}
			w.comment(indent, "# ? ", text)
		}
	}
}

// lineWidth is how wide comments are written.
const lineWidth = 116

// comment writes a text as comment lines.
func (w *writer) comment(indent, mark, text string) {
	room := lineWidth - len(indent) - len(mark)
	for words := strings.Fields(clean(text)); len(words) > 0; {
		n, width := 1, len([]rune(words[0]))
		for n < len(words) && width+1+len([]rune(words[n])) <= room {
			width += 1 + len([]rune(words[n]))
			n++
		}
		w.line(indent, mark+strings.Join(words[:n], " "))
		words, mark = words[n:], "#"+strings.Repeat(" ", len(mark)-1)
	}
}

// clean leaves out what a comment cannot hold.
func clean(text string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || !unicode.IsPrint(r) {
			return ' '
		}
		return r
	}, text)
}

var (
	plainText = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9_/-]*( [A-Za-z0-9_/-]+)*$`)
	yamlWord  = regexp.MustCompile(`(?i)^(y|n|yes|no|on|off|true|false|null)$`)
)

// plain writes a text without quotes where YAML takes it for nothing else.
func plain(text string) string {
	if plainText.MatchString(text) && !yamlWord.MatchString(text) {
		return text
	}
	return quoted(text)
}

// quoted writes a text in double quotes. Whatever a proposal holds can be printed.
func quoted(text string) string {
	return `"` + strings.NewReplacer(`\`, `\\`, `"`, `\"`).Replace(text) + `"`
}

func list(texts []string, write func(string) string) string {
	var out []string
	for _, t := range texts {
		out = append(out, write(t))
	}
	return "[" + strings.Join(out, ", ") + "]"
}

func delimiterText(d string) string {
	switch d {
	case "\t":
		return "tab"
	case "space":
		return "space"
	}
	return quoted(d)
}

// baseName returns a file's name without its folders.
func baseName(name string) string { return path.Base(strings.ReplaceAll(name, `\`, "/")) }

// extension returns the ending that files like this one share; "" for none.
func extension(file string) string {
	e := path.Ext(file)
	if plainText.MatchString(strings.TrimPrefix(e, ".")) {
		return e
	}
	return ""
}

// layoutName makes a name for the layout and the feed from a file's.
func layoutName(file string) string {
	if name := slug(strings.TrimSuffix(file, path.Ext(file)), 40); name != "" {
		return strings.ToLower(name)
	}
	return "proposed"
}

// slug keeps letters and digits of a text, and one - for what is between them.
func slug(text string, most int) string {
	var b strings.Builder
	for _, r := range text {
		switch {
		case r < unicode.MaxASCII && (unicode.IsLetter(r) || unicode.IsDigit(r)):
			b.WriteRune(r)
		case b.Len() > 0 && !strings.HasSuffix(b.String(), "-"):
			b.WriteByte('-')
		}
		if b.Len() == most {
			break
		}
	}
	return strings.Trim(b.String(), "-")
}
