package surface

import (
	"errors"
	"math"
	"slices"
	"testing"
	"time"

	"pgregory.net/rapid"

	"thawledger/indices/degreeday"
	"thawledger/pipeline"
)

// series is a hand series of daily means in degC: its thaw index is 51 degC.d
// and the sum of its positive values 60, by hand. Up to day 10 a false start.
var series = []float64{-6, -4, -2, 3, 2, -4, -5, -1, 1, 4, 6, 8, 9, 7, -3, 5, 6, 4, 2, -1, 3, -2, -5, -6, -8}

func window() degreeday.Window {
	return degreeday.WindowAt(pipeline.MonthDay{Month: time.January, Day: 15}, day(time.July, 1))
}

// season builds a season of means from the window's first day on.
func season(kind pipeline.Kind, meansC []float64, end pipeline.Day) degreeday.Season {
	days := make([]degreeday.DayMean, len(meansC))
	for i, c := range meansC {
		days[i] = degreeday.DayMean{Day: window().First + pipeline.Day(i), Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
	}
	return degreeday.Build(kind, window(), "2031", 0, days, end)
}

// whole is the hand series with frost to the window's end.
func whole() degreeday.Season {
	c := slices.Clone(series)
	for len(c) < window().Days() {
		c = append(c, -10)
	}
	return season(pipeline.Thaw, c, window().Last)
}

func same(n, m float64) Index {
	return Index{Low: degreeday.Bounds{Low: n, High: n}, Central: degreeday.Bounds{Low: m, High: m}, High: degreeday.Bounds{Low: m, High: m}}
}

// n of Portland cement concrete and bituminous pavement, TM 5-852-4, Table 4-1:
// 1.5 x 51 = 76.5; 1.6 x 60 = 96.
func TestAppliedByHand(t *testing.T) {
	s := whole()
	concrete := plain(pipeline.Thaw, window().First, 1.5)
	got, err := Applied(&s, pipeline.Curve, []Factor{concrete})
	if err != nil || got.Index != same(76.5, 76.5) || got.Notes != 0 || got.NoSeason || got.Through != window().Last {
		t.Errorf("%+v, error %v", got, err)
	}
	bituminous := plain(pipeline.Thaw, 0, 1.6)
	got, err = Applied(&s, pipeline.Sum, []Factor{bituminous})
	if err != nil || got.Index != same(96, 96) || got.Notes != OtherDefinition {
		t.Errorf("%+v, error %v", got, err)
	}
	ranged := Factor{Kind: pipeline.Thaw, Low: 1.5, Central: 1.75, High: 2}
	got, err = Applied(&s, pipeline.Curve, []Factor{ranged})
	if err != nil || got.Index.Bounds() != (degreeday.Bounds{Low: 76.5, High: 102}) || got.Index.Central.Low != 89.25 || got.Notes != NotStated {
		t.Errorf("%+v, error %v", got, err)
	}
}

// The n changes on the 13th day, when the air index to date is 19: by hand
// 1.5 x 19 + 2 x (51 - 19) = 92.5.
func TestSplitByHand(t *testing.T) {
	s := whole()
	change := window().First + 12
	factors := []Factor{plain(pipeline.Thaw, 0, 1.5), mid(plain(pipeline.Thaw, change, 2))}
	got, err := Applied(&s, pipeline.Curve, factors)
	if err != nil || got.Index != same(92.5, 92.5) || got.Notes != SplitSeason {
		t.Errorf("%+v, error %v", got, err)
	}
	days, err := Days(&s, pipeline.Curve, factors)
	if err != nil {
		t.Fatal(err)
	}
	// the day before, the day itself (28 degC.d) and the high
	for i, want := range map[int]float64{11: 28.5, 12: 28.5 + 2*9, 20: 92.5, 364: 92.5} {
		if days[i].Index != same(want, want) || days[i].Day != window().First+pipeline.Day(i) {
			t.Errorf("day %d: %+v; want %v", i, days[i], want)
		}
	}
	// not marked: from the next season
	factors[1].MidSeason = false
	if got, err := Applied(&s, pipeline.Curve, factors); err != nil || got.Index != same(76.5, 76.5) || got.Notes != 0 {
		t.Errorf("%+v, error %v", got, err)
	}
}

// n_t is applied to thaw only and n_f to freeze only.
func TestFactorsKeepToTheirKind(t *testing.T) {
	s := whole()
	thaw, freeze := plain(pipeline.Thaw, 0, 1.5), plain(pipeline.Freeze, 1, 0.7)
	if _, err := Applied(&s, pipeline.Curve, []Factor{freeze}); !errors.Is(err, ErrNoFactor) {
		t.Errorf("n_f applied to thaw: error %v", err)
	}
	with, err := Applied(&s, pipeline.Curve, []Factor{thaw, freeze})
	if without, _ := Applied(&s, pipeline.Curve, []Factor{thaw}); err != nil || with != without {
		t.Errorf("n_f changes a thaw index: %+v, %+v, error %v", with, without, err)
	}
	cold := make([]float64, len(series))
	for i, c := range series {
		cold[i] = -c
	}
	f := season(pipeline.Freeze, cold, window().First+24)
	if _, err := Applied(&f, pipeline.Curve, []Factor{thaw}); !errors.Is(err, ErrNoFactor) {
		t.Errorf("n_t applied to freeze: error %v", err)
	}
	got, err := Applied(&f, pipeline.Curve, []Factor{thaw, freeze})
	if want := 0.7 * 51; err != nil || got.Kind != pipeline.Freeze || math.Abs(got.Index.Central.Low-want) > 1e-12 {
		t.Errorf("%+v, error %v; want %v", got, err, want)
	}
}

// A seasonal n on part of a season is an approximation, and that is said.
func TestPartOfSeasonIsSaid(t *testing.T) {
	s := season(pipeline.Thaw, series[:15], window().First+14)
	got, err := Applied(&s, pipeline.Curve, []Factor{plain(pipeline.Thaw, 0, 1.5)})
	if err != nil || got.Notes != PartOfSeason || got.Notes.String() != "the n-factor is a figure of a whole season; on part of one it is an approximation" {
		t.Errorf("%+v (%s), error %v", got, got.Notes, err)
	}
}

func TestNoAirSeason(t *testing.T) {
	s := season(pipeline.Thaw, make([]float64, window().Days()), window().Last)
	if got, err := Applied(&s, pipeline.Curve, []Factor{plain(pipeline.Thaw, 0, 1.5)}); err != nil || !got.NoSeason || got.Index != (Index{}) {
		t.Errorf("%+v, error %v", got, err)
	}
}

func TestAppliedRefuses(t *testing.T) {
	s := whole()
	for _, by := range []pipeline.Definition{pipeline.Monthly, pipeline.NotStated, ""} {
		if _, err := Applied(&s, by, []Factor{plain(pipeline.Thaw, 0, 1.5)}); err == nil {
			t.Errorf("%q accepted", by)
		}
		if _, err := Days(&s, by, []Factor{plain(pipeline.Thaw, 0, 1.5)}); err == nil {
			t.Errorf("%q accepted", by)
		}
	}
}

// drawFactors draws one factor before the season and up to three within it.
func drawFactors(t *rapid.T) []Factor {
	var out []Factor
	from := window().First
	for range rapid.IntRange(1, 4).Draw(t, "factors") {
		a, b, c := rapid.Float64Range(0.1, 3).Draw(t, "n"), rapid.Float64Range(0, 1).Draw(t, "more"), rapid.Float64Range(0, 1).Draw(t, "most")
		out = append(out, Factor{Kind: pipeline.Thaw, From: from, MidSeason: true, Low: a, Central: a + b, High: a + b + c})
		from += pipeline.Day(rapid.IntRange(1, 15).Draw(t, "days"))
	}
	return out
}

func drawDays(t *rapid.T) []degreeday.DayMean {
	means := rapid.SliceOfN(rapid.Float64Range(-15, 15), 1, 50).Draw(t, "means")
	out := make([]degreeday.DayMean, len(means))
	for i, c := range means {
		out[i] = degreeday.DayMean{Day: window().First + pipeline.Day(i), Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
		if rapid.IntRange(0, 3).Draw(t, "lost") == 0 {
			out[i] = degreeday.DayMean{Day: out[i].Day, Origin: pipeline.Missing, LowC: c, HighC: c + rapid.Float64Range(0, 20).Draw(t, "range")}
		}
	}
	return out
}

func build(days []degreeday.DayMean) degreeday.Season {
	return degreeday.Build(pipeline.Thaw, window(), "2031", 0, days, days[len(days)-1].Day)
}

const slack = 1e-9

// Whatever the missing days were, the true surface index is within the bounds.
func TestBoundsHoldForEveryFilling(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		days, factors := drawDays(t), drawFactors(t)
		by := rapid.SampledFrom([]pipeline.Definition{pipeline.Curve, pipeline.Sum}).Draw(t, "by")
		filled := slices.Clone(days)
		for i, m := range days {
			if m.Origin == pipeline.Missing {
				c := rapid.Float64Range(m.LowC, m.HighC).Draw(t, "true mean")
				filled[i] = degreeday.DayMean{Day: m.Day, Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
			}
		}
		open, full := build(days), build(filled)
		got, err := Days(&open, by, factors)
		truth, err2 := Days(&full, by, factors)
		if err != nil || err2 != nil {
			t.Fatal(err, err2)
		}
		for i := range got {
			for _, p := range [][2]degreeday.Bounds{
				{got[i].Index.Low, truth[i].Index.Low}, {got[i].Index.Central, truth[i].Index.Central}, {got[i].Index.High, truth[i].Index.High},
			} {
				if p[1].Low != p[1].High {
					t.Fatalf("day %d: no day missing, yet %+v", i, p[1])
				}
				if p[0].Low > p[1].Low+slack || p[0].High < p[1].Low-slack {
					t.Fatalf("day %d: truth %v outside %+v", i, p[1].Low, p[0])
				}
			}
		}
	})
}

// Three days of a false start are missing, 0 to 10 degC each; then the n doubles,
// and the air index comes to 40. By hand: if they were at 0, 2 x 40 = 80; if at
// 10, the index to date was 30 and 1 x 30 + 2 x 10 = 50.
func TestMissingFalseStart(t *testing.T) {
	means := []float64{-5, 0, 0, 0, -50, 20, 20}
	days := make([]degreeday.DayMean, len(means))
	for i, c := range means {
		days[i] = degreeday.DayMean{Day: window().First + pipeline.Day(i), Origin: pipeline.Observed, MeanC: c, LowC: c, HighC: c}
		if c == 0 {
			days[i] = degreeday.DayMean{Day: days[i].Day, Origin: pipeline.Missing, LowC: 0, HighC: 10}
		}
	}
	s := build(days)
	got, err := Days(&s, pipeline.Curve, []Factor{plain(pipeline.Thaw, 0, 1), mid(plain(pipeline.Thaw, window().First+5, 2))})
	if err != nil {
		t.Fatal(err)
	}
	if b := got[4].Index.Bounds(); b != (degreeday.Bounds{Low: 0, High: 30}) {
		t.Errorf("before the change %+v; want 0 to 30", b)
	}
	if b := got[6].Index.Bounds(); b != (degreeday.Bounds{Low: 50, High: 80}) {
		t.Errorf("at the end %+v; want 50 to 80", b)
	}
}

// From day to day the surface index never falls, and rises by no more than the
// greatest n in force times what the sum index may have risen: no jump where an
// n gives way to another.
func TestContinuousAndNeverFalls(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		days, factors := drawDays(t), drawFactors(t)
		by := rapid.SampledFrom([]pipeline.Definition{pipeline.Curve, pipeline.Sum}).Draw(t, "by")
		s := build(days)
		got, err := Days(&s, by, factors)
		if err != nil {
			t.Fatal(err)
		}
		var greatest float64
		for _, f := range factors {
			greatest = max(greatest, f.High)
		}
		for i := 1; i < len(got); i++ {
			a, b := got[i-1].Index, got[i].Index
			most := slack + greatest*(s.Days[i].Sum.High-s.Days[i-1].Sum.High)
			for _, p := range [][2]float64{
				{a.Low.Low, b.Low.Low}, {a.Low.High, b.Low.High}, {a.Central.Low, b.Central.Low},
				{a.Central.High, b.Central.High}, {a.High.Low, b.High.Low}, {a.High.High, b.High.High},
			} {
				if p[1] < p[0]-slack {
					t.Fatalf("day %d: fell from %v to %v", i, p[0], p[1])
				}
				if p[1]-p[0] > most {
					t.Fatalf("day %d: jumped from %v to %v; the air let expect at most %v", i, p[0], p[1], most)
				}
			}
			if b.Low.Low > b.Central.Low || b.Central.Low > b.High.Low || b.Low.High > b.Central.High || b.Central.High > b.High.High ||
				b.Low.Low > b.Low.High || b.Central.Low > b.Central.High || b.High.Low > b.High.High {
				t.Fatalf("day %d: out of order: %+v", i, b)
			}
		}
	})
}

