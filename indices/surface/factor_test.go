package surface

import (
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	"thawledger/pipeline"
)

func day(month time.Month, d int) pipeline.Day { return pipeline.DayOf(2031, month, d) }

// plain returns a factor without a range.
func plain(kind pipeline.Kind, from pipeline.Day, n float64) Factor {
	return Factor{Kind: kind, From: from, Low: n, Central: n, High: n, Definition: pipeline.Curve, Source: "invented"}
}

func mid(f Factor) Factor {
	f.MidSeason = true
	return f
}

func TestInForce(t *testing.T) {
	first, last := day(time.January, 15), pipeline.DayOf(2032, time.January, 14)
	before := plain(pipeline.Thaw, pipeline.DayOf(2020, time.May, 1), 1.1)
	onFirst := plain(pipeline.Thaw, first, 1.2)
	july := plain(pipeline.Thaw, day(time.July, 1), 1.3)
	august := plain(pipeline.Thaw, day(time.August, 1), 1.4)
	later := mid(plain(pipeline.Thaw, last+1, 1.5))
	freeze := plain(pipeline.Freeze, first-1, 0.5)
	for _, c := range []struct {
		name    string
		factors []Factor
		want    []float64
	}{
		{"the latest before the season", []Factor{before, plain(pipeline.Thaw, 0, 0.9)}, []float64{1.1}},
		{"from the first day", []Factor{before, onFirst}, []float64{1.2}},
		{"within the season: from the next", []Factor{july, before}, []float64{1.1}},
		{"marked mid-season: at once", []Factor{mid(july), before}, []float64{1.1, 1.3}},
		{"two in one season", []Factor{mid(august), mid(july), before}, []float64{1.1, 1.3, 1.4}},
		{"one for the next season between", []Factor{mid(august), july, before}, []float64{1.1, 1.4}},
		{"mid-season of an earlier year", []Factor{mid(before)}, []float64{1.1}},
		{"after the season", []Factor{before, later}, []float64{1.1}},
		{"freeze factors are none of thaw", []Factor{before, freeze}, []float64{1.1}},
	} {
		pieces, err := inForce(pipeline.Thaw, first, last, c.factors)
		if err != nil || len(pieces) != len(c.want) {
			t.Errorf("%s: %v, error %v; want %v", c.name, pieces, err, c.want)
			continue
		}
		for i, p := range pieces {
			if p.Central != c.want[i] {
				t.Errorf("%s: n %v in place %d; want %v", c.name, p.Central, i, c.want[i])
			}
		}
	}
	for _, factors := range [][]Factor{nil, {freeze}, {july}, {mid(july)}, {later}} {
		if _, err := inForce(pipeline.Thaw, first, last, factors); !errors.Is(err, ErrNoFactor) {
			t.Errorf("%v: error %v; want ErrNoFactor", factors, err)
		}
	}
	if _, err := inForce(pipeline.Thaw, first, last, []Factor{before, july, mid(july)}); err == nil || !strings.Contains(err.Error(), "one must go") {
		t.Errorf("two from one day: error %v", err)
	}
}

func TestFactorCheck(t *testing.T) {
	good := plain(pipeline.Thaw, 0, 1.4)
	if err := good.Check(); err != nil {
		t.Error(err)
	}
	for _, c := range []struct {
		name   string
		change func(f *Factor)
	}{
		{"no kind", func(f *Factor) { f.Kind = "" }},
		{"zero", func(f *Factor) { f.Low, f.Central, f.High = 0, 0, 0 }},
		{"order", func(f *Factor) { f.Low = 1.5 }},
		{"order above", func(f *Factor) { f.High = 1.3 }},
		{"percent", func(f *Factor) { f.Low, f.Central, f.High = 140, 140, 140 }},
		{"no number", func(f *Factor) { f.Central = math.NaN() }},
		{"infinite", func(f *Factor) { f.High = math.Inf(1) }},
		{"definition", func(f *Factor) { f.Definition = "guess" }},
	} {
		f := good
		c.change(&f)
		if f.Check() == nil {
			t.Errorf("%s: accepted", c.name)
		}
		if _, err := inForce(pipeline.Thaw, 0, 364, []Factor{f, plain(pipeline.Thaw, -5, 1)}); err == nil {
			t.Errorf("%s: used", c.name)
		}
	}
}

func TestFactorsOf(t *testing.T) {
	got := FactorsOf([]pipeline.NFactor{
		{Kind: pipeline.Thaw, From: 3, Value: 1.5, Low: 1.4, High: 1.8, Source: "trial field"},
		{Kind: pipeline.Freeze, From: 4, Value: 0.7},
	})
	want := []Factor{
		{Kind: pipeline.Thaw, From: 3, Low: 1.4, Central: 1.5, High: 1.8, Source: "trial field"},
		{Kind: pipeline.Freeze, From: 4, Low: 0.7, Central: 0.7, High: 0.7},
	}
	for i := range want {
		if got[i] != want[i] || got[i].Check() != nil {
			t.Errorf("%+v; want %+v", got[i], want[i])
		}
	}
}
