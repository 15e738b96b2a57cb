package csvfeed

import (
	"fmt"
	"math"
	"strings"

	"thawledger/ingest/normal"
)

const (
	noEnd       = math.MaxInt64
	maxPreamble = 1000 // lines
	maxMatched  = 4096 // bytes of a line that a regular expression is held against
)

// headerLine deals with a line of the header.
func (d *decoder) headerLine(line []byte, long bool) error {
	n, p := d.number(), d.plan
	if d.header == noEnd {
		return d.preambleLine(line)
	}
	switch n -= d.preamble; {
	case n == p.namesLine:
		if err := d.names(line, long); err != nil {
			return err
		}
	case n == p.unitsLine:
		cells, err := d.headings(line, long, "units")
		if err != nil {
			return err
		}
		d.units = cells
	case n < p.namesLine || p.namesLine == 0:
		d.lookForStation(line)
	}
	if n == p.header {
		return d.endHeader()
	}
	return nil
}

// preambleLine deals with a line of the preamble.
func (d *decoder) preambleLine(line []byte) error {
	n, p := d.number(), d.plan
	d.lookForStation(line)
	switch {
	case p.preambleEnds.Match(line[:min(len(line), maxMatched)]):
		d.preamble, d.header = n, n+p.header
		if p.header == 0 {
			return d.endHeader()
		}
	case n == maxPreamble:
		return &HoldError{Line: n, Text: fmt.Sprintf("none of the first %d lines ends the preamble: none fits %q", maxPreamble, p.preambleEnds)}
	}
	return nil
}

// lookForStation takes the station from a line of the header if it says it.
func (d *decoder) lookForStation(line []byte) {
	p := d.plan
	if p.preamble == nil || d.fileID != "" {
		return
	}
	if m := p.preamble.FindSubmatch(line[:min(len(line), maxMatched)]); m != nil {
		d.fileID = string(normal.Trim(m[1]))
		d.station = p.stations[d.fileID]
	}
}

// endHeader holds the header against the layout.
func (d *decoder) endHeader() error {
	p := d.plan
	if p.preamble != nil && d.fileID == "" {
		return &HoldError{Line: d.number(), Text: fmt.Sprintf("no line of the header says the station: none fits %q", p.preamble)}
	}
	if p.unitsLine == 0 {
		return nil
	}
	for i := range p.values {
		v, at := &p.values[i], d.columns.values[i]
		if v.text == "" {
			continue
		}
		got := ""
		if at < len(d.units) {
			got = d.units[at]
		}
		if got != v.text {
			return &HoldError{Line: d.preamble + p.unitsLine, Column: v.columns[0], Text: fmt.Sprintf(
				"the unit of %s is %s, and the layout was written for %s; see what it is now, and change unit and unit_text",
				d.columns.describe(at), normal.Quote([]byte(got)), normal.Quote([]byte(v.text)))}
		}
	}
	return nil
}

// checkEnd says what is amiss if the file ends here.
func (d *decoder) checkEnd() error {
	p, lines := d.plan, d.before+d.counts.Lines
	switch {
	case d.header == noEnd:
		return &HoldError{Text: fmt.Sprintf("the file ends after %d lines, and none of them ends the preamble: none fits %q", lines, p.preambleEnds)}
	case lines < d.preamble+p.namesLine:
		return &HoldError{Text: fmt.Sprintf("the file ends after %d lines, and the column names are due on line %d", lines, d.preamble+p.namesLine)}
	}
	return nil
}

// names takes the line of names.
func (d *decoder) names(line []byte, long bool) error {
	names, err := d.headings(line, long, "column names")
	if err != nil {
		return err
	}
	return d.resolve(names)
}

// headings splits a line of names or units, which is what they are called.
func (d *decoder) headings(line []byte, long bool, what string) ([]string, error) {
	hold := func(text string) ([]string, error) {
		return nil, &HoldError{Line: d.number(), Text: "the " + what + " cannot be read: " + text}
	}
	if long {
		return hold(tooLong)
	}
	need := d.cells.need
	d.cells.need = math.MaxInt
	if fault, ok := d.cells.split(line); !ok {
		return hold(fault.text(line))
	}
	out := make([]string, 0, d.cells.width)
	for _, cell := range d.cells.list {
		out = append(out, strings.ToValidUTF8(string(normal.Trim(cell)), "\ufffd"))
	}
	d.cells.list, d.cells.need = nil, need
	return out, nil
}
