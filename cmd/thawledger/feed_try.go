package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"text/tabwriter"

	"thawledger/ingest/csvfeed"
	"thawledger/ingest/propose"
	"thawledger/ingest/unpack"
	"thawledger/pipeline"
)

const (
	trySample  = 256 << 10 // bytes of an unknown file's beginning
	tryPieces  = 64 << 10  // of its middle and end
	tryShown   = 5         // readings shown
	chartWide  = 78
	chartHigh  = 14
	tryPoints  = 200_000 // values drawn
	asideKinds = 20      // set-aside rows shown
)

// feedTry reads a file as a feed would, without using anything of it; for an
// unknown file it proposes a layout.
func (p program) feedTry(ctx context.Context, args []string) error {
	f := p.flags("feed", feedSynopsis)
	file := f.String("settings", "settings.yaml", "settings `file`, with --feed")
	name := f.String("feed", "", "`feed` of the settings whose layout to read by; a layout is proposed if left out")
	words, err := parse(f, args, 1)
	if err != nil {
		return err
	}
	if len(words) == 0 {
		f.Usage()
		return errUsage
	}
	if *name == "" {
		return p.propose(words[0])
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	of, err := feedNamed(set, *name)
	if err != nil {
		return err
	}
	return p.tryAs(ctx, words[0], of)
}

// tryAs shows what a feed would make of a file.
func (p program) tryAs(ctx context.Context, path string, f *pipeline.Feed) error {
	plan, err := csvfeed.Compile(&f.Layout)
	if err != nil {
		return fmt.Errorf("compile layout %s: %w", f.Layout.Name, err)
	}
	r, err := os.Open(path)
	if err != nil {
		return fmt.Errorf("open file: %w", err)
	}
	defer r.Close()
	text, err := unpack.Reader(r, f.Layout.Encoding, unpack.Limits{})
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	defer text.Close()
	t := &trial{series: plan.Series(), reasons: map[pipeline.Reason]int{}}
	counts, err := plan.Decode(ctx, text, filepath.Base(path), t)
	fmt.Fprintf(p.out, "%s, as feed %s reads it (layout %s); nothing of it is used\n\n", path, f.Name, f.Layout.Name)
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	fmt.Fprintf(w, "lines\t%d\theader %d, blank %d, comments %d, rows %d\n", counts.Lines, counts.Header, counts.Blank, counts.Comments, counts.Rows)
	fmt.Fprintf(w, "rows\t%d\tread %d, without value %d, set aside %d\n", counts.Rows, counts.RowsRead, counts.RowsWithoutValue, counts.RowsSetAside)
	fmt.Fprintf(w, "cells\t%d\treadings %d, no value %d, set aside %d\n", counts.Cells, counts.CellsRead, counts.CellsMissing, counts.CellsSetAside)
	w.Flush()
	p.showTrial(t)
	if err != nil {
		return fmt.Errorf("%s would be held back: %w", path, err)
	}
	return nil
}

// trial keeps what a trial reading shows.
type trial struct {
	series  []pipeline.Series
	first   []string
	aside   []pipeline.SetAside
	reasons map[pipeline.Reason]int
	points  []propose.Point
}

func (t *trial) Reading(station string, column int, r pipeline.Reading) error {
	if len(t.first) < tryShown {
		t.first = append(t.first, fmt.Sprintf("row %d\t%s\t%s\t%s UTC\t%.2f degC\t%s", r.Row, station, t.series[column].Variable,
			r.Start().Format("2006-01-02 15:04"), r.ValueC, r.Quality))
	}
	if len(t.points) < tryPoints {
		t.points = append(t.points, propose.Point{Time: r.Start(), C: r.ValueC})
	}
	return nil
}

func (t *trial) SetAside(a pipeline.SetAside) error {
	t.reasons[a.Code]++
	if len(t.aside) < asideKinds {
		t.aside = append(t.aside, a)
	}
	return nil
}

func (p program) showTrial(t *trial) {
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	if len(t.first) > 0 {
		fmt.Fprintln(w, "\nfirst readings")
		for _, line := range t.first {
			fmt.Fprintln(w, "  "+line)
		}
	}
	w.Flush()
	if len(t.reasons) > 0 {
		fmt.Fprintln(p.out, "\nset aside")
		for _, code := range slices.Sorted(maps.Keys(t.reasons)) {
			fmt.Fprintf(p.out, "  %s: %d\n", code, t.reasons[code])
		}
		for _, a := range t.aside {
			fmt.Fprintf(p.out, "    line %d: %s\n", a.Line, a.Text)
		}
	}
	if len(t.points) > 0 {
		fmt.Fprintf(p.out, "\n%s", propose.Chart(t.points, chartWide, chartHigh))
	}
}

// propose shows a layout for an unknown file, with what a person has to answer.
func (p program) propose(path string) error {
	samples, err := sample(path)
	if err != nil {
		return err
	}
	found, err := propose.Look(filepath.Base(path), samples)
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	fmt.Fprintf(p.out, "A proposal for %s, to be pasted into settings.yaml. Nothing is read by it until it stands there.\n\n%s\n", path, found.YAML())
	fmt.Fprintf(p.out, "Of %d rows looked at it reads %d, %d are without value, %d would be set aside.\n", found.Rows, found.Read, found.WithoutValue, found.SetAside)
	if found.FirstSetAside != "" {
		fmt.Fprintf(p.out, "The first set aside: %s\n", found.FirstSetAside)
	}
	w := tabwriter.NewWriter(p.out, 0, 0, 2, ' ', 0)
	for _, r := range found.First {
		fmt.Fprintf(w, "  %s\t%s\t%s\t%s\t%.2f degC\t%s\n", r.Station, r.Column, r.Variable, r.Start.Format("2006-01-02 15:04"), r.ValueC, r.Quality)
	}
	w.Flush()
	fmt.Fprintf(p.out, "\n%s", found.Chart(chartWide, chartHigh))
	if len(found.Questions) > 0 {
		fmt.Fprintln(p.out, "\nWhat the file does not say, and a person must:")
		for i, q := range found.Questions {
			fmt.Fprintf(p.out, "  %d. %s\n", i+1, q.Text)
		}
	}
	for _, n := range found.Notes {
		fmt.Fprintf(p.out, "note: %s\n", n)
	}
	return nil
}

// sample reads the beginning of a file, and pieces of its middle and end, cut at
// line ends. A compressed file is expanded as far as its beginning goes.
func sample(path string) ([][]byte, error) {
	r, err := os.Open(path)
	if err != nil {
		return nil, fmt.Errorf("open file: %w", err)
	}
	defer r.Close()
	text, err := unpack.Reader(r, "", unpack.Limits{})
	if err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	defer text.Close()
	head := make([]byte, trySample)
	n, err := io.ReadFull(text, head)
	switch {
	case errors.Is(err, io.EOF), errors.Is(err, io.ErrUnexpectedEOF):
		return [][]byte{head[:n]}, nil
	case err != nil:
		return nil, fmt.Errorf("read %s: %w", path, err)
	}
	out := [][]byte{wholeLines(head, false)}
	info, err := r.Stat()
	if err != nil {
		return nil, fmt.Errorf("look at %s: %w", path, err)
	}
	begin := make([]byte, 16)
	if _, err := r.ReadAt(begin, 0); err != nil || !bytes.HasPrefix(head, begin) {
		return out, nil // compressed: the rest cannot be jumped to
	}
	for _, at := range []int64{info.Size() / 2, info.Size() - tryPieces} {
		piece := make([]byte, tryPieces)
		if at < trySample {
			continue
		}
		n, err := r.ReadAt(piece, at)
		if err != nil && !errors.Is(err, io.EOF) {
			return nil, fmt.Errorf("read %s: %w", path, err)
		}
		out = append(out, wholeLines(piece[:n], true))
	}
	return out, nil
}

// wholeLines leaves out a last line that may be cut, and a first.
func wholeLines(b []byte, first bool) []byte {
	if first {
		b = b[bytes.IndexByte(b, '\n')+1:]
	}
	return b[:bytes.LastIndexByte(b, '\n')+1]
}
