package propose

import (
	"errors"
	"fmt"
	"slices"

	"thawledger/pipeline"
)

// temps is the temperature columns of a table.
type temps struct {
	values []temp
	others []temp // that are temperatures too, and not proposed
	how    howFound
	unsure bool // of what they are
}

// temp is a column and what it is a value of.
type temp struct {
	column   *column
	variable pipeline.Variable
}

// howFound says how temperature columns were told from others.
type howFound int

const (
	byTemperature howFound = iota + 1 // their names say temperature
	byUnit                            // their names, or a line of units, give a unit of temperature
	byStatistic                       // their names are mean, max, min only
	byValues                          // nothing but their values
)

// Bounds of judgement; no source.
const (
	leastNumbers  = 0.6  // of the cells that are not empty
	leastOver     = 0.98 // of rows in which a max is at least the min
	leastSpread   = 0.5  // of temperatures, in any unit
	mostDegrees   = 150.0
	leastTogether = 0.6 // correlation of temperatures of one place
	subDaily      = 20 * 3600
	leastDistinct = 5
)

// findTemperatures returns the columns that hold air temperatures.
func (t *table) findTemperatures(when *timing, where *place) (*temps, error) {
	var by [byValues + 1][]*column
	commas := ""
	for _, c := range t.columns {
		if slices.Contains(when.columns, c) || c == where.column || slices.Contains(where.skip, c) {
			continue
		}
		if n := commaCells(c); n*2 > c.filled && n > 0 && commas == "" {
			commas = c.called()
		}
		if how := c.temperature(); how > 0 {
			by[how] = append(by[how], c)
		}
	}
	if c := t.kinds(); c != nil {
		return nil, fmt.Errorf("column %s says of each row what its value is (%s), so that max and min stand in one column, which no layout reads: give each a column of its own",
			c.called(), listed(sortedKeys(c.distinct)))
	}
	f := &temps{}
	for how := byTemperature; how <= byValues && len(f.values) == 0; how++ {
		f.how = how
		if how == byValues {
			by[how] = likeliest(by[how])
		}
		f.choose(by[how], when)
	}
	switch {
	case len(f.values) > 0:
		return f, nil
	case commas != "":
		return nil, fmt.Errorf("column %s holds numbers with a decimal comma, which no layout reads: write them with a point", commas)
	}
	text := fmt.Sprintf("a table of %d columns with times in %s was found, and no column of it that holds air temperatures", len(t.columns), listedColumns(when.columns))
	for _, c := range t.columns {
		if c.name != "" {
			return nil, errors.New(text + ": neither its name nor its values would suit any")
		}
	}
	return nil, errors.New(text)
}

// kinds returns the column that names several variables by turns; nil if there
// is none.
func (t *table) kinds() *column {
	for _, c := range t.columns {
		n := 0
		for text := range c.texts {
			words := wordsOf(text)
			has := func(list []string) bool {
				return slices.ContainsFunc(words, func(w string) bool { return slices.Contains(list, w) })
			}
			if has(tempWords) && (has(maxWords) || has(minWords) || has(meanWords)) {
				n++
			}
		}
		if n > 1 && c.numeric == 0 {
			return c
		}
	}
	return nil
}

func commaCells(c *column) (n int) {
	for text, times := range c.texts {
		if hasDecimalComma(text) {
			n += times
		}
	}
	return n
}

// temperature says by what a column may be an air temperature; 0 if it is none.
func (c *column) temperature() howFound {
	if c.has(otherWords...) {
		return 0
	}
	_, unit := c.statedUnit()
	isTemp, isStat := c.has(tempWords...), c.has(meanWords...) || c.has(maxWords...) || c.has(minWords...)
	switch {
	case c.filled == 0 || c.numeric == 0:
		if isTemp && len(c.unknown) == 0 {
			return byTemperature // there is none in this sample
		}
		return 0
	case float64(c.numeric) < leastNumbers*float64(c.filled-noValues(c)):
		return 0
	case isTemp:
		return byTemperature
	case unit:
		return byUnit
	case !c.likeDegrees():
		return 0
	case isStat:
		return byStatistic
	}
	return byValues
}

