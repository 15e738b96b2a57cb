package chart

import (
	"fmt"
	"image"
	"image/color"
	"image/draw"
	"math"

	"golang.org/x/image/font"
	"golang.org/x/image/font/gofont/goregular"
	"golang.org/x/image/font/opentype"
	"golang.org/x/image/math/fixed"
	"golang.org/x/image/vector"
)

// canvas draws lines, areas and words on a picture.
type canvas struct {
	picture *image.RGBA
	face    font.Face
}

type point struct{ x, y float64 }

func newCanvas(width, height int, textSize float64) (*canvas, error) {
	parsed, err := opentype.Parse(goregular.TTF)
	if err != nil {
		return nil, fmt.Errorf("read font: %w", err)
	}
	face, err := opentype.NewFace(parsed, &opentype.FaceOptions{Size: textSize, DPI: 72, Hinting: font.HintingFull})
	if err != nil {
		return nil, fmt.Errorf("read font: %w", err)
	}
	c := &canvas{picture: image.NewRGBA(image.Rect(0, 0, width, height)), face: face}
	draw.Draw(c.picture, c.picture.Bounds(), image.White, image.Point{}, draw.Src)
	return c, nil
}

// paint fills polygons, together and in one colour. Only the part of the picture
// that they lie in is worked on.
func (c *canvas) paint(in color.Color, polygons ...[]point) {
	box := image.Rectangle{}
	for _, outline := range polygons {
		for _, p := range outline {
			x, y := int(math.Floor(p.x)), int(math.Floor(p.y))
			box = box.Union(image.Rect(x-1, y-1, x+2, y+2))
		}
	}
	if box = box.Intersect(c.picture.Bounds()); box.Empty() {
		return
	}
	r := vector.NewRasterizer(box.Dx(), box.Dy())
	for _, outline := range polygons {
		shape(r, outline, float64(box.Min.X), float64(box.Min.Y))
	}
	r.Draw(c.picture, box, image.NewUniform(in), image.Point{})
}

// shape adds a polygon. The pieces of a line are all the same way round, so that
// where they overlap they add up and do not cancel.
func shape(r *vector.Rasterizer, outline []point, left, top float64) {
	for i, p := range outline {
		if i == 0 {
			r.MoveTo(float32(p.x-left), float32(p.y-top))
		} else {
			r.LineTo(float32(p.x-left), float32(p.y-top))
		}
	}
	r.ClosePath()
}

// area fills a polygon.
func (c *canvas) area(in color.Color, outline []point) {
	if len(outline) >= 3 {
		c.paint(in, outline)
	}
}

// line draws through the points. pattern is the lengths of dashes and gaps in
// turn; nil is a solid line.
func (c *canvas) line(in color.Color, width float64, pattern []float64, through ...point) {
	var pieces [][]point
	at, left := 0, math.Inf(1)
	if len(pattern) > 0 {
		left = pattern[0]
	}
	for i := 1; i < len(through); i++ {
		p, q := through[i-1], through[i]
		length := math.Hypot(q.x-p.x, q.y-p.y)
		for done := 0.0; done < length; {
			step := min(left, length-done)
			if at%2 == 0 {
				pieces = append(pieces, stroke(between(p, q, done/length), between(p, q, (done+step)/length), width)...)
			}
			done += step
			if left -= step; left <= 0 {
				at++
				left = pattern[at%len(pattern)]
			}
		}
	}
	c.paint(in, pieces...)
}

func between(p, q point, share float64) point {
	return point{p.x + (q.x-p.x)*share, p.y + (q.y-p.y)*share}
}

// stroke returns a straight piece of a line, with round ends: a bar and two discs,
// all the same way round.
func stroke(p, q point, width float64) [][]point {
	var out [][]point
	if length := math.Hypot(q.x-p.x, q.y-p.y); length > 0 {
		ox, oy := (q.y-p.y)/length*width/2, (p.x-q.x)/length*width/2
		out = append(out, []point{{p.x + ox, p.y + oy}, {q.x + ox, q.y + oy}, {q.x - ox, q.y - oy}, {p.x - ox, p.y - oy}})
	}
	const corners = 12
	for _, end := range []point{p, q} {
		var disc []point
		for k := range corners {
			sin, cos := math.Sincos(2 * math.Pi * float64(k) / corners)
			disc = append(disc, point{end.x + cos*width/2, end.y + sin*width/2})
		}
		out = append(out, disc)
	}
	return out
}

// words writes s with its base line at y, and its left edge (share 0), middle
// (0.5) or right edge (1) at x.
func (c *canvas) words(in color.Color, x, y, share float64, s string) {
	d := font.Drawer{Dst: c.picture, Src: image.NewUniform(in), Face: c.face}
	x -= c.width(s) * share
	d.Dot = fixed.Point26_6{X: fixed.Int26_6(x * 64), Y: fixed.Int26_6(y * 64)}
	d.DrawString(s)
}

func (c *canvas) width(s string) float64 { return float64(font.MeasureString(c.face, s)) / 64 }
