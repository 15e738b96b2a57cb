package propose

import (
	"fmt"
	"math"
	"path"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"unicode"

	"thawledger/pipeline"
)

// place is which station the rows are of, as far as the file tells.
type place struct {
	column   *column
	how      pipeline.StationColumn
	ids      []string // the feed's, as the rows or the name have them
	why      string
	latitude float64 // NaN if the file does not say, or says several
	where    string
	skip     []*column // columns that say where the station is
}

// toBeNamed stands where only a person knows the station.
const toBeNamed = "TO-BE-NAMED"

// anID is what settings take for a station's id.
var anID = regexp.MustCompile(`^[A-Za-z0-9_-]{1,40}$`)

// maxStations is how many stations of one file are believed.
const maxStations = 200

func (t *table) findStation(file string, when *timing) *place {
	p := &place{latitude: math.NaN()}
	p.position(t)
	best := 0
	for _, c := range t.columns {
		if s := t.stationScore(c, when); s > best {
			best, p.column = s, c
		}
	}
	switch stem, id, expression := idInName(file); {
	case p.column != nil:
		p.how.Column = p.column.ref()
		p.ids = sortedKeys(p.column.distinct)
		p.why = "rows name their station in column " + p.column.called()
	case id != "":
		p.how.FileName = expression
		p.ids = []string{id}
		p.why = "no column names the station, and the file's name seems to"
	default:
		p.how.Constant = toBeNamed
		p.ids = []string{toBeNamed}
		p.why = "neither a column nor the file's name " + shown(stem) + " has anything like a station's id"
	}
	for _, id := range p.ids {
		if p.column != nil && !anID.MatchString(id) {
			p.addToMap(id)
		}
	}
	return p
}

// stationScore says how likely a column names the station; 0 for not at all.
func (t *table) stationScore(c *column, when *timing) int {
	if slices.Contains(when.columns, c) || c.filled < len(c.cells) || len(c.distinct) > maxStations || len(c.distinct)*3 > len(c.cells) && len(c.distinct) > 1 {
		return 0
	}
	for id := range c.distinct {
		if len(id) > 60 || !isPrintable(id) {
			return 0
		}
	}
	numbers := c.numeric > 0
	if numbers && (!c.isRun() || c.numeric < c.filled) && !slices.ContainsFunc(sortedKeys(c.distinct), hasLetterOrDash) {
		return 0
	}
	score := 0
	switch {
	case c.has("flag", "quality", "elevation", "height", "type"):
		return 0
	case c.has("station", "stn", "climate", "site", "wban", "wbanno", "wmo", "usaf", "stationid", "siteid") && c.has("id", "number", "no", "code", "wbanno", "wban", "wmo", "usaf", "stationid", "siteid"):
		score = 10
	case len(c.words) == 1 && c.has("station", "stn", "site", "id"):
		score = 8
	case c.has("station", "site", "stn"):
		score = 5
	case len(c.words) <= 2 && c.has("name", "location", "place", "plot"):
		score = 4
	case c.name == "" && c.index == 0 && c.isRun() && c.shape.runs[0].least >= 4 && c.yearField() == "":
		score = 3
	case c.name == "" && c.index <= 1 && !numbers:
		score = 2
	}
	return score
}

func hasLetterOrDash(id string) bool {
	return strings.ContainsFunc(id, unicode.IsLetter) || strings.Contains(id[1:], "-")
}

func isPrintable(text string) bool {
	return text != "" && !strings.ContainsRune(text, unicode.ReplacementChar) && !strings.ContainsFunc(text, func(r rune) bool { return !strconv.IsPrint(r) })
}

// addToMap gives an id that settings do not take another that they do.
func (p *place) addToMap(id string) {
	if p.how.Map == nil {
		p.how.Map = map[string]string{}
	}
	ours := strings.ToUpper(slug(id, 30))
	if ours == "" {
		ours = toBeNamed
	}
	for n, base := 2, ours; slices.ContainsFunc(p.ids, func(other string) bool { return other == ours || p.how.Map[other] == ours }); n++ {
		ours = base + "-" + strconv.Itoa(n)
	}
	p.how.Map[id] = ours
}

