package propose

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"thawledger/ingest/normal"
	"thawledger/pipeline"
)

// What settings take for sensor and level_m if they are left out.
const (
	defaultSensor = "air"
	defaultLevelM = 1.5
)

// setValues takes over the temperature columns and asks for what they leave open.
func (p *Proposal) setValues(t *table, when *timing, w *place, f *temps) {
	p.askVariables(f)
	units := p.units(f, seasonOf(f, when, w.latitude))
	missing := p.missing(t, f)
	taken := slices.Clone(when.columns)
	for _, x := range f.values {
		taken = append(taken, x.column)
	}
	flagged := false
	for i, x := range f.values {
		v := pipeline.ValueColumn{Column: x.column.ref(), Variable: x.variable.String(), Unit: units[i],
			Sensor: defaultSensor, LevelM: defaultLevelM, Missing: missing}
		if flags := t.flagOf(x.column, taken); flags != nil {
			v.Flag, flagged = p.flag(x.column, flags), true
		}
		p.Layout.Values = append(p.Layout.Values, v)
		if x.column.numeric == 0 {
			p.note("column %s has no value in the sample", x.column.called())
		}
	}
	if flagged {
		p.note("a flag that the sample does not have sets its value aside until it has a mark")
	}
	for _, x := range f.others {
		unit, stated := x.column.statedUnit()
		if !stated {
			unit = units[0]
		}
		p.others = append(p.others, pipeline.ValueColumn{Column: x.column.ref(), Variable: x.variable.String(), Unit: unit})
	}
	p.noteCrossed(f)
}

// askVariables asks where it is not plain which columns are which.
func (p *Proposal) askVariables(f *temps) {
	if !f.unsure {
		return
	}
	why := map[howFound]string{byTemperature: "by its name", byUnit: "by the unit in its name", byStatistic: "by a name that does not say of what it is", byValues: "by its values only"}[f.how]
	for _, x := range f.values {
		q := Question{About: Variable, Column: x.column.ref(), Options: []string{x.column.ref()}, Chosen: x.column.ref()}
		q.Text = fmt.Sprintf("%s is taken for %s, %s: is it, of the air at the station?", x.column.called(), x.variable, why)
		for _, o := range f.others {
			if o.variable == x.variable || f.how == byValues {
				q.Options = append(q.Options, o.column.ref())
			}
		}
		if len(q.Options) > 1 {
			q.Text += " It could also be " + strings.Join(q.Options[1:min(len(q.Options), 9)], ", ")
		}
		p.ask(q)
	}
}

// units returns the unit of each column and asks where no name gives it.
func (p *Proposal) units(f *temps, s *season) []pipeline.TempUnit {
	guess, why := s.guess()
	var out []pipeline.TempUnit
	var unstated []*column
	for _, x := range f.values {
		unit, stated := x.column.statedUnit()
		if !stated {
			unstated = append(unstated, x.column)
			unit = guess
		} else if doubt := s.doubt(unit); doubt != "" && s.lo <= s.hi {
			p.ask(Question{About: Unit, Column: x.column.ref(), Options: unitNames(), Chosen: string(unit),
				Text: fmt.Sprintf("the name of %s says %s, and yet %s: is it so?", x.column.called(), unit, doubt)})
		}
		out = append(out, unit)
	}
	if len(unstated) > 0 {
		p.ask(Question{About: Unit, Column: unstated[0].ref(), Options: unitNames(), Chosen: string(guess),
			Text: fmt.Sprintf("the file does not say of what unit %s is: %s", listedColumns(unstated), why)})
	}
	return out
}

func unitNames() (out []string) {
	for _, u := range pipeline.TempUnits {
		out = append(out, string(u))
	}
	return out
}

// missing returns the texts that stand for no value, and asks for those that are
// numbers, and for texts that are not known to.
func (p *Proposal) missing(t *table, f *temps) []string {
	var out, doubtful, unknown []string
	add := func(list *[]string, text string) {
		if !slices.Contains(*list, text) {
			*list = append(*list, text)
		}
	}
	for _, x := range f.values {
		for _, text := range x.column.missing {
			add(&out, text)
		}
		for _, text := range x.column.doubtful {
			add(&doubtful, text)
		}
		for _, text := range x.column.unknown {
			add(&unknown, text)
		}
	}
	// What stands for no value in other columns is likely to come here too.
	for _, c := range t.columns {
		for _, text := range c.doubtful {
			if v, err := normal.ParseNumber([]byte(text)); err == nil && ofNines(v) && (v <= -99 || v >= 999) && len(out) < 20 && !slices.Contains(out, text) {
				add(&out, text)
				add(&doubtful, text)
			}
		}
	}
	slices.Sort(out)
	if len(doubtful) > 0 {
		slices.Sort(doubtful)
		p.ask(Question{About: Missing, Options: doubtful, Chosen: strings.Join(doubtful, ", "),
			Text: fmt.Sprintf("%s: far outside the rest of its column, so taken for no value. Is it, for all columns?", listed(doubtful))})
	}
	if len(unknown) > 0 {
		slices.Sort(unknown)
		p.ask(Question{About: Missing, Options: unknown, Chosen: "set aside",
			Text: fmt.Sprintf("%s among the temperatures: does it stand for no value? Until it is listed as missing, such a cell is set aside", listed(unknown))})
	}
	return out
}

// noteCrossed counts rows whose min is above their max.
func (p *Proposal) noteCrossed(f *temps) {
	var over, under *column
	for _, x := range f.values {
		switch x.variable {
		case pipeline.AirTempMax:
			over = x.column
		case pipeline.AirTempMin:
			under = x.column
		}
	}
	if over == nil || under == nil {
		return
	}
	n, both := 0, 0
	for row, v := range over.values {
		w := under.values[row]
		if !math.IsNaN(v) && !math.IsNaN(w) {
			if both++; w > v {
				n++
			}
		}
	}
	switch {
	case n == 0:
	case float64(n) > (1-leastOver)*float64(both):
		p.ask(Question{About: Variable, Column: over.ref(), Options: []string{over.ref(), under.ref()}, Chosen: over.ref(),
			Text: fmt.Sprintf("in %d of %d rows the min %s is above the max %s: are these columns what their names say?", n, both, under.called(), over.called())})
	default:
		p.note("in %d of %d rows the min is above the max", n, both)
	}
}
