package filling

import "slices"

// Month is a neighbour's regression in one month, or the climate's (Slope 0).
//
// The estimate of a day is Y + Slope (x - X), where Y and X are the normals of
// target and neighbour for the date: their means within 15 days of it, of the
// days on which both were observed. So the regression is of departures, and the
// course of the year, which any two stations share, is not taken for skill.
type Month struct {
	Usable      bool
	Days, Years int     // common days of the three months around, and their years
	R           float64 // correlation of daily means in these three months
	RDepartures float64 // correlation of departures from the normals in them
	Slope       float64
	InterceptC  float64 // estimate in the middle of the month for a neighbour at 0 degC
	Spread      Spread
}

// regression is a neighbour's, or the climate's, for the whole year.
type regression struct {
	station string
	months  [12]Month
	spreads spreads
	all     *sums        // around each date, of all years
	usable  [places]bool // enough years around the date
}

// regress fits; alone for the climate, where slopes are 0.
func regress(station string, days []common, alone bool, opt Options) *regression {
	g := &regression{station: station}
	var raw sums
	for i := range days {
		raw.add(&days[i])
	}
	g.all = raw.around()
	g.countYears(days, opt)
	var errors []residual
	for m := range g.months {
		errors = append(errors, g.month(m, days, alone, opt)...)
		g.spreads.months[m] = g.months[m].Spread
	}
	g.spreads.byDate(errors)
	return g
}

func (s *sums) add(c *common) {
	s.n[c.place]++
	s.x[c.place] += c.x
	s.y[c.place] += c.y
}

// countYears finds the dates with enough years around them.
func (g *regression) countYears(days []common, opt Options) {
	var count [places]int
	for i := 0; i < len(days); {
		var year sums
		first := i
		for ; i < len(days) && days[i].year == days[first].year; i++ {
			year.add(&days[i])
		}
		n := year.around().n
		for p := range n {
			if n[p] >= enoughOfYear {
				count[p]++
			}
		}
	}
	for p := range count {
		g.usable[p] = count[p] >= opt.LeastYears
	}
}

// month fits a month, and finds its errors by leaving out year after year. It
// returns those of the month itself.
func (g *regression) month(m int, days []common, alone bool, opt Options) []residual {
	set := make([]common, 0, len(days)/4)
	byYear := map[int]*sums{}
	own := 0
	for i := range days {
		c := days[i]
		c.year = c.yearAround(m)
		if byYear[c.year] == nil {
			byYear[c.year] = &sums{}
		}
		byYear[c.year].add(&c)
		if c.near(m) {
			set = append(set, c)
		}
		if c.month == m {
			own++
		}
	}
	out := &g.months[m]
	out.Days = len(set)
	var yearOf []int
	for i := range set {
		if i == 0 || set[i].year != set[i-1].year {
			yearOf = append(yearOf, set[i].year)
		}
	}
	out.Years = len(yearOf)
	if out.Days < opt.LeastDays || out.Years < opt.LeastYears || own < opt.LeastDays/4 {
		return nil
	}
	middle := [12]int{15, 45, 74, 105, 135, 166, 196, 227, 258, 288, 319, 349}[m]
	x, y, ok := g.all.normal(middle, nil)
	if !ok {
		return nil
	}
	out.InterceptC = y
	if !alone {
		d := moments(set, g.all, nil, 0)
		out.R, out.RDepartures, out.Slope = plain(set).r(), d.r(), d.slope()
		out.InterceptC -= out.Slope * x
	}
	var errors []residual
	i := 0
	for _, year := range yearOf {
		without := byYear[year].around()
		slope := 0.0
		if !alone {
			slope = moments(set, g.all, without, year).slope()
		}
		for ; i < len(set) && set[i].year == year; i++ {
			c := &set[i]
			if x, y, ok := g.all.normal(c.place, without); ok {
				errors = append(errors, residual{day: c.day, month: c.month, year: year, errorC: y + slope*(c.x-x) - c.y})
			}
		}
	}
	out.Spread = spreadOf(errors, m)
	out.Usable = out.Spread.Days >= opt.LeastDays/4 && out.Spread.Years >= opt.LeastYears && (alone || out.R >= opt.LeastR)
	return slices.DeleteFunc(errors, func(r residual) bool { return r.month != m })
}

// estimate returns the estimate of a date for a neighbour's mean.
func (g *regression) estimate(place, month int, xC float64) (meanC, seC float64, ok bool) {
	m := &g.months[month]
	if !m.Usable || !g.usable[place] {
		return 0, 0, false
	}
	x, y, ok := g.all.normal(place, nil)
	if !ok {
		return 0, 0, false
	}
	return y + m.Slope*(xC-x), g.spreads.se[place], true
}

// second are second moments about means.
type second struct{ xx, xy, yy float64 }

func (s second) slope() float64 {
	if s.xx <= 0 {
		return 0
	}
	return s.xy / s.xx
}

func (s second) r() float64 {
	if s.xx <= 0 || s.yy <= 0 {
		return 0
	}
	return s.xy / (standard(s.xx) * standard(s.yy))
}

// moments are those of the departures from the normals, which have no mean to
// speak of; without a year's days if without is not nil.
func moments(set []common, all, without *sums, year int) second {
	var s second
	for i := range set {
		c := &set[i]
		if without != nil && c.year == year {
			continue
		}
		x, y, ok := all.normal(c.place, without)
		if !ok {
			continue
		}
		s.xx += square(c.x - x)
		s.xy += (c.x - x) * (c.y - y)
		s.yy += square(c.y - y)
	}
	return s
}

// plain are the moments of the daily means themselves.
func plain(set []common) second {
	var s second
	mx, my := 0.0, 0.0
	for i := range set {
		mx, my = mx+set[i].x, my+set[i].y
	}
	mx, my = mx/float64(len(set)), my/float64(len(set))
	for i := range set {
		c := &set[i]
		s.xx += square(c.x - mx)
		s.xy += (c.x - mx) * (c.y - my)
		s.yy += square(c.y - my)
	}
	return s
}
