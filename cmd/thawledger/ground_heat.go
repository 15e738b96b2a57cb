package main

import (
	"fmt"

	"thawledger/indices/ground"
	"thawledger/indices/heat"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// record is a station's daily means.
type record struct {
	first   pipeline.Day
	days    []*float64                    // from first on; nil where missing
	dates   map[pipeline.MonthDay]float64 // mean of each date over the years, without 29 February
	hasMean bool                          // whether every date has one
	meanC   float64                       // their mean
}

const datesOfYear = 365

func newRecord(days []store.MeanRow) *record {
	r := &record{dates: map[pipeline.MonthDay]float64{}}
	if len(days) == 0 {
		return r
	}
	r.first = days[0].Day
	r.days = make([]*float64, days[len(days)-1].Day-r.first+1)
	n := map[pipeline.MonthDay]float64{}
	for i := range days {
		d := &days[i]
		if d.Origin == pipeline.Missing {
			continue
		}
		r.days[d.Day-r.first] = &d.MeanC
		if date := dateOf(d.Day); date != leapDay {
			r.dates[date] += d.MeanC
			n[date]++
		}
	}
	if r.hasMean = len(n) == datesOfYear; !r.hasMean {
		return r
	}
	for d := pipeline.DayOf(2001, 1, 1); d < pipeline.DayOf(2002, 1, 1); d++ {
		r.dates[dateOf(d)] /= n[dateOf(d)]
		r.meanC += r.dates[dateOf(d)] / datesOfYear
	}
	return r
}

var leapDay = pipeline.MonthDay{Month: 2, Day: 29}

func dateOf(d pipeline.Day) pipeline.MonthDay {
	_, month, day := d.Date()
	return pipeline.MonthDay{Month: month, Day: day}
}

// between returns the means from a day to another, both included; ok is false where
// one is missing.
func (r *record) between(from, to pipeline.Day) (out []float64, ok bool) {
	for d := from; d <= to; d++ {
		if d < r.first || int(d-r.first) >= len(r.days) || r.days[d-r.first] == nil {
			return nil, false
		}
		out = append(out, *r.days[d-r.first])
	}
	return out, true
}

// meanYear returns the year of date means that begins on a day's date.
func (r *record) meanYear(from pipeline.Day) (out []float64) {
	for d := from; len(out) < datesOfYear; d++ {
		if date := dateOf(d); date != leapDay {
			out = append(out, r.dates[date])
		}
	}
	return out
}

// The model's ground: cells of 0.1 m are within 0.2 % of Neumann's solution, and
// four times as fast as those of 0.05 m. The spin-up's end is judgement.
var modelGrid = heat.Grid{CellM: 0.1, FineM: 3, Growth: 1.15, DepthM: 15}

const (
	settledK       = 0.02
	mostSpinUp     = 60   // years
	geothermalKM   = 0.02 // K/m; usual are 0.01 to 0.03
	secondsPerDayS = 86400
)

// showHeat prints the thaw depth by conduction of heat: the mean year over and over,
// the year before the season as it was, and the season.
func (p program) showHeat(g *grounded, s *store.GroundSeason) error {
	why, line, err := g.heat(s)
	if err != nil {
		return err
	}
	if why != "" {
		line = "none: " + why
	}
	fmt.Fprintf(p.out, "    by a model of heat conduction: %s\n", line)
	return nil
}

// heat returns what the model says, or why it cannot say anything.
func (g *grounded) heat(s *store.GroundSeason) (why, line string, err error) {
	winter := g.latest(pipeline.Freeze, pipeline.Curve, anySeason)
	from := pipeline.DayOf(s.SeasonStart.Date())
	through := pipeline.DayOf(s.ThroughDay.Date())
	season, whole := g.record.between(from, through)
	switch {
	case s.NFactor == nil || winter == nil || winter.NFactor == nil:
		return "it wants n-factors for thaw and freeze", "", nil
	case !g.record.hasMean:
		return "the record has no complete year to settle with", "", nil
	case !whole:
		return fmt.Sprintf("days are missing from %s to %s", from, through), "", nil
	}
	surface := func(air []float64) []float64 {
		for i, c := range air { // an n-factor is a season's, not a day's: an approximation
			if c > 0 {
				air[i] = c * *s.NFactor
			} else {
				air[i] = c * *winter.NFactor
			}
		}
		return air
	}
	year := surface(g.record.meanYear(from))
	column, err := heat.New(g.profile, modelGrid, heat.GradientKM(geothermalKM), g.startC(year), heat.Options{})
	if err != nil {
		return err.Error(), "", nil
	}
	spun, err := column.SpinUp(year, secondsPerDayS, settledK, mostSpinUp)
	if err != nil {
		return "", "", err
	}
	before := "the mean year"
	if last, ok := g.record.between(from-datesOfYear, from-1); ok {
		if _, err := column.Run(surface(last), secondsPerDayS); err != nil {
			return "", "", err
		}
		before = "the year before as it was"
	}
	track, err := column.Run(surface(season), secondsPerDayS)
	if err != nil {
		return "", "", err
	}
	settled := fmt.Sprintf("settled after %d mean years", spun.Years)
	if !spun.Settled {
		settled = fmt.Sprintf("NOT settled after %d mean years, still changing by %.2f K and %.3f m a year", spun.Years, spun.ChangeK, spun.MovedM)
	}
	depth := fmt.Sprintf("%.2f m", track.DeepestM)
	if track.DeepestM >= modelGrid.DepthM-1e-6 {
		depth = "thawed to the base of the model: it has no permafrost"
	}
	return "", fmt.Sprintf("%s (%s, then %s; cells of %g m, time steps of at most %.0f s, %g m deep, %g K/m below)\n"+
		"      its surface is at n times the air's degrees from 0 degC, n of the season by sign, day by day: an approximation", depth, settled, before,
		modelGrid.CellM, column.StepS(), modelGrid.DepthM, geothermalKM), nil
}

// startC is a temperature near that on which the ground will settle.
func (g *grounded) startC(surfaceC []float64) float64 {
	var thaw, freeze float64
	for _, c := range surfaceC {
		thaw, freeze = thaw+max(0, c), freeze+max(0, -c)
	}
	depth := 1.0
	if last := g.profile[len(g.profile)-1]; last.ThicknessM > 0 {
		depth = min(depth, g.profile[0].ThicknessM)
	}
	thawed, frozen, err := g.profile.Conductivities(depth)
	if err != nil {
		return (thaw - freeze) / datesOfYear
	}
	c, _, err := ground.TTOP(thaw, freeze, thawed, frozen)
	if err != nil {
		return (thaw - freeze) / datesOfYear
	}
	return c
}