// A change of n moves nothing before its date; a greater n gives no less.
func TestChangeOfN(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		days, factors := drawDays(t), drawFactors(t)
		s := build(days)
		all, err := Days(&s, pipeline.Curve, factors)
		if err != nil {
			t.Fatal(err)
		}
		last := factors[len(factors)-1]
		if len(factors) > 1 {
			without, _ := Days(&s, pipeline.Curve, factors[:len(factors)-1])
			for i, d := range all {
				if d.Day < last.From && d != without[i] {
					t.Fatalf("%s: %+v; without what comes later %+v", d.Day, d, without[i])
				}
			}
		}
		greater := slices.Clone(factors)
		for i := range greater {
			by := rapid.Float64Range(0, 1).Draw(t, "by")
			greater[i].Low, greater[i].Central, greater[i].High = greater[i].Low+by, greater[i].Central+by, min(greater[i].High+by, MostN)
		}
		if s.Missing > 0 {
			return // bounds may narrow as n rises
		}
		more, err := Days(&s, pipeline.Curve, greater)
		if err != nil {
			t.Fatal(err)
		}
		for i := range all {
			if more[i].Index.Low.Low < all[i].Index.Low.Low-slack || more[i].Index.High.Low < all[i].Index.High.Low-slack {
				t.Fatalf("day %d: %+v with greater n, was %+v", i, more[i], all[i])
			}
		}
	})
}

// One n for the season: n times the air index, bit for bit.
func TestOneNIsAProduct(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := build(drawDays(t))
		f := drawFactors(t)[0]
		got, err := Days(&s, pipeline.Curve, []Factor{f})
		if err != nil {
			t.Fatal(err)
		}
		for i, d := range s.Days {
			a := d.CurveToDate
			for _, p := range []struct {
				got degreeday.Bounds
				n   float64
			}{{got[i].Index.Low, f.Low}, {got[i].Index.Central, f.Central}, {got[i].Index.High, f.High}} {
				if p.got != (degreeday.Bounds{Low: p.n * a.Low, High: p.n * a.High}) {
					t.Fatalf("day %d: %+v, %v times %+v", i, p.got, p.n, a)
				}
			}
		}
	})
}
