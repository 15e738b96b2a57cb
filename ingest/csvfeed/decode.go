package csvfeed

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"path"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// Sink takes what decoding finds, in the order of the file. An error of it ends
// the decoding.
type Sink interface {
	// Reading takes a reading of a station. Its series is plan.Series()[column];
	// its own Series is not set.
	Reading(station string, column int, r pipeline.Reading) error
	SetAside(row pipeline.SetAside) error
}

var byteOrderMark = []byte("\ufeff")

// Decode reads a batch from r. Source is the name of the file, as a layout that
// takes the station from it needs; folders before it do not count.
//
// A file that is not readable as a whole gives a *HoldError: one whose names
// line is not there, or has not the layout's columns, whose name has no
// station, or of whose rows more were set aside than the layout allows. The last
// is known only at the end, when the sink has been given all readings: whoever
// must not use them before decodes twice, the first time with a sink that keeps
// none. A file without data rows is none of these if its names line is there.
//
// The counts are those of the lines that were dealt with, whatever the error.
// Errors of r, of the sink and of the context are passed on.
func (p *Plan) Decode(ctx context.Context, r io.Reader, source string, sink Sink) (pipeline.Counts, error) {
	d := p.decoder(sink)
	if err := d.begin(source); err != nil {
		return d.counts, err
	}
	return d.decode(ctx, r)
}

// DecodeRest is Decode for what a file has grown by: head begins like the file,
// gives names and columns, and has a row that can be read; linesBefore is how
// many of the file's lines came before r. Lines are numbered as those of the file, rows from 1; the head is not
// counted.
func (p *Plan) DecodeRest(ctx context.Context, head io.Reader, linesBefore int64, r io.Reader, source string, sink Sink) (pipeline.Counts, error) {
	d := p.decoder(sink)
	if err := d.begin(source); err != nil {
		return d.counts, err
	}
	if err := d.learn(ctx, head); err != nil {
		return d.counts, err
	}
	d.before = linesBefore
	return d.decode(ctx, r)
}

func (p *Plan) decoder(sink Sink) *decoder {
	return &decoder{plan: p, sink: sink, cells: cells{delimiter: p.delimiter, blanks: p.blanks, widths: p.widths, unquoted: p.plainQuotes}}
}

// decode deals with all lines of r.
func (d *decoder) decode(ctx context.Context, r io.Reader) (pipeline.Counts, error) {
	in := newLines(r)
	for {
		line, long, err := in.next(ctx)
		if err == io.EOF {
			break
		}
		if err != nil {
			return d.counts, fmt.Errorf("read line %d: %w", d.number(), err)
		}
		if d.number() == 1 {
			line = bytes.TrimPrefix(line, byteOrderMark)
		}
		if err := d.line(line, long); err != nil {
			return d.counts, err
		}
	}
	if err := d.checkEnd(); err != nil {
		return d.counts, err
	}
	return d.counts, overShare(d.counts, d.plan.maxSetAside, d.first)
}

// learn reads the header and the number of columns from the beginning of a file.
func (d *decoder) learn(ctx context.Context, head io.Reader) error {
	sink := d.sink
	d.sink = nowhere{}
	in := newLines(head)
	for d.number() <= d.header || d.columns.width == 0 {
		line, long, err := in.next(ctx)
		if err == io.EOF {
			if err := d.checkEnd(); err != nil {
				return err
			}
			break
		}
		if err != nil {
			return fmt.Errorf("read line %d of the beginning: %w", d.number(), err)
		}
		if d.number() == 1 {
			line = bytes.TrimPrefix(line, byteOrderMark)
		}
		if err := d.line(line, long); err != nil {
			return err
		}
	}
	d.sink, d.counts, d.first = sink, pipeline.Counts{}, ""
	return nil
}

// nowhere is a sink that keeps nothing.
type nowhere struct{}

func (nowhere) Reading(string, int, pipeline.Reading) error { return nil }
func (nowhere) SetAside(pipeline.SetAside) error            { return nil }

// decoder is the state of one Decode.
type decoder struct {
	plan     *Plan
	sink     Sink
	before   int64 // lines of the file before the first that is counted
	counts   pipeline.Counts
	cells    cells
	columns  *columns
	preamble int64    // lines of the preamble
	header   int64    // the last line of the header; noEnd while the preamble goes on
	units    []string // those of the line of units

	fileID   string   // the feed's id of the station, where no column says it
	station  *station // of fileID, or of the last row
	lastID   []byte   // the feed's id of station, where a column says it
	timeText []byte
	offset   normal.Offset // of the last row's time, where the zone is a named one
	chosen   []int         // values that are of the row
	first    string        // of the rows set aside, the first: where and why
}

// begin settles what needs no line.
func (d *decoder) begin(source string) error {
	p := d.plan
	if p.fileName != nil {
		name := path.Base(source)
		m := p.fileName.FindStringSubmatch(name)
		if m == nil || m[1] == "" {
			return &HoldError{Text: fmt.Sprintf("the file name %q does not say its station: it does not fit %q", name, p.fileName)}
		}
		d.fileID = m[1]
	} else {
		d.fileID = p.constant
	}
	if p.stationColumn == nil {
		d.station = p.stations[d.fileID]
	}
	if d.header = p.header; p.preambleEnds != nil {
		d.header = noEnd
	}
	d.chosen = make([]int, 0, len(p.values))
	for i := range p.values {
		d.chosen = append(d.chosen, i)
	}
	if p.namesLine == 0 {
		return d.resolve(nil)
	}
	return nil
}

// number is the number of the next line in its file.
func (d *decoder) number() int64 { return d.before + d.counts.Lines + 1 }

func (d *decoder) resolve(names []string) (err error) {
	if d.columns, err = d.plan.resolve(names, d.number()); err == nil {
		d.cells.need = d.columns.need
	}
	return err
}

// line deals with the next line and counts it, unless it returns an error.
func (d *decoder) line(line []byte, long bool) error {
	switch p := d.plan; {
	case d.number() <= d.header:
		if err := d.headerLine(line, long); err != nil {
			return err
		}
		d.counts.Header++
	case len(p.comment) > 0 && bytes.HasPrefix(line, p.comment):
		d.counts.Comments++
	case !long && d.cells.blank(line):
		d.counts.Blank++
	default:
		if err := d.row(line, long); err != nil {
			return err
		}
	}
	d.counts.Lines++
	return nil
}
