package pipeline

import "fmt"

// Counts is what became of a batch's lines and cells. A data row ends as
// exactly one of read, without value and set aside; a mapped cell as exactly
// one of reading, missing and set aside. Readings include those that a later
// row of the same batch repeats; what was repeated is known once the parts are
// committed.
type Counts struct {
	Lines    int64 // of the file
	Header   int64 // up to and including the line of names
	Blank    int64
	Comments int64

	Rows             int64 // data rows
	RowsRead         int64
	RowsWithoutValue int64
	RowsSetAside     int64

	Cells         int64 // rows times mapped value columns
	CellsRead     int64 // readings sent
	CellsMissing  int64
	CellsSetAside int64
}

// Check says which sum does not add up; nil if all do.
func (c Counts) Check() error {
	if c.Lines != c.Header+c.Blank+c.Comments+c.Rows {
		return fmt.Errorf("lines %d are not header %d + blank %d + comments %d + rows %d", c.Lines, c.Header, c.Blank, c.Comments, c.Rows)
	}
	if c.Rows != c.RowsRead+c.RowsWithoutValue+c.RowsSetAside {
		return fmt.Errorf("rows %d are not read %d + without value %d + set aside %d", c.Rows, c.RowsRead, c.RowsWithoutValue, c.RowsSetAside)
	}
	if c.Cells != c.CellsRead+c.CellsMissing+c.CellsSetAside {
		return fmt.Errorf("cells %d are not read %d + missing %d + set aside %d", c.Cells, c.CellsRead, c.CellsMissing, c.CellsSetAside)
	}
	return nil
}

// SetAside is a row, or a cell of one, that could not be read, kept whole.
type SetAside struct {
	Line   int64  // line of the file, from 1
	Row    int32  // data row, from 1
	Column int    // column, from 1; 0 for the row as a whole
	Name   string // the column's name, where it has one
	Code   Reason // for counting
	Text   string // what is wrong and what would be right
	Raw    string // the line as received (as far as MaxRaw)
}

// MaxRaw is how many bytes of a line are kept with a set-aside row; the batch in
// the archive holds the rest.
const MaxRaw = 8192

// Reason groups set-aside rows.
type Reason string

// Why a row or a cell was set aside.
const (
	BadQuote       Reason = "bad_quote"
	WrongWidth     Reason = "wrong_width" // fewer or more columns than the names line has
	LineTooLong    Reason = "line_too_long"
	BadText        Reason = "bad_text" // NUL, or not the declared character set
	BadTime        Reason = "bad_time"
	BadNumber      Reason = "bad_number"
	OutOfBounds    Reason = "out_of_bounds" // outside -100 to +100 degC: no air temperature
	UnknownFlag    Reason = "unknown_flag"
	UnknownStation Reason = "unknown_station"
)
