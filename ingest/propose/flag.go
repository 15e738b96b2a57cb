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
	units := slices.Concat(cWords, fWords, kWords)
	own := without(c.words, units)
	var near *column
	for _, f := range t.columns {
		if f == c || !f.has(flagWords...) || !good(f) {
			continue
		}
		rest := without(f.words, append(slices.Clone(flagWords), "code", "control"))
		if slices.Equal(rest, own) {
			return f // it has the column's own name
		}
		left := without(own, rest)
		stated := slices.ContainsFunc(left, func(w string) bool {
			return slices.Contains(maxWords, w) || slices.Contains(minWords, w) || slices.Contains(meanWords, w)
		})
		if near == nil && len(rest) > 0 && len(without(rest, own)) == 0 && !stated {
			near = f // it has a part of it
		}
	}
	if c.index+1 < len(t.columns) {
		switch next := t.columns[c.index+1]; {
		case !good(next):
		case next.has(flagWords...) && len(next.words) <= 3:
			return next
		case next.name == "" && next.filled > 0 && next.numeric == 0:
			return next
		}
	}
	return near
}

// without returns the words that are not among others.
func without(words, others []string) (out []string) {
	for _, w := range words {
		if !slices.Contains(others, w) {
			out = append(out, w)
		}
	}
	return out
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
