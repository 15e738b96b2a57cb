package ground

import (
	"math"
	"testing"

	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// Computed independently from the same published formulas.
func TestTTOP(t *testing.T) {
	for _, c := range []struct {
		nt, tdd, nf, fdd, rk float64
		ttop, magst          float64
		frozen               bool
	}{
		{1.0, 1500, 0.5, 3500, 0.7, -1.917808, -0.684932, true},
		{1.1, 600, 0.6, 4800, 0.8, -6.443836, -6.082192, true},
		{0.9, 1800, 0.3, 3000, 0.6, 0.328767, 1.972603, false},
		{0.8, 1948, 0.35, 2812, 0.7, 0.417534, 1.573151, false},
	} {
		got, frozen, err := TTOP(c.nt*c.tdd, c.nf*c.fdd, 2*c.rk, 2)
		if err != nil || math.Abs(got-c.ttop) > 0.51e-6 || frozen != c.frozen {
			t.Errorf("%+v: TTOP %.7f, frozen %v, %v", c, got, frozen, err)
		}
		if magst, err := MAGST(c.nt*c.tdd, c.nf*c.fdd); err != nil || math.Abs(magst-c.magst) > 0.51e-6 {
			t.Errorf("%+v: MAGST %.7f, %v", c, magst, err)
		}
	}
}

// Computed independently; where there is no thaw the number is 1, by definition.
func TestFrostNumber(t *testing.T) {
	for _, c := range []struct{ fdd, tdd, want float64 }{
		{2812.5, 1948.3, 0.545761}, {4500, 400, 0.770332}, {3000, 1500, 0.585786}, {5500, 2000, 0.623821}, {1000, 1000, 0.5},
		{4000, 0, 1}, {0, 100, 0},
	} {
		if got, ok, err := FrostNumber(c.fdd, c.tdd); err != nil || !ok || math.Abs(got-c.want) > 0.51e-6 {
			t.Errorf("F(%g, %g) = %.7f, %v, %v; want %g", c.fdd, c.tdd, got, ok, err, c.want)
		}
	}
	// class limits 0.5, 0.6, 2/3 are FDD/TDD of 1, 2.25 and 4
	for ratio, want := range map[float64]float64{1: 0.5, 2.25: 0.6, 4: 2.0 / 3} {
		if got, _, _ := FrostNumber(ratio*700, 700); math.Abs(got-want) > 1e-12 {
			t.Errorf("ratio %g: %g; want %g", ratio, got, want)
		}
	}
	if got, ok, err := FrostNumber(0, 0); ok || err != nil || got != 0 {
		t.Errorf("neither frost nor thaw: %g, %v, %v; there is no number", got, ok, err)
	}
	if _, _, err := FrostNumber(math.NaN(), 1); err == nil {
		t.Error("NaN is an index")
	}
}

// TTOP is continuous where its branches meet, and below MAGST where frozen ground
// conducts better.
func TestTTOPProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		thaw, freeze := rapid.Float64Range(0, 4000).Draw(t, "thaw"), rapid.Float64Range(0, 8000).Draw(t, "freeze")
		frozenK := rapid.Float64Range(0.3, 4).Draw(t, "frozen")
		thawedK := frozenK * rapid.Float64Range(0.2, 1).Draw(t, "ratio")
		c, frozen, err := TTOP(thaw, freeze, thawedK, frozenK)
		magst, _ := MAGST(thaw, freeze)
		if err != nil || frozen != (c < 0) || c > magst+1e-9 {
			t.Fatalf("TTOP %g (frozen %v), MAGST %g, %v", c, frozen, magst, err)
		}
		edge := thaw * thawedK / frozenK
		if c, _, err := TTOP(thaw, edge, thawedK, frozenK); err != nil || math.Abs(c) > 1e-9 {
			t.Fatalf("where the branches meet: %g, %v", c, err)
		}
	})
}

// By hand: 1 m of L 1e8, frozen k 2: 1e8 (1/4) / 86400 = 289.351852 degC.d; half
// of the depth takes a quarter of that.
func TestFreezeBack(t *testing.T) {
	p := Profile{{Thermal: pipeline.Thermal{KThawedWMK: 1, KFrozenWMK: 2, CThawedJM3K: 2.8e6, CFrozenJM3K: 2e6, LatentJM3: 1e8}}}
	got, err := p.FreezeBack(1, 289.351852/4)
	if err != nil || !near(got.NeededCDays, 289.351852, 1e-8) || !near(got.Share, 0.25, 1e-8) || !near(got.FrostDepthM, 0.5, 1e-8) {
		t.Errorf("%+v, %v", got, err)
	}
	if got, err := p.FreezeBack(1, 400); err != nil || got.FrostDepthM != 1 || got.Share < 1.38 {
		t.Errorf("beyond: %+v, %v", got, err)
	}
	if got, err := p.FreezeBack(0, 0); err != nil || got.Share != 1 {
		t.Errorf("nothing to freeze: %+v, %v", got, err)
	}
	if _, err := p.FreezeBack(1, -1); err == nil {
		t.Error("a negative index is taken")
	}
}
