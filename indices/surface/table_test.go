package surface

import (
	"strings"
	"testing"

	"thawledger/pipeline"
)

// US Army TM 5-852-4 / AFM 88-19 ch. 4 (1983), Table 4-1, as reproduced at
// buildingcriteria1.tpub.com, ufc_3_130_04, page 78.
func TestTableIsThatOfTheManual(t *testing.T) {
	const none = 0
	for _, c := range []struct {
		id                    string
		freeze, thaw, thawEnd float64
	}{
		{"tm_snow", 1.0, none, none},
		{"tm_concrete", 0.75, 1.5, 1.5},
		{"tm_bituminous", 0.7, 1.6, 2}, // "1.6 to 2+"
		{"tm_bare_soil", 0.7, 1.4, 2},  // "1.4 to 2+"
		{"tm_shaded", 0.9, 1.0, 1.0},
		{"tm_turf", 0.5, 0.8, 0.8},
		{"tm_trees", 0.3, 0.4, 0.4},
	} {
		p, ok := Lookup(c.id)
		if !ok {
			t.Errorf("%s is not in the table", c.id)
			continue
		}
		freeze, _ := p.Of(pipeline.Freeze)
		thaw, hasThaw := p.Of(pipeline.Thaw)
		if freeze != one(c.freeze) || hasThaw != (c.thaw != none) || thaw.Low != c.thaw || thaw.High != c.thawEnd {
			t.Errorf("%s: n_f %+v, n_t %+v; the manual has %v and %v to %v", c.id, freeze, thaw, c.freeze, c.thaw, c.thawEnd)
		}
		if open := c.thawEnd > c.thaw; thaw.OpenAbove != open || hasThaw && thaw.HasCentral == open {
			t.Errorf("%s: n_t %+v; a range open above has no number to use", c.id, thaw)
		}
		if !strings.Contains(p.Source, "TM 5-852-4") || !strings.Contains(p.Source, "Table 4-1") {
			t.Errorf("%s: source %q", c.id, p.Source)
		}
	}
}

// The abstracts and tables named at each: Kade et al. 2006 (1.43 to 0.74), Klene
// et al. 2008 (0.32 to 0.58), NICOP 2008 (0.12 to 0.73, 0.80 to 1.08), J.
// Infrastruct. Preserv. Resil. 2021 (0.5 and 1.0, 0.95 and 1.25).
func TestTableOfMeasuredFactors(t *testing.T) {
	for _, c := range []struct {
		id        string
		kind      pipeline.Kind
		low, high float64
	}{
		{"tundra_circles", pipeline.Thaw, 0.74, 1.43},
		{"kuparuk_tundra", pipeline.Freeze, 0.32, 0.58},
		{"whitehorse", pipeline.Freeze, 0.12, 0.73},
		{"whitehorse", pipeline.Thaw, 0.80, 1.08},
		{"slope_tundra", pipeline.Freeze, 0.5, 0.5},
		{"slope_tundra", pipeline.Thaw, 1.0, 1.0},
		{"slope_gravel", pipeline.Freeze, 0.95, 0.95},
		{"slope_gravel", pipeline.Thaw, 1.25, 1.25},
	} {
		p, _ := Lookup(c.id)
		if n, ok := p.Of(c.kind); !ok || n.Low != c.low || n.High != c.high {
			t.Errorf("%s, %s: %+v; want %v to %v", c.id, c.kind, n, c.low, c.high)
		}
	}
}

func TestTableIsSound(t *testing.T) {
	seen := map[string]bool{}
	for _, p := range Table() {
		if seen[p.ID] || p.ID == "" || p.Surface == "" || p.Source == "" {
			t.Errorf("%+v: not unique, or without a name or a source", p)
		}
		seen[p.ID] = true
		if !p.HasThaw && !p.HasFreeze {
			t.Errorf("%s has no n", p.ID)
		}
		for _, kind := range []pipeline.Kind{pipeline.Thaw, pipeline.Freeze} {
			n, ok := p.Of(kind)
			switch {
			case !ok && n != Stated{}:
				t.Errorf("%s has a %s n that it says it has not", p.ID, kind)
			case ok && !(0 < n.Low && n.Low <= n.High && n.High <= MostN):
				t.Errorf("%s: %s n %+v", p.ID, kind, n)
			case n.HasCentral && !(n.Low <= n.Central && n.Central <= n.High):
				t.Errorf("%s: %s n %+v", p.ID, kind, n)
			}
		}
		// under snow n is below 1 or 1; only the sun makes a thaw n above 1
		if n, ok := p.Of(pipeline.Freeze); ok && n.High > 1 {
			t.Errorf("%s: n_f %+v above 1", p.ID, n)
		}
	}
	Table()[0].ID = "changed"
	if Table()[0].ID == "changed" {
		t.Error("a caller can change the table")
	}
	if _, ok := Lookup("no such surface"); ok {
		t.Error("found what is not there")
	}
	if _, ok := (&Published{HasThaw: true, HasFreeze: true}).Of("summer"); ok {
		t.Error("an n for a kind that there is not")
	}
}
