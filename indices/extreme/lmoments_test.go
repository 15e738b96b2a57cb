package extreme

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// Source of the figures: computed independently with R 4.2 and Python from the
// formula of b(r).
func TestSampleLMoments(t *testing.T) {
	for _, tc := range []struct {
		name           string
		sample         []float64
		l1, l2, l3, l4 float64
		tolerance      float64
	}{
		{"eight", []float64{12, 15, 11, 18, 22, 14, 16, 30}, 17.25, 3.5, 1.25, 0.928571, 5e-7},
		{"Port Pirie", portPirie(), 3.98061538, 0.13464423, 0.01850458, 0.01788496, 5e-9},
		{"CRREL 96-14", crrel(), 1009.142857, 149.804762, -11.418797, 15.894570, 5e-7},
	} {
		t.Run(tc.name, func(t *testing.T) {
			m, err := SampleLMoments(tc.sample)
			if err != nil {
				t.Fatal(err)
			}
			near(t, "L1", m.L1, tc.l1, tc.tolerance)
			near(t, "L2", m.L2, tc.l2, tc.tolerance)
			near(t, "L3", m.L3, tc.l3, tc.tolerance)
			near(t, "L4", m.L4, tc.l4, tc.tolerance)
			near(t, "T3", m.T3, m.L3/m.L2, 0)
		})
	}
}

// L-moments by their definition: means over all pairs and triples of differences
// of the ordered values (Hosking 1990).
func TestLMomentsByDefinition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOfN(rapid.Float64Range(-3000, 3000), 4, 12).Draw(t, "x")
		m, err := SampleLMoments(x)
		slices.Sort(x)
		if x[0] == x[len(x)-1] {
			if err == nil {
				t.Fatal("a constant sample has L-moments")
			}
			return
		}
		if err != nil {
			t.Fatal(err)
		}
		var l2, l3, pairs, triples float64
		for i := range x {
			for j := range i {
				l2, pairs = l2+(x[i]-x[j])/2, pairs+1
				for k := range j {
					l3, triples = l3+(x[i]-2*x[j]+x[k])/3, triples+1
				}
			}
		}
		if math.Abs(m.L2-l2/pairs) > 1e-9 || math.Abs(m.L3-l3/triples) > 1e-9 {
			t.Fatalf("L2 %v, L3 %v; by definition %v, %v", m.L2, m.L3, l2/pairs, l3/triples)
		}
		if math.Abs(m.T3) > 1+1e-9 {
			t.Fatalf("T3 %v", m.T3)
		}
	})
}

func TestFitRefuses(t *testing.T) {
	ten := []float64{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}
	for _, tc := range []struct {
		name   string
		sample []float64
	}{
		{"nine", ten[:9]},
		{"none", nil},
		{"constant", slices.Repeat([]float64{700}, 12)},
		{"not a number", append([]float64{math.NaN()}, ten...)},
		{"infinite", append([]float64{math.Inf(-1)}, ten...)},
		{"beyond", append([]float64{1e13}, ten...)},
	} {
		for _, name := range Names {
			if d, err := Fit(name, tc.sample); err == nil {
				t.Errorf("%s: %s fitted as %v", tc.name, name, d)
			}
		}
	}
	lopsided := append(slices.Repeat([]float64{0}, 11), 5)
	for _, name := range []Name{NameGEV, NamePearson3} {
		if d, err := Fit(name, lopsided); err == nil {
			t.Errorf("all but one the same: %s fitted as %v", name, d)
		}
	}
	if _, err := Fit(NameNormal, ten); err != nil {
		t.Errorf("ten values: %v", err)
	}
}
