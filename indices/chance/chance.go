package chance

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"thawledger/indices/extreme"
	"thawledger/indices/trend"
	"thawledger/pipeline"
)

// tail returns the end of the distribution at which a design value is passed.
func tail(d pipeline.Direction) extreme.Tail {
	if d == pipeline.NotBelow {
		return extreme.Lower
	}
	return extreme.Upper
}

// passes says whether an index passes a design value: at or above it, or, of what
// must not fall below, below it.
func passes(d pipeline.Direction, index, design float64) bool {
	if d == pipeline.NotBelow {
		return index < design
	}
	return index >= design
}

// Of answers a question. It is an error if there is no season, if a value is not
// finite, if a year is there twice or is not before ThisYear. It panics if
// LifeYears is below 1.
//
// Latest rests on the seasons of the 30 years up to the record's last; the years
// that are left are taken to be like them and independent: 1 - (1-p)^m.
//
// Trend rests on all seasons: the line of Theil and Sen is drawn, and each season
// moved along it to ThisYear, with what it deviated by. Over the years that are
// left the line is taken to go on with the same slope, the deviations to stay as
// they are, and the years to be independent: 1 - (1-p(1))(1-p(2))...(1-p(m)). Its
// interval allows for the slope's error too, each replicate having a line of its own.
func Of(q Question) (Answer, error) {
	if q.LifeYears < 1 {
		panic(fmt.Sprintf("chance: %d years of service remain", q.LifeYears))
	}
	seasons, err := q.ordered()
	if err != nil {
		return Answer{}, err
	}
	a := Answer{Seasons: len(seasons)}
	for _, s := range seasons {
		if passes(q.Direction, s.CDays, q.DesignCDays) {
			a.Passed = append(a.Passed, s)
		}
	}
	a.Rank = len(a.Passed) + 1
	if a.Latest, err = q.latest(seasons); err != nil {
		return Answer{}, err
	}
	if len(seasons) < trend.MinPoints {
		a.NoTrend = fmt.Sprintf("%d complete seasons are too few", len(seasons))
		return a, nil
	}
	points := pointsOf(seasons)
	if a.Change, err = changeOf(points); err != nil {
		return Answer{}, err
	}
	if len(seasons) < TrendSeasons {
		a.NoTrend = fmt.Sprintf("%d complete seasons are too few to draw a line through; %d are needed", len(seasons), TrendSeasons)
		return a, nil
	}
	moved := q.moved(points, a.Change.Line)
	a.Trend = &moved
	return a, nil
}

// ordered returns the seasons in order of time, or says why they will not do.
func (q *Question) ordered() ([]Season, error) {
	if len(q.Seasons) == 0 {
		return nil, errors.New("there is no complete season")
	}
	out := slices.SortedFunc(slices.Values(q.Seasons), func(a, b Season) int { return cmp.Compare(a.Year, b.Year) })
	for i, s := range out {
		if math.IsNaN(s.CDays) || math.IsInf(s.CDays, 0) {
			return nil, fmt.Errorf("the index %v of %s is not finite", s.CDays, s.Label)
		}
		if i > 0 && s.Year == out[i-1].Year {
			return nil, fmt.Errorf("two seasons, %s and %s, start in %d", out[i-1].Label, s.Label, s.Year)
		}
		if s.Year >= q.ThisYear {
			return nil, fmt.Errorf("season %s starts in %d, which is not before this year, %d", s.Label, s.Year, q.ThisYear)
		}
	}
	return out, nil
}

func pointsOf(seasons []Season) []trend.Point {
	out := make([]trend.Point, len(seasons))
	for i, s := range seasons {
		out[i] = trend.Point{Time: float64(s.Year), Value: s.CDays}
	}
	return out
}

// lineConfidence is that of the slope's bounds in reports.
const lineConfidence = 0.95

func changeOf(points []trend.Point) (*Change, error) {
	k, err := trend.MannKendall(points)
	if err != nil {
		return nil, err
	}
	line, err := trend.TheilSen(points, lineConfidence)
	if err != nil {
		return nil, err
	}
	c := &Change{Kendall: k, Line: line}
	c.LagOne, c.LagPairs, c.HasLag = trend.LagOne(points, line)
	return c, nil
}

// latest is the estimate by the latest 30 years.
func (q *Question) latest(seasons []Season) (Estimate, error) {
	last := seasons[len(seasons)-1].Year
	first := slices.IndexFunc(seasons, func(s Season) bool { return s.Year > last-LatestYears })
	seasons = seasons[first:]
	values := make([]float64, len(seasons))
	for i, s := range seasons {
		values[i] = s.CDays
	}
	e := q.counted(values)
	e.First, e.Last = seasons[0].Year, last
	if best, ok := q.best(values); ok {
		e.Fitted = &Fitted{
			Fitted: best, Chance: extreme.Chance(best.Distribution, tail(q.Direction), q.DesignCDays),
			Interval: best.Resampled.ChanceInterval(tail(q.Direction), q.DesignCDays),
		}
	}
	e.Life = extreme.ChanceInLife(e.Chance(), q.LifeYears)
	return e, nil
}

