package traps

import (
	"math"
	"strings"
	"testing"
	"time"

	"thawledger/indices/daily"
	"thawledger/indices/degreeday"
	"thawledger/indices/quality"
	"thawledger/pipeline"
)

var (
	january = pipeline.MonthDay{Month: time.January, Day: 15}
	july    = pipeline.MonthDay{Month: time.July, Day: 15}
)

// year returns a window's days: meanC each.
func year(w degreeday.Window, meanC func(d pipeline.Day) float64) []degreeday.DayMean {
	out := make([]degreeday.DayMean, w.Days())
	for i := range out {
		d := w.First + pipeline.Day(i)
		c := meanC(d)
		out[i] = degreeday.DayMean{Day: d, Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
	}
	return out
}

// Trap 4. A relapse in spring makes the curve index 51 and the sum 60 of the same
// days (by hand). A design value says which it is; one from monthly means, as
// Boyd (1973, 1979) approximated them, is compared with neither, and one that
// does not say with the curve index of TM 5-852-1.
func TestDefinitionsAreKeptApart(t *testing.T) {
	means := []float64{-6, -4, -2, 3, 2, -4, -5, -1, 1, 4, 6, 8, 9, 7, -3, 5, 6, 4, 2, -1, 3, -2, -5, -6, -8}
	w := degreeday.WindowAt(january, pipeline.DayOf(2031, time.July, 1))
	days := year(w, func(d pipeline.Day) float64 {
		if i := int(d - w.First); i < len(means) {
			return means[i]
		}
		return -10
	})
	s := degreeday.Build(pipeline.Thaw, w, "2031", 0, days, w.Last)
	if s.Curve.Index.Low != 51 || s.Sum.Index.Low != 60 {
		t.Errorf("curve %v, sum %v; want 51 and 60", s.Curve.Index, s.Sum.Index)
	}
	for definition, want := range map[pipeline.Definition]pipeline.Definition{
		pipeline.Curve: pipeline.Curve, pipeline.Sum: pipeline.Sum, pipeline.NotStated: pipeline.Curve,
	} {
		d := pipeline.DesignValue{Definition: definition}
		if err := d.Comparable(0); err != nil || d.Compared() != want {
			t.Errorf("%s is compared with %s, error %v; want %s", definition, d.Compared(), err, want)
		}
	}
	monthly := pipeline.DesignValue{Definition: pipeline.Monthly}
	if monthly.Comparable(0) == nil {
		t.Error("a monthly approximation is compared with daily indices")
	}
}

// Trap 5. 1 degC.d = 1.8 degF.d = 24 K.h, without the 32 of the scale: an index is
// a sum of differences. The winter of 1969-70 in CRREL Report 96-14, Table 20, is
// 1191 degC.d and 2144 degF.d there.
func TestUnitsOfADesignValue(t *testing.T) {
	for _, c := range []struct {
		index     float64
		unit      pipeline.IndexUnit
		want, off float64
	}{
		{2144, pipeline.DegFDays, 1191, 0.5}, {1191, pipeline.DegCDays, 1191, 0}, {24 * 1191, pipeline.KelvinHours, 1191, 1e-9}, {1.8, pipeline.DegFDays, 1, 1e-15},
	} {
		d := pipeline.DesignValue{Index: c.index, Unit: c.unit}
		if got, err := d.IndexCDays(); err != nil || math.Abs(got-c.want) > c.off {
			t.Errorf("%v %s is %v degC.d, error %v; want %v", c.index, c.unit, got, err, c.want)
		}
	}
	d := pipeline.DesignValue{Index: 1, Unit: "degree-days"}
	if _, err := d.IndexCDays(); err == nil {
		t.Error("a unit that there is not")
	}
}

// Trap 7. Two rules give two means of the same readings, 1.75 degC apart, and
// each day says by which it was made.
func TestRuleOfTheMeanIsTold(t *testing.T) {
	st := pipeline.Station{ID: "fell", MinHours: 20, MaxHole: 3}
	d := pipeline.DayOf(2031, time.July, 1)
	reading := func(v pipeline.Variable, startS int64, spanS int32, c float64) daily.Input {
		return daily.Input{Feed: "fell", Sensor: "air", Variable: v, SpanS: spanS, StartS: startS, ValueC: c}
	}
	from := st.DayStart(d).Unix()
	in := []daily.Input{reading(pipeline.AirTempMax, from, 86400, 16), reading(pipeline.AirTempMin, from, 86400, 4)}
	for h := range int64(24) { // 18 hours at 7 degC, 6 at 12
		c := 7.0
		if 12 <= h && h < 18 {
			c = 12
		}
		in = append(in, reading(pipeline.AirTemp, from+h*3600, 0, c))
	}
	for rule, want := range map[pipeline.MeanRule]float64{pipeline.MeanMaxMin: 10, pipeline.MeanHourly: 8.25} {
		st.Mean = rule
		if v := daily.Make(&st, d, in); v.Rule != rule || v.MeanC != want || v.Origin != pipeline.Observed {
			t.Errorf("%s: %+v; want %v and the rule", rule, v, want)
		}
	}
}

// Trap 12. A day of maximum and minimum 0 degC is what thaw is about: at most
// doubtful, and doubtful values stay in the mean. So for 0 degF, which a reader
// of degF leaves behind where nothing was measured.
func TestDaysAtZeroStay(t *testing.T) {
	st := pipeline.Station{ID: "fell", Mean: pipeline.MeanMaxMin}
	d := pipeline.DayOf(2031, time.May, 20)
	for _, c := range []float64{0, -17.8} {
		o := quality.Daily(quality.Record{{Day: d, MeanC: c, MaxC: c, MinC: c, HasMax: true, HasMin: true, Observed: true}}, quality.Options{})[0]
		if o.Mark != pipeline.QualityDoubtful || !o.Failed.Has(quality.Naught) {
			t.Errorf("a day at %v degC: %s, %s", c, o.Mark, o.Failed)
		}
		var in []daily.Input
		for _, v := range []pipeline.Variable{pipeline.AirTempMax, pipeline.AirTempMin} {
			in = append(in, daily.Input{Feed: "fell", Sensor: "air", Variable: v, SpanS: 86400, StartS: st.DayStart(d).Unix(), ValueC: c, Quality: o.Mark})
		}
		if v := daily.Make(&st, d, in); v.Origin != pipeline.Observed || v.MeanC != c || v.Quality != pipeline.QualityDoubtful {
			t.Errorf("a doubtful day at %v degC: %+v", c, v)
		}
	}
}

// Trap 13. 29 February is a day like others, in windows of 366 days.
func TestLeapDayCounts(t *testing.T) {
	leap := pipeline.DayOf(2032, time.February, 29)
	w := degreeday.WindowAt(january, leap)
	days := year(w, func(d pipeline.Day) float64 {
		if d == leap {
			return 7.5
		}
		return -3
	})
	s := degreeday.Build(pipeline.Thaw, w, "2032", 0, days, w.Last)
	if len(days) != 366 || s.Sum.Index.Low != 7.5 || s.Curve.Index.Low != 7.5 || s.Curve.First != leap || s.Curve.Last != leap {
		t.Errorf("%d days, sum %+v, curve %+v", len(days), s.Sum, s.Curve)
	}
	f := degreeday.WindowAt(july, leap)
	frost := degreeday.Build(pipeline.Freeze, f, "2031-32", 0, year(f, func(d pipeline.Day) float64 {
		if m := d.Time().Month(); m == time.February {
			return -1
		}
		return 2
	}), f.Last)
	if frost.Sum.Index.Low != 29 {
		t.Errorf("a February of -1 degC in a leap year: %v degC.d of frost; want 29", frost.Sum.Index)
	}
}

// Trap 15. What feeds send for "no value" is no temperature: whoever forgets to
// name it in the layout finds the day marked wrong.
func TestSentinels(t *testing.T) {
	d := pipeline.DayOf(2031, time.May, 20)
	for _, c := range []float64{-99, -99.9, 99.9, -999, 999, 999.9, -9999, 9999, 6999, -999.9, -178} {
		o := quality.Daily(quality.Record{{Day: d, MeanC: c, Observed: true}}, quality.Options{})[0]
		if o.Mark != pipeline.QualityWrong {
			t.Errorf("%v is %s", c, o.Mark)
		}
		h := quality.Hours(d, []pipeline.Reading{{StartS: int64(d) * 86400, ValueC: c}}, quality.Options{})
		if h.Mark != pipeline.QualityWrong {
			t.Errorf("a reading of %v is %s", c, h.Mark)
		}
	}
	if c, err := pipeline.TenthsDegC.Celsius(-178); err != nil || c != -17.8 {
		t.Errorf("-178 tenths are %v degC, error %v", c, err)
	}
}

// Trap 18. Load restrictions on roads go by a thaw index with a base below
// freezing: in Minnesota from 29 degF on 1 February down to 24 degF on 15 March,
// with the restriction at 25 degF.d (Minnesota Department of Transportation, thaw
// index definitions). It is not compared with an index of base 0 degC, nor the
// other way round.
func TestLoadRestrictionIndexIsAnother(t *testing.T) {
	for _, baseF := range []float64{29, 24} {
		baseC, err := pipeline.DegF.Celsius(baseF)
		if err != nil {
			t.Fatal(err)
		}
		restriction := pipeline.DesignValue{Kind: pipeline.Thaw, Definition: pipeline.Sum, Index: 25, Unit: pipeline.DegFDays, BaseC: baseC}
		err = restriction.Comparable(0)
		if err == nil || !strings.Contains(err.Error(), "bases") {
			t.Errorf("base %v degF compared with base 0 degC: error %v", baseF, err)
		}
		engineering := pipeline.DesignValue{Kind: pipeline.Thaw, Definition: pipeline.Curve, Index: 3000, Unit: pipeline.DegFDays}
		if engineering.Comparable(baseC) == nil || engineering.Comparable(0) != nil {
			t.Errorf("base 0 degC compared with base %v degF", baseF)
		}
	}
}

// Trap 19. A place without frost or without thaw has no season of it, which is
// said; in the southern hemisphere the thaw season runs over the new year.
func TestNoSeasonIsSaid(t *testing.T) {
	for _, c := range []struct {
		kind   pipeline.Kind
		starts pipeline.MonthDay
		meanC  float64
		none   bool
	}{
		{pipeline.Freeze, july, 4, true}, {pipeline.Thaw, january, 4, false},
		{pipeline.Thaw, january, -4, true}, {pipeline.Freeze, july, -4, false},
		{pipeline.Thaw, january, 0, true}, {pipeline.Freeze, july, 0, true},
	} {
		w := degreeday.WindowAt(c.starts, pipeline.DayOf(2031, time.August, 1))
		s := degreeday.Build(c.kind, w, "", 0, year(w, func(pipeline.Day) float64 { return c.meanC }), w.Last)
		for _, r := range []degreeday.Result{s.Curve, s.Sum} {
			if r.NoSeason != c.none || r.Began == c.none || math.IsNaN(r.Index.Low) || (r.Index.High == 0) != c.none {
				t.Errorf("%s at %v degC: %+v; no season is %t", c.kind, c.meanC, r, c.none)
			}
		}
	}
	w := degreeday.WindowAt(july, pipeline.DayOf(2031, time.January, 10))
	southern := degreeday.Build(pipeline.Thaw, w, w.Label(), 0, year(w, func(d pipeline.Day) float64 {
		return -8 + 14*math.Cos(2*math.Pi*(float64(d.Time().YearDay())-15)/365)
	}), w.Last)
	if southern.Label != "2030-31" || southern.Curve.NoSeason || southern.Curve.EdgeProvisional ||
		southern.Curve.First.Time().Month() != time.November || southern.Curve.Last.Time().Month() != time.March {
		t.Errorf("%s: %+v", southern.Label, southern.Curve)
	}
}

// Trap 20. A season that is not over says so, by itself and as a whole, and what
// it has is a lower bound of what it will have.
func TestOpenSeasonIsSaid(t *testing.T) {
	w := degreeday.WindowAt(january, pipeline.DayOf(2031, time.July, 1))
	days := year(w, func(d pipeline.Day) float64 {
		return -8 + 18*math.Cos(2*math.Pi*(float64(d.Time().YearDay())-200)/365)
	})
	before := 0.0
	for n := 1; n <= len(days); n += 13 {
		s := degreeday.Build(pipeline.Thaw, w, "2031", 0, days[:n], days[n-1].Day)
		if s.Over != (n == len(days)) || s.Complete() != s.Over || s.Curve.NoSeason {
			t.Fatalf("after %d days: over %t, complete %t, %+v", n, s.Over, s.Complete(), s.Curve)
		}
		if s.Curve.Index.Low < before {
			t.Fatalf("after %d days the index is %v, was %v", n, s.Curve.Index, before)
		}
		before = s.Curve.Index.Low
	}
	if len(days)%13 != 1 || before < 100 {
		t.Errorf("%d days, index %v", len(days), before)
	}
}
