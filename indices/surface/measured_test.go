package surface

import (
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

func known(v float64) degreeday.Bounds { return degreeday.Bounds{Low: v, High: v} }

func pair(label string, air, surface float64) Pair {
	return Pair{Label: label, Kind: pipeline.Thaw, Definition: pipeline.Curve, Air: known(air), Surface: known(surface), Complete: true}
}

// n, mean and standard deviation of four invented seasons, computed
// independently with Python (statistics.mean, statistics.stdev).
func TestMeasured(t *testing.T) {
	part := pair("2034", 900, 1200)
	part.Complete = false
	open := pair("2035", 900, 0)
	open.Surface = degreeday.Bounds{Low: 1100, High: 1300}
	m, err := Measured([]Pair{
		pair("2030", 812, 1177.4), pair("2031", 905, 1357.5), pair("2032", 760, 1056.4), pair("2033", 1010, 1474.6),
		part, open, pair("2036", 49.9, 70), pair("2037", 300, 0), pair("2038", 60, 301),
	})
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{1.45, 1.5, 1.39, 1.46} {
		if math.Abs(m.Seasons[i].N-want) > 1e-12 {
			t.Errorf("season %s: n %v; want %v", m.Seasons[i].Label, m.Seasons[i].N, want)
		}
	}
	if len(m.Seasons) != 4 || math.Abs(m.Mean-1.45) > 1e-12 || !m.HasSD || math.Abs(m.SD-0.0454606056566195) > 1e-12 ||
		math.Abs(m.Low-1.39) > 1e-12 || math.Abs(m.High-1.5) > 1e-12 {
		t.Errorf("%+v", m)
	}
	want := []Refused{
		{Label: "2034", Why: NotWhole}, {Label: "2035", Why: NotWhole}, {Label: "2036", Why: LittleAir},
		{Label: "2037", Why: NoSurface}, {Label: "2038", Why: Implausible},
	}
	if len(m.Refused) != len(want) {
		t.Fatalf("refused %v; want %v", m.Refused, want)
	}
	for i := range want {
		if m.Refused[i] != want[i] {
			t.Errorf("refused %+v; want %+v", m.Refused[i], want[i])
		}
	}
	f := m.Factor(day(time.January, 15))
	if err := f.Check(); err != nil || f.Central != m.Mean || f.Kind != pipeline.Thaw || !strings.Contains(f.Source, "4 seasons, 2030 to 2033") {
		t.Errorf("%+v, error %v", f, err)
	}
}

func TestMeasuredRefuses(t *testing.T) {
	part := pair("2031", 900, 1200)
	part.Complete = false
	for _, pairs := range [][]Pair{nil, {part}, {pair("2031", 0, 0)}} {
		if m, err := Measured(pairs); !errors.Is(err, ErrNoSeason) {
			t.Errorf("%v: %+v, error %v; want ErrNoSeason", pairs, m, err)
		}
	}
	freeze, sum, odd := pair("2032", 900, 700), pair("2032", 900, 1200), pair("2031", 900, 1200)
	freeze.Kind, sum.Definition, odd.Kind = pipeline.Freeze, pipeline.Sum, "summer"
	for _, pairs := range [][]Pair{{pair("2031", 900, 1200), freeze}, {pair("2031", 900, 1200), sum}, {odd}} {
		if m, err := Measured(pairs); err == nil {
			t.Errorf("%v: %+v", pairs, m)
		}
	}
	m, err := Measured([]Pair{pair("2031", 900, 1200)})
	if err != nil || m.HasSD || m.Low != m.High || m.Mean != m.Low {
		t.Errorf("one season: %+v, error %v", m, err)
	}
}

// A surface whose excesses are n times the air's is measured to have that n, and
// n applied to the air gives the measured index back.
func TestMeasuredGivesBackWhatWasApplied(t *testing.T) {
	air := make([]float64, window().Days())
	surface := make([]float64, len(air))
	for i := range air {
		air[i] = -5 - 20*math.Cos(2*math.Pi*(float64(i)+0.5)/365)
		surface[i] = 1.4 * air[i]
	}
	a, s := season(pipeline.Thaw, air, window().Last), season(pipeline.Thaw, surface, window().Last)
	for _, by := range []pipeline.Definition{pipeline.Curve, pipeline.Sum} {
		p, err := PairOf(&a, &s, by)
		if err != nil {
			t.Fatal(err)
		}
		m, err := Measured([]Pair{p})
		if err != nil || math.Abs(m.Mean-1.4) > 1e-12 {
			t.Fatalf("%+v, error %v", m, err)
		}
		f := m.Factor(0)
		got, err := Applied(&a, by, []Factor{f})
		if err != nil || math.Abs(got.Index.Central.Low-p.Surface.Low) > 1e-9 || got.Notes != 0 {
			t.Errorf("%+v, error %v; measured %v", got, err, p.Surface)
		}
	}
	half := season(pipeline.Thaw, surface[:200], window().First+199)
	if p, err := PairOf(&a, &half, pipeline.Curve); err != nil || p.Complete {
		t.Errorf("half a season: %+v, error %v", p, err)
	}
	if _, err := PairOf(&a, &s, pipeline.Monthly); err == nil {
		t.Error("monthly accepted")
	}
	f := season(pipeline.Freeze, air, window().Last)
	if _, err := PairOf(&f, &s, pipeline.Curve); err == nil {
		t.Error("freeze and thaw put together")
	}
}
