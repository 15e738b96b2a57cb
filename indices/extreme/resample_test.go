package extreme

import (
	"math"
	"reflect"
	"slices"
	"testing"
)

// Source of the figures: computed independently with R 4.2 for the record of CRREL
// Report 96-14, table 20: statistic by its formula over pnorm, correlation by cor
// and qnorm, with Cunnane's positions.
func TestGoodnessAgainstR(t *testing.T) {
	n, g := fitted(t, NameNormal, crrel()), fitted(t, NameGumbel, crrel())
	near(t, "A2 of the normal", AndersonDarling(n, crrel()), 0.287752107549277, 1e-10)
	near(t, "A2 of Gumbel", AndersonDarling(g, crrel()), 0.793131251046816, 1e-10)
	near(t, "correlation of the normal", Correlation(n, crrel(), Cunnane()), 0.987160440940497, 1e-12)
	near(t, "correlation of Gumbel", Correlation(g, crrel(), Cunnane()), 0.95074231098808, 1e-12)
}

// The lesson of that record: its indices are skewed to the low side, Gumbel fits it
// worse than the others, and gives 1879 degC.d for 100 years instead of 1502.
func TestGumbelIsNotTheHabit(t *testing.T) {
	fits, err := FitAll(crrel(), Usual())
	if err != nil {
		t.Fatal(err)
	}
	for i, f := range fits {
		if f.Err != nil || f.Name != Names[i] {
			t.Fatalf("%s: %v", f.Name, f.Err)
		}
		level, within := ReturnLevel(f.Distribution, Upper, 100), f.Resampled.LevelInterval(Upper, 100)
		if !(within.Low < level && level < within.High) {
			t.Errorf("%s: %v outside its interval %+v", f.Name, level, within)
		}
	}
	if best := fits[Best(fits)].Name; best == NameGumbel {
		t.Error("Gumbel taken for the best")
	}
	for i := range fits {
		if g := fits[1]; i != 1 && (g.PValue >= fits[i].PValue || g.Correlation >= fits[i].Correlation || fits[i].Poor()) {
			t.Errorf("Gumbel p %v r %v; %s p %v r %v", g.PValue, g.Correlation, fits[i].Name, fits[i].PValue, fits[i].Correlation)
		}
	}
}

// The same seed gives the same figures, whatever the order of the sample.
func TestSeeded(t *testing.T) {
	turned := crrel()
	slices.Reverse(turned)
	b := Bootstrap{Replicates: 60, Confidence: 0.9, Seed: 7}
	one, err := FitAll(crrel(), b)
	if err != nil {
		t.Fatal(err)
	}
	two, err := FitAll(turned, b)
	if err != nil {
		t.Fatal(err)
	}
	if !reflect.DeepEqual(one, two) {
		t.Error("two runs differ")
	}
	b.Seed = 8
	if three, _ := FitAll(crrel(), b); reflect.DeepEqual(one, three) {
		t.Error("another seed makes no difference")
	}
}

// The interval of a normal quantile has a normal approximation of its own: with
// z = 0 it is that of the mean, SD/sqrt(n) on either side of it.
func TestIntervalOfTheMedian(t *testing.T) {
	d := Normal{1000, 200}
	sample := make([]float64, 40)
	for i := range sample {
		sample[i] = d.Quantile((float64(i) + 0.5) / 40)
	}
	r, err := Resample(d, sample, Bootstrap{Replicates: 4000, Confidence: 0.9, Seed: 3})
	if err != nil {
		t.Fatal(err)
	}
	got := r.LevelInterval(Upper, 2)
	half := 1.6448536 * 200 / math.Sqrt(40) // 52.0; percentiles of 4000 vary by some 1.5
	near(t, "low", got.Low, 1000-half, 5)
	near(t, "high", got.High, 1000+half, 5)
	if p := r.PValue(); p < 0.9 { // the sample is as normal as can be
		t.Errorf("p %v", p)
	}
}

func TestResampleRefuses(t *testing.T) {
	for _, b := range []Bootstrap{{10, 0.9, 1}, {500, 1, 1}, {500, math.NaN(), 1}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%+v accepted", b)
				}
			}()
			_, _ = Resample(Normal{0, 1}, crrel(), b)
		}()
	}
}

func BenchmarkFitAll(b *testing.B) {
	for b.Loop() {
		if _, err := FitAll(crrel(), Usual()); err != nil {
			b.Fatal(err)
		}
	}
}
