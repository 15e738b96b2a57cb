package chart

import (
	"bytes"
	"image"
	"image/color"
	"image/png"
	"testing"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

func drawn(t *testing.T, i delivery.Item, unit pipeline.IndexUnit) image.Image {
	t.Helper()
	body, err := Draw(&i, unit)
	if err != nil {
		t.Fatal(err)
	}
	picture, err := png.Decode(bytes.NewReader(body))
	if err != nil {
		t.Fatal(err)
	}
	if picture.Bounds() != image.Rect(0, 0, Width, Height) {
		t.Fatalf("bounds %v", picture.Bounds())
	}
	return picture
}

func is(picture image.Image, x, y float64, want color.RGBA) bool {
	r, g, b, _ := picture.At(int(x), int(y)).RGBA()
	return color.RGBA{uint8(r >> 8), uint8(g >> 8), uint8(b >> 8), 0xff} == want
}

// The lines are where the figures are: the place of a value is worked out here
// by the rule of three.
func TestLinesAreWhereTheFiguresAre(t *testing.T) {
	day := pipeline.DayOf(2031, 6, 1)
	i := delivery.Samples()[0].Items[0]
	i.Design.CDays = 1000
	i.Chart = &delivery.Chart{PastSeasons: 12}
	for k := range 101 {
		v := float64(5 * k)
		i.Chart.Season = append(i.Chart.Season, delivery.ChartDay{Day: day + pipeline.Day(k), Low: v, High: v})
		i.Chart.Past = append(i.Chart.Past, delivery.ChartPast{Day: day + pipeline.Day(k), P10: v / 2, P50: v * 0.7, P90: v * 0.8})
	}
	picture := drawn(t, i, "")
	x := func(k float64) float64 { return left + (right-left)*k/100 }
	y := func(v float64) float64 { return bottom - (bottom-top)*v/1060 }
	for name, test := range map[string]struct {
		x, y float64
		want color.RGBA
	}{
		"season at half time":       {x(50), y(250), season},
		"season at the end":         {x(99.8), y(499), season},
		"band between":              {x(90), y(0.6 * 450), band},
		"white above":               {x(50), y(850), color.RGBA{255, 255, 255, 255}},
		"design value at the start": {left + 5, y(1000), limit},
	} {
		if !is(picture, test.x, test.y, test.want) {
			t.Errorf("%s: %v at %.0f, %.0f, want %v", name, picture.At(int(test.x), int(test.y)), test.x, test.y, test.want)
		}
	}
}

// An index that missing days leave open is an area, not a line down its middle.
func TestOpenIndexIsAnArea(t *testing.T) {
	i := delivery.Samples()[0].Items[0]
	i.Chart.Past = nil
	for k := range i.Chart.Season {
		i.Chart.Season[k].Low *= 0.5
	}
	last := i.Chart.Season[len(i.Chart.Season)-1]
	picture := drawn(t, i, pipeline.DegFDays)
	p := planeOf(&i, pipeline.DegFDays)
	at := p.at(last.Day-10, (last.Low+last.High)/2*0.9)
	if !is(picture, at.x, at.y, spread) {
		t.Errorf("%v", picture.At(int(at.x), int(at.y)))
	}
}

func TestSamePictureTwice(t *testing.T) {
	i := delivery.Samples()[0].Items[0]
	a, err := Draw(&i, "")
	if err != nil {
		t.Fatal(err)
	}
	b, err := Draw(&i, "")
	if err != nil || !bytes.Equal(a, b) {
		t.Errorf("two pictures of one season differ: %v", err)
	}
}

func TestRefusesWhatIsNoSeason(t *testing.T) {
	for name, bend := range map[string]func(*delivery.Item){
		"no chart": func(i *delivery.Item) { i.Chart = nil },
		"one day":  func(i *delivery.Item) { i.Chart.Season = i.Chart.Season[:1] },
		"same day twice": func(i *delivery.Item) {
			i.Chart = &delivery.Chart{Season: []delivery.ChartDay{i.Chart.Season[0], i.Chart.Season[0]}}
		},
		"a century": func(i *delivery.Item) { i.Chart.Season[0].Day -= 36525 },
	} {
		i := delivery.Samples()[0].Items[0]
		bend(&i)
		if _, err := Draw(&i, ""); err == nil {
			t.Errorf("%s: drawn", name)
		}
	}
}

func TestTick(t *testing.T) {
	for most, want := range map[float64]float64{1802: 500, 3500: 500, 90: 20, 1: 0.2, 8: 1, 12: 2} {
		if got := tick(most); got != want {
			t.Errorf("tick(%v) = %v, want %v", most, got, want)
		}
	}
}

func BenchmarkDraw(b *testing.B) {
	i := delivery.Samples()[0].Items[0]
	for b.Loop() {
		if _, err := Draw(&i, ""); err != nil {
			b.Fatal(err)
		}
	}
}
