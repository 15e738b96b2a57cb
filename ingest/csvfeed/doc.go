// Package csvfeed reads the bytes of one batch by its feed's layout:
//
//	bytes -> lines -> cells -> station, time, values -> readings
//	              \-> header, blank, comment        \-> set aside
//
// Every line is counted as exactly one of header, blank, comment and data row;
// every data row ends as exactly one of read, without value and set aside; every
// mapped cell as exactly one of reading, missing and set aside. That holds for
// any bytes whatever, and so do the bounds: a line is at most MaxLine bytes
// long, and nothing grows with the length of the file.
//
// The header is the preamble, to the first line that its end fits, and the lines
// of names and units and whatever else comes before the first line of data, counted
// after the preamble. It is held against the layout before any row is read: the
// columns by name, of several names for a column exactly one; the texts of the
// units; the station, where a line before the names says it. A header that does
// not agree holds the whole batch back.
//
// Lines come before quotes. A quoted cell never runs over a line end, so that a
// stray quote spoils its own line and not the rest of the file; encoding/csv,
// which follows RFC 4180 there, would swallow it. Within a line the quoting is
// that of RFC 4180, or there is none. Where columns have widths they are counted in
// characters; what the line does not reach is empty, and the last column takes what
// is left. A line ends with LF, CRLF or CR. Text is UTF-8; a byte order
// mark before the first line is dropped.
//
// What a row as a whole is set aside for: a line too long, text that is not
// UTF-8 or holds NUL, a stray quote, another number of columns than the names
// line has (without one: than the first row that has all mapped columns), a
// station that is not among the layout's, a time that cannot be read. All its
// mapped cells count as set aside then. A bad cell is set aside alone, and the
// other cells of its row are read: the row is read if any reading came of it,
// set aside if none came and a cell was set aside, otherwise without value.
//
// A value may be of some rows only (long form): those that have one of its texts
// in each of the columns that it names. Of other rows it is no mapped cell, and a
// row that no value is of is without value and has no cells; neither its station
// nor its time is looked at. A row that cannot be parted into cells is set aside
// with those cells that every row has.
//
// A cell has no value if it is empty or equal, letter for letter, to one of the
// layout's missing texts, blanks around both let be: -9999 does not stand for
// -9999.0. Then its flag does not matter. Otherwise a flag whose mark is missing
// says the same, a flag that has no mark sets the cell aside, and a value
// without a flag column has the mark not_checked.
//
// Times are of a fixed offset from UTC, or of a named zone, whose clocks show some
// times twice and leave others out. What those are the layout says beforehand:
// they are set aside, or taken by its rule, and the value is then marked changed
// unless its mark says more than good or not_checked. What a zone's clocks showed
// is what the tz database of the machine or the program says.
//
// Columns are numbered from 1 wherever a message names one.
package csvfeed
