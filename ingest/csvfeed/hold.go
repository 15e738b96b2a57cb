package csvfeed

import (
	"fmt"
	"math"
	"strconv"

	"thawledger/pipeline"
)

// HoldError says why a batch is not readable as a whole and must be held back:
// nothing of it may be used.
type HoldError struct {
	Line   int64  // line of the file that it is about, from 1; 0 for the file
	Column string // column, as the layout has it, that it is about; "" for none
	Text   string // what is wrong and what would be right
}

// Error returns the text with its line before it.
func (e *HoldError) Error() string {
	if e.Line == 0 {
		return e.Text
	}
	return fmt.Sprintf("line %d: %s", e.Line, e.Text)
}

// overShare returns a HoldError if more rows were set aside than share allows.
func overShare(c pipeline.Counts, share float64, first string) error {
	if c.Rows == 0 || float64(c.RowsSetAside) <= share*float64(c.Rows) {
		return nil
	}
	part := 100 * float64(c.RowsSetAside) / float64(c.Rows)
	return &HoldError{Text: fmt.Sprintf("%d of %d rows (%s %%) could not be read, the feed allows %s %%; first: %s",
		c.RowsSetAside, c.Rows, percent(part), strconv.FormatFloat(math.Round(share*1e8)/1e6, 'f', -1, 64), first)}
}

// percent writes a percentage with two figures that count, or whole from 10 on.
func percent(v float64) string {
	if v >= 10 {
		return strconv.FormatFloat(v, 'f', 0, 64)
	}
	return strconv.FormatFloat(v, 'g', 2, 64)
}