// ours returns the ids that the settings' stations would have.
func (p *place) ours() (out []string) {
	for _, id := range p.ids {
		if to, mapped := p.how.Map[id]; mapped {
			id = to
		}
		out = append(out, id)
	}
	return out
}

// position finds columns of latitude and longitude.
func (p *place) position(t *table) {
	var found []string
	for _, field := range []struct {
		key   string
		words []string
		most  float64
	}{{"latitude", []string{"latitude", "lat"}, 90}, {"longitude", []string{"longitude", "lon", "lng", "long"}, 180}, {"elevation_m", []string{"elevation", "elev", "altitude"}, 9000}} {
		c := t.named(field.words...)
		if c == nil {
			continue
		}
		p.skip = append(p.skip, c)
		lo, hi, ok := c.bounds()
		if !ok || lo < -field.most || hi > field.most || hi-lo > 0.5 {
			continue
		}
		if field.key == "latitude" {
			p.latitude = hi
		}
		found = append(found, fmt.Sprintf("%s: %v", field.key, hi))
	}
	p.where = strings.Join(found, ", ")
}

// idInName looks for a station's id in a file's name, and returns an expression
// that finds it there and in names like it.
func idInName(file string) (stem, id, expression string) {
	extension := path.Ext(file)
	stem = strings.TrimSuffix(file, extension)
	if len(stem) > 100 || !isPrintable(file) {
		return "", "", ""
	}
	from := 0
	for from <= len(stem) {
		to := len(stem)
		if n := strings.IndexAny(stem[from:], "_ ."); n >= 0 {
			to = from + n
		}
		if part := stem[from:to]; likeID(part) {
			return stem, part, "^" + general(stem[:from]) + "(" + general(part) + ")" + general(stem[to:]) + strings.ReplaceAll(regexp.QuoteMeta(extension), `\.`, "[.]") + "$"
		}
		from = to + 1
	}
	return stem, "", ""
}

// likeID reports whether a part of a file's name has the digits of an id, and is
// no date.
func likeID(part string) bool {
	if !anID.MatchString(part) {
		return false
	}
	long := false
	for _, digits := range strings.FieldsFunc(part, func(r rune) bool { return r < '0' || r > '9' }) {
		long = long || len(digits) >= 4 && !likeDate(digits)
	}
	return long
}

func likeDate(digits string) bool {
	n, _ := strconv.Atoi(digits[:4])
	return n >= 1800 && n <= 2100 && (len(digits) == 4 || len(digits) == 6 || len(digits) == 8)
}

// general writes an expression for texts like this one.
func general(text string) string {
	var b strings.Builder
	last := ""
	for _, r := range text {
		class := ""
		switch {
		case r >= '0' && r <= '9':
			class = "[0-9]+"
		case r < unicode.MaxASCII && unicode.IsLetter(r):
			class = "[A-Za-z]+"
		case r == '.':
			b.WriteString("[.]")
		default:
			b.WriteString(regexp.QuoteMeta(string(r)))
		}
		if class != "" && class != last {
			b.WriteString(class)
		}
		last = class
	}
	return b.String()
}

// setStation takes over which station the rows are of.
func (p *Proposal) setStation(w *place) {
	p.Layout.Station, p.ids, p.where = w.how, w.ours(), w.where
	q := Question{About: Station, Chosen: strings.Join(p.ids, ", ")}
	switch {
	case w.how.Constant != "":
		q.Text = w.why + ": which of the settings' stations is it?"
	case len(w.how.Map) > 0:
		q.Text = fmt.Sprintf("%s: %s. Settings take letters, digits, - and _ only; are these the right stations?", w.why, listed(w.ids))
	default:
		q.Text = fmt.Sprintf("%s: %s. If it has another id among the settings' stations, add a map from this one to that", w.why, listed(w.ids))
	}
	p.ask(q)
}

// listed writes a few texts for a message.
func listed(texts []string) string {
	var out []string
	for _, s := range texts[:min(len(texts), 5)] {
		out = append(out, shown(s))
	}
	if more := len(texts) - 5; more > 0 {
		return fmt.Sprintf("%s and %d more", strings.Join(out, ", "), more)
	}
	return strings.Join(out, ", ")
}
