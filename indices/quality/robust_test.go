package quality

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// noise returns n tenths from -20 to 20, two of them replaced by wild values.
func noise(n int) []float64 {
	x, v := int64(12345), make([]float64, n)
	for i := range v {
		x = (1103515245*x + 12345) % (1 << 31)
		v[i] = float64((x>>8)%401)/10 - 20
	}
	v[7], v[50] = 95, -300
	return v
}

// Computed independently with Python, from the same published formula, on the
// same values (statistics.median, no sorting by halves, no windows).
func TestBiweight(t *testing.T) {
	for n, want := range map[int][2]float64{
		120: {0.7526239887373058, 12.513648875090153},
		119: {0.6311186992069366, 12.495974088477375},
	} {
		mean, sd, ok := biweight(sorted(noise(n)))
		if !ok || math.Abs(mean-want[0]) > 1e-12 || math.Abs(sd-want[1]) > 1e-12 {
			t.Errorf("%d values: %v, %v, %t; want %v", n, mean, sd, ok, want)
		}
	}
	if _, _, ok := biweight(sorted(noise(99))); ok {
		t.Error("99 values are a distribution")
	}
	if _, _, ok := biweight(make([]float64, 200)); ok {
		t.Error("equal values have a spread")
	}
}

func values(t *rapid.T, least int) []float64 {
	return rapid.SliceOfN(rapid.Map(rapid.IntRange(-300, 300), func(n int) float64 { return float64(n) / 10 }), least, 60).Draw(t, "values")
}

func TestMedians(t *testing.T) {
	plain := func(v []float64) float64 {
		v = sorted(slices.Clone(v))
		return (v[(len(v)-1)/2] + v[len(v)/2]) / 2
	}
	rapid.Check(t, func(t *rapid.T) {
		v := sorted(values(t, 1))
		m := median(v)
		apart := make([]float64, len(v))
		for i, x := range v {
			apart[i] = math.Abs(x - m)
		}
		if want := plain(v); math.Abs(m-want) > 1e-12 {
			t.Fatalf("median %v; want %v", m, want)
		}
		if got, want := medianApart(v, m), plain(apart); math.Abs(got-want) > 1e-12 {
			t.Fatalf("median apart %v; want %v", got, want)
		}
	})
}

func TestWindowMoves(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		a, b, c := sorted(values(t, 0)), sorted(values(t, 0)), sorted(values(t, 0))
		var w window
		w.move(nil, a)
		w.move(nil, b)
		w.move(a, c)
		if want := sorted(slices.Concat(b, c)); !slices.Equal(w.sorted, want) {
			t.Fatalf("%v; want %v", w.sorted, want)
		}
	})
}

// The main body by sorting and walking, as the test is defined.
func TestMainBody(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := values(t, 1)
		for i := range v {
			v[i] *= rapid.SampledFrom([]float64{1, 1, 4}).Draw(t, "stretch")
		}
		s := sorted(slices.Clone(v))
		low, high := len(s)/2, len(s)/2
		for low > 0 && s[low]-s[low-1] < gapC {
			low--
		}
		for high+1 < len(s) && s[high+1]-s[high] < gapC {
			high++
		}
		if a, b := mainBody(v); a != s[low] || b != s[high] {
			t.Fatalf("%v to %v; want %v to %v of %v", a, b, s[low], s[high], s)
		}
	})
}
