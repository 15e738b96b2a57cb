package chart

import (
	"bytes"
	"cmp"
	"errors"
	"fmt"
	"image/color"
	"image/png"
	"math"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

// Width and Height are the size of a picture, in pixels. Its words stay readable
// when a telephone shows it 350 points wide.
const (
	Width  = 900
	Height = 640
)

const (
	left, right, top, bottom = 118, Width - 28, 146, Height - 68
	textSize                 = 31
)

var (
	ink    = color.RGBA{0x21, 0x1d, 0x18, 0xff}
	faint  = color.RGBA{0xd9, 0xd3, 0xc6, 0xff}
	band   = color.RGBA{0xe2, 0xdc, 0xcd, 0xff}
	middle = color.RGBA{0x6e, 0x66, 0x57, 0xff}
	season = color.RGBA{0x1b, 0x4f, 0x63, 0xff}
	spread = color.RGBA{0x9b, 0xba, 0xc6, 0xff}
	limit  = color.RGBA{0x7a, 0x1f, 0x3d, 0xff}

	dashed  = []float64{14, 12}
	dotDash = []float64{22, 12, 3, 12}
)

// plane turns a day and an index in degC.d into a place on the picture.
type plane struct {
	first, last pipeline.Day
	most        float64 // in the unit shown
	factor      float64
}

func (p plane) at(d pipeline.Day, cDays float64) point {
	return point{
		left + (right-left)*float64(d-p.first)/float64(p.last-p.first),
		bottom - (bottom-top)*cDays*p.factor/p.most,
	}
}

// Draw draws the item's chart as PNG, in the given unit (degC.d if empty). The
// item has a chart with at least two days of this season, in order, and figures
// that are numbers, as delivery.Notice.Check has it; anything else is an error.
func Draw(i *delivery.Item, unit pipeline.IndexUnit) ([]byte, error) {
	c := i.Chart
	if c == nil || len(c.Season) < 2 {
		return nil, errors.New("a chart needs at least two days")
	}
	p := planeOf(i, unit)
	if p.last <= p.first || p.last-p.first > 800 {
		return nil, fmt.Errorf("days from %s to %s are no season", p.first, p.last)
	}
	to, err := newCanvas(Width, Height, textSize)
	if err != nil {
		return nil, err
	}
	drawPast(to, p, c)
	drawAxes(to, p, cmp.Or(unit, pipeline.DegCDays))
	to.line(limit, 4, dotDash, p.at(p.first, i.Design.CDays), p.at(p.last, i.Design.CDays))
	drawSeason(to, p, c)
	drawLegend(to, i, c)
	var out bytes.Buffer
	if err := png.Encode(&out, to.picture); err != nil {
		return nil, fmt.Errorf("write picture: %w", err)
	}
	return out.Bytes(), nil
}

func planeOf(i *delivery.Item, unit pipeline.IndexUnit) plane {
	c := i.Chart
	p := plane{first: c.Season[0].Day, last: c.Season[len(c.Season)-1].Day, factor: 1}
	if unit == pipeline.DegFDays {
		p.factor = 1.8
	}
	most := i.Design.CDays
	for _, d := range c.Season {
		most = max(most, d.High)
	}
	for _, d := range c.Past {
		most = max(most, d.P90)
		p.first, p.last = min(p.first, d.Day), max(p.last, d.Day)
	}
	p.most = most * p.factor * 1.06
	return p
}

func drawPast(to *canvas, p plane, c *delivery.Chart) {
	if len(c.Past) < 2 {
		return
	}
	var outline, mid []point
	for _, d := range c.Past {
		outline = append(outline, p.at(d.Day, d.P90))
		mid = append(mid, p.at(d.Day, d.P50))
	}
	for i := len(c.Past) - 1; i >= 0; i-- {
		outline = append(outline, p.at(c.Past[i].Day, c.Past[i].P10))
	}
	to.area(band, outline)
	to.line(middle, 3, dashed, mid...)
}

func drawSeason(to *canvas, p plane, c *delivery.Chart) {
	var outline, low []point
	open := false
	for _, d := range c.Season {
		outline = append(outline, p.at(d.Day, d.High))
		low = append(low, p.at(d.Day, d.Low))
		open = open || d.Low != d.High
	}
	if open {
		for i := len(low) - 1; i >= 0; i-- {
			outline = append(outline, low[i])
		}
		to.area(spread, outline)
		to.line(season, 3, nil, outline[:len(low)]...)
		to.line(season, 3, nil, low...)
		return
	}
	to.line(season, 6, nil, low...)
}

func drawAxes(to *canvas, p plane, unit pipeline.IndexUnit) {
	step := tick(p.most)
	for v := 0.0; v <= p.most; v += step {
		y := p.at(p.first, v/p.factor).y
		to.line(faint, 1.5, nil, point{left, y}, point{right, y})
		to.words(ink, left-12, y+11, 1, fmt.Sprintf("%.0f", v))
	}
	to.words(ink, 10, top-22, 0, string(unit))
	for d := p.first; d <= p.last; d++ {
		year, month, day := d.Date()
		if day != 1 {
			continue
		}
		x := p.at(d, 0).x
		to.line(ink, 2, nil, point{x, bottom}, point{x, bottom + 10})
		name := "1 " + month.String()[:3]
		if month == 1 {
			name += fmt.Sprintf(" %d", year)
		}
		to.words(ink, x, bottom+46, 0.5, name)
	}
	to.line(ink, 2, nil, point{left, bottom}, point{right, bottom})
}

// tick is the distance of marks on the upright axis: 1, 2 or 5 times a power of
// ten, four to ten of them.
func tick(most float64) float64 {
	for power := math.Pow(10, math.Floor(math.Log10(most))-1); ; power *= 10 {
		for _, m := range []float64{1, 2, 5} {
			if most/(m*power) <= 8 {
				return m * power
			}
		}
	}
}

// drawLegend says in two rows what the lines are.
func drawLegend(to *canvas, i *delivery.Item, c *delivery.Chart) {
	x := float64(left)
	sample := func(y float64, words string, mark func(from, to point)) {
		mark(point{x, y - 10}, point{x + 56, y - 10})
		to.words(ink, x+68, y, 0, words)
		x += 68 + to.width(words) + 36
	}
	const first, second = 38, 82
	sample(first, "season "+delivery.OneLine(i.Season, 12), func(p, q point) { to.line(season, 6, nil, p, q) })
	sample(first, "design value", func(p, q point) { to.line(limit, 4, dotDash, p, q) })
	if len(c.Past) < 2 {
		return
	}
	words := "past seasons: middle, 8 of 10"
	if c.PastSeasons > 0 {
		words = fmt.Sprintf("%d past seasons: middle, 8 of 10", c.PastSeasons)
	}
	x = left
	sample(second, words, func(p, q point) {
		to.area(band, []point{{p.x, p.y - 15}, {q.x, p.y - 15}, {q.x, p.y + 15}, {p.x, p.y + 15}})
		to.line(middle, 3, dashed, p, q)
	})
}
