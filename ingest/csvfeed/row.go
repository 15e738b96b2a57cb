package csvfeed

import (
	"bytes"
	"fmt"
	"maps"
	"math"
	"slices"
	"unicode/utf8"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

const tooLong = "the line is longer than 1048576 bytes, the most that a line may have"

// row deals with a data row. It counts it only when nothing failed.
func (d *decoder) row(line []byte, long bool) error {
	if d.counts.Rows == math.MaxInt32 {
		return &HoldError{Line: d.number(), Text: "there are more than 2147483647 rows; send the file in parts"}
	}
	c := rowCounts{cells: d.plan.cells}
	code, text, at := pipeline.LineTooLong, tooLong, start{}
	if !long {
		if code, text = d.split(line); code == "" {
			if d.plan.choice {
				d.choose()
				c.cells = int64(len(d.chosen))
			}
			if len(d.chosen) > 0 {
				code, text, at = d.open()
			}
		}
	}
	if code != "" {
		c.whole, c.setAside = true, c.cells
		if err := d.setAside(line, -1, code, text); err != nil {
			return err
		}
		c.why = text
	} else if err := d.values(line, at, &c); err != nil {
		return err
	}
	d.add(&c)
	return nil
}

// rowCounts is what became of a row's mapped cells.
type rowCounts struct {
	cells, read, setAside int64
	whole                 bool   // the row is set aside as a whole
	why                   string // of the row, or of the first cell set aside
}

// add counts a row.
func (d *decoder) add(c *rowCounts) {
	n := &d.counts
	n.Rows++
	n.Cells += c.cells
	n.CellsRead += c.read
	n.CellsSetAside += c.setAside
	n.CellsMissing += c.cells - c.read - c.setAside
	switch {
	case c.read > 0:
		n.RowsRead++
	case c.setAside > 0 || c.whole:
		n.RowsSetAside++
		if d.first == "" {
			d.first = fmt.Sprintf("line %d: %s", d.number(), c.why)
		}
	default:
		n.RowsWithoutValue++
	}
}

// split splits a row. A code says that the row is to be set aside, and text why.
func (d *decoder) split(line []byte) (code pipeline.Reason, text string) {
	if i := bytes.IndexByte(line, 0); i >= 0 {
		return pipeline.BadText, fmt.Sprintf("there is a NUL at byte %d; UTF-8 text is right", i+1)
	}
	if !utf8.Valid(line) {
		return pipeline.BadText, badText(line)
	}
	if fault, ok := d.cells.split(line); !ok {
		return pipeline.BadQuote, fault.text(line)
	}
	c := d.columns
	if c.width == 0 {
		if d.cells.width < c.need {
			return pipeline.WrongWidth, fmt.Sprintf("has %d columns, the layout reads column %d", d.cells.width, c.need)
		}
		c.width = d.cells.width
	}
	if d.cells.width != c.width {
		return pipeline.WrongWidth, fmt.Sprintf("has %d of %d columns", d.cells.width, c.width)
	}
	return "", ""
}

// start is where the span of a row begins.
type start struct {
	atS      int64
	resolved bool // by the rule of a named zone
}

// open finds the station of a row and the start of its span. A code says that the
// row is to be set aside, and text why.
func (d *decoder) open() (code pipeline.Reason, text string, at start) {
	if c := d.columns; c.station >= 0 {
		if id := normal.Trim(d.cells.list[c.station]); d.station == nil || !bytes.Equal(id, d.lastID) {
			d.station = d.plan.stations[string(id)]
			d.lastID = append(d.lastID[:0], id...)
		}
	}
	if d.station == nil {
		return pipeline.UnknownStation, d.unknownStation(), at
	}
	civil, err := d.time()
	if err == nil && d.plan.zone != nil {
		at.atS, at.resolved, err = d.plan.zone.UnixS(civil, &d.offset)
	} else {
		at.atS = civil.UnixS()
	}
	if err != nil {
		return pipeline.BadTime, fmt.Sprintf("%s: %s", d.timeColumns(), err), at
	}
	at.atS += d.station.shiftS
	return "", "", at
}

// time reads the row's time.
func (d *decoder) time() (normal.Civil, error) {
	text := normal.Trim(d.cells.list[d.columns.time[0]])
	if len(d.columns.time) > 1 {
		d.timeText = append(d.timeText[:0], text...)
		for _, i := range d.columns.time[1:] {
			d.timeText = append(d.timeText, ' ')
			d.timeText = append(d.timeText, normal.Trim(d.cells.list[i])...)
		}
		text = d.timeText
	}
	at, err := d.plan.time.Parse(text)
	if err == nil && at.SecondS != 0 && d.plan.covers == pipeline.CoversDay {
		err = fmt.Errorf("%s has a time of the day, and the row covers a day; 00:00 is right", normal.Quote(text))
	}
	return at, err
}

// values reads the mapped cells of a row.
func (d *decoder) values(line []byte, at start, c *rowCounts) error {
	row := int32(d.counts.Rows + 1)
	for _, i := range d.chosen {
		r := pipeline.Reading{Row: row, StartS: at.atS}
		missing, fault := d.value(i, &r)
		switch {
		case missing:
		case fault.code != "":
			if err := d.setAside(line, fault.column, fault.code, fault.text); err != nil {
				return err
			}
			if c.setAside++; c.setAside == 1 {
				c.why = d.columns.describe(fault.column) + ": " + fault.text
			}
		default:
			if at.resolved && (r.Quality == pipeline.QualityGood || r.Quality == pipeline.QualityNotChecked) {
				r.Quality = pipeline.QualityChanged
			}
			if err := d.sink.Reading(d.station.id, i, r); err != nil {
				return err
			}
			c.read++
		}
	}
	return nil
}

// cellFault is why a cell is set aside.
type cellFault struct {
	column int
	code   pipeline.Reason
	text   string
}

// value fills in a reading's value and mark from the cell of value column i, or
// says that there is none or why it is set aside.
func (d *decoder) value(i int, r *pipeline.Reading) (missing bool, fault cellFault) {
	v, at := &d.plan.values[i], d.columns.values[i]
	cell := normal.Trim(d.cells.list[at])
	if len(cell) == 0 {
		return true, fault
	}
	for _, token := range v.missing {
		if string(cell) == token {
			return true, fault
		}
	}
	r.Quality = v.bare
	if f := d.columns.flags[i]; f >= 0 {
		if flag := normal.Trim(d.cells.list[f]); len(flag) > 0 {
			mark, known := v.marks[string(flag)]
			if !known {
				return false, cellFault{at, pipeline.UnknownFlag, d.unknownFlag(v, f, flag)}
			}
			r.Quality = mark
		}
		if r.Quality == pipeline.QualityMissing {
			return true, fault
		}
	}
	x, err := normal.ParseDecimal(cell, d.plan.decimal)
	if err != nil {
		return false, cellFault{at, pipeline.BadNumber, err.Error()}
	}
	if v.scaled {
		x = float64(x*v.scale) + v.offset
	}
	if r.ValueC, err = normal.Celsius(x, v.unit); err != nil {
		return false, cellFault{at, pipeline.OutOfBounds, err.Error()}
	}
	return false, fault
}

// setAside passes on a row, or the cell in the column of an index from 0; -1 is
// the row as a whole.
func (d *decoder) setAside(line []byte, column int, code pipeline.Reason, text string) error {
	s := pipeline.SetAside{Line: d.number(), Row: int32(d.counts.Rows + 1), Column: column + 1, Code: code, Text: text,
		Raw: string(line[:min(len(line), pipeline.MaxRaw)])}
	if column >= 0 {
		s.Name = d.columns.name(column)
	}
	return d.sink.SetAside(s)
}

func badText(line []byte) string {
	i := 0
	for i < len(line) {
		r, size := utf8.DecodeRune(line[i:])
		if r == utf8.RuneError && size == 1 {
			break
		}
		i += size
	}
	return fmt.Sprintf("the byte %#02x at byte %d is no UTF-8 text; save the file as UTF-8", line[i], i+1)
}

func (d *decoder) unknownStation() string {
	p, id, where := d.plan, d.fileID, "of the file"
	if d.columns.station >= 0 {
		id, where = string(d.lastID), "in "+d.columns.describe(d.columns.station)
	}
	if id == "" {
		return "there is no station " + where
	}
	text := fmt.Sprintf("station %s %s", normal.Quote([]byte(id)), where)
	if to, mapped := p.ours[id]; mapped {
		text += fmt.Sprintf(", which is %q here,", to)
	}
	if len(p.known) == 0 {
		return text + " is not among the feed's, which has none"
	}
	return text + " is not among the feed's: " + list(p.known)
}

func (d *decoder) unknownFlag(v *value, column int, flag []byte) string {
	text := fmt.Sprintf("flag %s in %s has no mark", normal.Quote(flag), d.columns.describe(column))
	if len(v.marks) == 0 {
		return text + "; no flag has one"
	}
	return text + "; those that have are " + list(slices.Sorted(maps.Keys(v.marks)))
}

// timeColumns names the columns of the time for a message.
func (d *decoder) timeColumns() string {
	text := d.columns.describe(d.columns.time[0])
	for _, i := range d.columns.time[1:] {
		text += ", " + d.columns.describe(i)
	}
	return text
}
