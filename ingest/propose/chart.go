package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"time"
)

// Point is a value at a time.
type Point struct {
	Time time.Time
	C    float64 // degC
}

// Chart draws what the proposed layout reads of the sample.
func (p *Proposal) Chart(width, height int) string { return Chart(p.points, width, height) }

// The smallest and largest chart, in characters.
const (
	leastWidth, leastHeight = 30, 4
	mostWidth, mostHeight   = 400, 100
	margin                  = 9 // of the scale, with the line beside it
)

// Chart draws points as text: time to the right, degC upward, each column of
// characters from the lowest to the highest value that falls into it, in halves
// of a line. Where there is none it is empty. A dotted line marks 0 degC. It is
// width characters wide and height lines high, axes included, within reason;
// without points it says so.
func Chart(points []Point, width, height int) string {
	points = slices.DeleteFunc(slices.Clone(points), func(p Point) bool { return math.IsNaN(p.C) || math.IsInf(p.C, 0) })
	if len(points) == 0 {
		return "no values to draw\n"
	}
	width, height = min(max(width, leastWidth), mostWidth), min(max(height, leastHeight), mostHeight)
	c := &canvas{columns: width - margin, lines: height - 2}
	c.scale(points)
	return c.draw()
}

// canvas is the space inside the axes.
type canvas struct {
	columns, lines int
	lo, hi         float64 // degC at the lower and upper edge
	first, last    time.Time
	low, high      []float64 // of each column; low > high where there is no value
}

func (c *canvas) scale(points []Point) {
	byTime := func(a, b Point) int { return a.Time.Compare(b.Time) }
	byValue := func(a, b Point) int {
		switch {
		case a.C < b.C:
			return -1
		case a.C > b.C:
			return 1
		}
		return 0
	}
	c.first, c.last = slices.MinFunc(points, byTime).Time.UTC(), slices.MaxFunc(points, byTime).Time.UTC()
	c.lo, c.hi = slices.MinFunc(points, byValue).C, slices.MaxFunc(points, byValue).C
	if c.hi-c.lo < 1 {
		c.lo, c.hi = c.lo-0.5, c.hi+0.5
	}
	c.low, c.high = make([]float64, c.columns), make([]float64, c.columns)
	for i := range c.low {
		c.low[i], c.high[i] = math.Inf(1), math.Inf(-1)
	}
	span := c.last.Unix() - c.first.Unix() + 1
	for _, p := range points {
		i := min(int(float64(p.Time.Unix()-c.first.Unix())/float64(span)*float64(c.columns)), c.columns-1)
		c.low[i], c.high[i] = min(c.low[i], p.C), max(c.high[i], p.C)
	}
}

// half returns the number of the half line, from 0 at the bottom, that a value
// is in.
func (c *canvas) half(v float64) int {
	n := 2 * c.lines
	return min(max(int((v-c.lo)/(c.hi-c.lo)*float64(n)), 0), n-1)
}

func (c *canvas) draw() string {
	var b strings.Builder
	zero := -1
	if c.lo < 0 && c.hi > 0 {
		zero = c.half(0) / 2
	}
	for line := c.lines - 1; line >= 0; line-- {
		label, fill := "", " "
		switch {
		case line == zero:
			label, fill = "0", "·"
		case line == c.lines-1:
			label = fmt.Sprintf("%.1f", c.hi)
		case line == 0:
			label = fmt.Sprintf("%.1f", c.lo)
		}
		edge := "│"
		if label != "" {
			edge = "┤"
		}
		text := fmt.Sprintf("%*s %s", margin-2, label, edge)
		for i := range c.columns {
			text += c.cell(i, line, fill)
		}
		b.WriteString(strings.TrimRight(text, " ") + "\n")
	}
	b.WriteString(fmt.Sprintf("%*s └", margin-2, "degC") + strings.Repeat("─", c.columns) + "\n")
	from, to := c.first.Format(time.DateOnly), c.last.Format(time.DateOnly)
	b.WriteString(strings.Repeat(" ", margin) + from + strings.Repeat(" ", max(c.columns-len(from)-len(to), 1)) + to + "\n")
	return b.String()
}

// cell returns the character of a column in a line.
func (c *canvas) cell(column, line int, fill string) string {
	if c.low[column] > c.high[column] {
		return fill
	}
	from, to := c.half(c.low[column]), c.half(c.high[column])
	lower, upper := from <= 2*line && 2*line <= to, from <= 2*line+1 && 2*line+1 <= to
	switch {
	case lower && upper:
		return "█"
	case lower:
		return "▄"
	case upper:
		return "▀"
	}
	return fill
}