func noValues(c *column) (n int) {
	for text, times := range c.texts {
		if standsForNothing(text) {
			n += times
		}
	}
	return n
}

// likeDegrees reports whether the values could be temperatures of air.
func (c *column) likeDegrees() bool {
	lo, hi, ok := c.bounds()
	return ok && lo >= -mostDegrees && hi <= mostDegrees && hi-lo >= leastSpread && len(c.distinct) >= min(leastDistinct, c.numeric)
}

// choose picks what is proposed: of days the max and min, or else the mean; of
// shorter steps the temperature itself, or else the mean.
func (f *temps) choose(all []*column, when *timing) {
	of := map[pipeline.Variable][]*column{}
	for _, c := range all {
		v := pipeline.AirTemp
		switch isMax, isMin := c.has(maxWords...), c.has(minWords...); {
		case isMax && !isMin:
			v = pipeline.AirTempMax
		case isMin && !isMax:
			v = pipeline.AirTempMin
		case c.has(meanWords...):
			v = pipeline.AirTempMean
		}
		of[v] = append(of[v], c)
	}
	// A column that has values goes before one that has hardly any.
	for v, list := range of {
		slices.SortStableFunc(list, func(a, b *column) int {
			few := func(c *column) int {
				if c.numeric*20 < len(c.cells) {
					return 1
				}
				return 0
			}
			return few(a) - few(b)
		})
		of[v] = list
	}
	maxes, mins, means, plain := of[pipeline.AirTempMax], of[pipeline.AirTempMin], of[pipeline.AirTempMean], of[pipeline.AirTemp]
	daily := !when.subDaily()
	if daily && len(maxes) == 0 && len(mins) == 0 && f.how == byValues {
		if a, b := pair(plain); a != nil {
			maxes, mins, f.unsure = []*column{a}, []*column{b}, true
			plain = slices.DeleteFunc(slices.Clone(plain), func(c *column) bool { return c == a || c == b })
		}
	}
	use := func(v pipeline.Variable, list []*column) {
		f.values = append(f.values, temp{list[0], v})
		f.unsure = f.unsure || len(list) > 1
	}
	switch {
	case daily && len(maxes) > 0 && len(mins) > 0:
		use(pipeline.AirTempMax, maxes)
		use(pipeline.AirTempMin, mins)
	case daily && len(means) > 0:
		use(pipeline.AirTempMean, means)
	case daily && len(plain) > 0:
		use(pipeline.AirTempMean, plain)
		f.unsure = true
	case len(plain) > 0 && !daily:
		use(pipeline.AirTemp, plain)
	case len(means) > 0:
		use(pipeline.AirTempMean, means)
	case len(maxes) > 0 || len(mins) > 0:
		f.unsure = true
		if len(maxes) > 0 {
			use(pipeline.AirTempMax, maxes)
		}
		if len(mins) > 0 {
			use(pipeline.AirTempMin, mins)
		}
	}
	f.unsure = f.unsure || f.how >= byUnit
	for _, v := range []pipeline.Variable{pipeline.AirTempMax, pipeline.AirTempMin, pipeline.AirTempMean, pipeline.AirTemp} {
		for _, c := range of[v] {
			if slices.ContainsFunc(f.values, func(x temp) bool { return x.column == c }) {
				continue
			}
			if daily && v == pipeline.AirTemp {
				v = pipeline.AirTempMean // a day has no instant
			}
			f.others = append(f.others, temp{c, v})
		}
	}
}

func listedColumns(columns []*column) string {
	text := ""
	for i, c := range columns {
		if i > 0 {
			text += ", "
		}
		text += c.called()
	}
	return text
}
