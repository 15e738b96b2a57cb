package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"thawledger/pipeline"
)

// Bounds of judgement; no source.
const (
	mostFlags  = 20
	longFlag   = 8
	commonFlag = 0.1 // share of the values beside which a flag is nothing out of the ordinary
)

// flagOf returns the column of a value column's flags; nil if there is none.
func (t *table) flagOf(c *column, taken []*column) *column {
	good := func(f *column) bool {
		if slices.Contains(taken, f) || len(f.distinct) > mostFlags {
			return false
		}
		for text := range f.distinct {
			if len(text) > longFlag || !isPrintable(text) || strings.Contains(text, ".") {
				return false
			}
		}
		return true
	}
	// One with the column's own name and a word of flags goes before the next one.
	for _, f := range t.columns {
		if f == c || !f.has(flagWords...) || !good(f) {
			continue
		}
		rest := slices.DeleteFunc(slices.Clone(f.words), func(w string) bool { return slices.Contains(flagWords, w) || w == "code" || w == "control" })
		own := slices.DeleteFunc(slices.Clone(c.words), func(w string) bool {
			return slices.Contains(cWords, w) || slices.Contains(fWords, w) || slices.Contains(kWords, w)
		})
		if slices.Equal(rest, own) {
			return f
		}
	}
	if c.index+1 == len(t.columns) {
		return nil
	}
	next := t.columns[c.index+1]
	switch {
	case !good(next):
		return nil
	case next.has(flagWords...) && len(next.words) <= 3:
		return next
	case next.name == "" && next.filled > 0 && next.numeric == 0:
		return next
	}
	return nil
}

// beside counts a flag's cells beside values and beside none.
type beside struct{ value, nothing int }

// flag returns the marks that a flag column's own cells make plain, and asks for
// the others.
func (p *Proposal) flag(c, f *column) *pipeline.FlagColumn {
	counts := map[string]int{}
	by := map[string]*beside{}
	values := 0
	for row, text := range f.cells {
		has := !math.IsNaN(c.values[row])
		if has {
			values++
		}
		if text == "" {
			continue
		}
		if by[text] == nil {
			by[text] = &beside{}
		}
		counts[text]++
		if has {
			by[text].value++
		} else {
			by[text].nothing++
		}
	}
	out := &pipeline.FlagColumn{Column: f.ref(), Empty: pipeline.QualityNotChecked, Marks: map[string]pipeline.Quality{}}
	var common, rare []string
	for _, text := range sortedKeys(counts) {
		b := by[text]
		switch {
		case b.value == 0:
			out.Marks[text] = pipeline.QualityMissing
		case strings.EqualFold(text, "E"):
			out.Marks[text] = pipeline.QualityEstimated
			p.askFlag(c, f, fmt.Sprintf("%s beside %d of %d values is taken for estimated: is it?", shown(text), b.value, values), text+": estimated")
		case float64(b.value) >= commonFlag*float64(values):
			out.Marks[text] = pipeline.QualityNotChecked
			common = append(common, fmt.Sprintf("%s beside %d of %d values", shown(text), b.value, values))
		default:
			rare = append(rare, fmt.Sprintf("%s beside %d", shown(text), b.value))
		}
	}
	if len(common) > 0 {
		p.askFlag(c, f, strings.Join(common, ", ")+": what does it say of them?", "not_checked")
	}
	if len(rare) > 0 {
		p.askFlag(c, f, strings.Join(rare, ", ")+fmt.Sprintf(" of %d values: what does it say of them? Until it has a mark they are set aside", values), "no mark")
	}
	if len(counts) == 0 {
		p.askFlag(c, f, "the sample has no flag: which are there, and what do they say? One that has no mark sets its value aside", "no mark")
	}
	return out
}

func (p *Proposal) askFlag(c, f *column, text, chosen string) {
	p.ask(Question{About: Flag, Column: c.ref(), Options: slices.Clone(pipeline.Qualities), Chosen: chosen,
		Text: "flags in " + f.called() + ": " + text})
}