// best returns the distribution to go by; not ok if there can be none.
func (q *Question) best(values []float64) (extreme.Fitted, bool) {
	fits, err := extreme.FitAll(values, q.Bootstrap)
	if err != nil {
		return extreme.Fitted{}, false // too few, or all the same: the count stands alone
	}
	return fits[extreme.Best(fits)], true
}

// counted is the part of an estimate that is counted.
func (q *Question) counted(values []float64) Estimate {
	e := Estimate{Seasons: len(values)}
	for _, v := range values {
		if passes(q.Direction, v, q.DesignCDays) {
			e.Passed++
		}
	}
	e.Empirical = (float64(e.Passed) + 0.5) / (float64(e.Seasons) + 1)
	e.EmpiricalInterval = Wilson(e.Passed, e.Seasons, q.Bootstrap.Confidence)
	return e
}

// moved is the estimate by the residuals about the line, moved to this year.
func (q *Question) moved(points []trend.Point, line trend.Line) Estimate {
	residuals := line.Residuals(points)
	now := line.At(float64(q.ThisYear))
	values := make([]float64, len(residuals))
	for i, e := range residuals {
		values[i] = now + e
	}
	e := q.counted(values)
	e.First, e.Last = int(points[0].Time), int(points[len(points)-1].Time)
	// The design value is moved back by as much as the line has risen, and not the
	// distribution along: that is the same, and one fit serves all years.
	// A distribution so lopsided that records drawn from it cannot be fitted says
	// nothing that could be relied on: only the share of the years is left.
	var life extreme.Distribution
	if best, ok := q.best(residuals); ok {
		if interval, ok := q.movedInterval(points, line, best.Distribution); ok {
			e.Fitted = &Fitted{
				Fitted: best, Interval: interval,
				Chance: extreme.Chance(best.Distribution, tail(q.Direction), q.DesignCDays-now),
			}
			life = best.Distribution
		}
	}
	e.Life = q.lifeAlong(line, residuals, life)
	return e
}

// lifeAlong is the chance of passing the design value at least once in the years
// that remain, the line going on.
func (q *Question) lifeAlong(line trend.Line, residuals []float64, d extreme.Distribution) float64 {
	spared := 0.0 // logarithm of the chance of never passing it
	for m := range q.LifeYears {
		limit := q.DesignCDays - line.At(float64(q.ThisYear+m))
		var p float64
		if d != nil {
			p = extreme.Chance(d, tail(q.Direction), limit)
		} else {
			passed := 0
			for _, e := range residuals {
				if passes(q.Direction, e, limit) {
					passed++
				}
			}
			p = (float64(passed) + 0.5) / (float64(len(residuals)) + 1)
		}
		if p >= 1 {
			return 1
		}
		spared += math.Log1p(-p)
	}
	return -math.Expm1(spared)
}

// movedInterval draws records from the line and the residuals' distribution, and
// does with each what was done with the record; ok is false if one in ten of them
// does not let itself be fitted.
func (q *Question) movedInterval(points []trend.Point, line trend.Line, d extreme.Distribution) (interval extreme.Interval, ok bool) {
	random := rand.New(rand.NewPCG(q.Bootstrap.Seed, uint64(q.ThisYear)))
	drawn := make([]trend.Point, len(points))
	noise := make([]float64, len(points))
	var chances []float64
	for failed := 0; len(chances) < q.Bootstrap.Replicates; {
		extreme.Draw(d, random, noise)
		for i, p := range points {
			drawn[i] = trend.Point{Time: p.Time, Value: line.At(p.Time) + noise[i]}
		}
		other, err := trend.TheilSen(drawn, lineConfidence)
		if err == nil {
			var fit extreme.Distribution
			if fit, err = extreme.Fit(d.Name(), other.Residuals(drawn)); err == nil {
				limit := q.DesignCDays - other.At(float64(q.ThisYear))
				chances = append(chances, extreme.Chance(fit, tail(q.Direction), limit))
				continue
			}
		}
		if failed++; failed > q.Bootstrap.Replicates/10 {
			return extreme.Interval{}, false
		}
	}
	return extreme.Percentile(chances, q.Bootstrap.Confidence), true
}

// Wilson returns the score interval of a chance by which k of n came true (E. B.
// Wilson, 1927, J. Am. Statist. Assoc. 22; that of R's prop.test without
// correction). It panics unless 0 <= k <= n and n > 0.
func Wilson(k, n int, confidence float64) extreme.Interval {
	if k < 0 || k > n || n < 1 {
		panic(fmt.Sprintf("chance: %d of %d", k, n))
	}
	z := math.Sqrt2 * math.Erfinv(confidence)
	p, m := float64(k)/float64(n), float64(n)
	middle := (p + z*z/(2*m)) / (1 + z*z/m)
	half := z / (1 + z*z/m) * math.Sqrt(p*(1-p)/m+z*z/(4*m*m))
	out := extreme.Interval{Low: max(0, middle-half), High: min(1, middle+half), Confidence: confidence}
	if k == 0 {
		out.Low = 0 // where rounding may leave a little above it
	}
	if k == n {
		out.High = 1
	}
	return out
}
