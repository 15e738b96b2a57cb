package text

import (
	"fmt"
	"math"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
)

func indexName(i *delivery.Item) string {
	if i.Index == pipeline.Freeze {
		return "freezing index"
	}
	return "thaw index"
}

// says is what is so, in a few words.
func says(i *delivery.Item) string {
	name := indexName(i)
	if i.Kind == delivery.Drill {
		return name + ", exercise only"
	}
	if i.Kind == delivery.Withdrawal {
		return name + " " + afterAll(i)
	}
	switch i.To {
	case pipeline.Exceeded:
		if i.ToDate.Central != nil && *i.ToDate.Central == i.Design.CDays {
			return name + " at its design value"
		}
		return name + " past its design value"
	case pipeline.Unknown:
		if i.Direction == pipeline.NotBelow {
			return name + " may fall short of its design value, days are missing"
		}
		return name + " may be past its design value, days are missing"
	case pipeline.Expected:
		if i.Outlook != nil && i.Outlook.Date != nil {
			return name + " expected to pass its design value about " + i.Outlook.Date.P50.Time().Format("2 January")
		}
		return name + " expected to pass its design value"
	case pipeline.Near:
		return name + " near its design value"
	case pipeline.FellShort:
		return name + " fell short of its design value"
	}
	switch {
	case i.Direction == pipeline.NotBelow:
		return name + " has reached its design value"
	case i.From == "" || i.From == pipeline.Within:
		return name + " within its design value"
	case i.From == pipeline.Unknown:
		return name + " within its design value, missing days have come in"
	case i.From == pipeline.Expected:
		return name + " no longer expected to pass its design value"
	}
	return name + " no longer near its design value"
}

// afterAll is what a withdrawal says of what was told before.
func afterAll(i *delivery.Item) string {
	switch {
	case i.From == pipeline.FellShort:
		return "did reach its design value after all"
	case i.From == pipeline.Exceeded && i.To == pipeline.Near:
		return "not past its design value after all, but near it"
	case i.From == pipeline.Exceeded && i.To == pipeline.Unknown:
		return "may not be past its design value after all, days are missing"
	case i.From == pipeline.Exceeded && i.To == pipeline.Expected:
		return "not past its design value after all, but expected to pass it"
	case i.From == pipeline.Exceeded:
		return "not past its design value after all"
	case i.From == pipeline.Expected:
		return "not expected to pass its design value after all"
	}
	return "not near its design value after all"
}

// figures is as 1703 of 1700 degC.d, or 1648 to 1741 of 1700 degC.d.
func figures(i *delivery.Item, u unit) string {
	if c := i.ToDate.Central; c != nil {
		f := u.index(i.Design.CDays, *c, i.Design.CDays)
		return fmt.Sprintf("%s of %s %s", f[0], f[1], u.name)
	}
	f := u.index(i.Design.CDays, i.ToDate.Low, i.ToDate.High, i.Design.CDays)
	return fmt.Sprintf("%s to %s of %s %s", f[0], f[1], f[2], u.name)
}

var stateWords = map[pipeline.State]string{
	pipeline.Exceeded: "past its design value", pipeline.Unknown: "not known, days were missing", pipeline.Expected: "expected to pass",
	pipeline.Near: "near", pipeline.Within: "within", pipeline.FellShort: "short of its design value",
}

func since(i *delivery.Item) string {
	s := fmt.Sprintf("Figures to the end of %s, season %s.", i.Day.Time().Format("Monday 2 January 2006"), delivery.OneLine(i.Season, 20))
	if i.Since != nil && i.Kind != delivery.Drill {
		s = fmt.Sprintf("So since %s. ", date(*i.Since)) + s
	}
	return s
}

func howFar(i *delivery.Item, u unit) string {
	m := i.Margin
	if m == nil {
		return ""
	}
	share := ""
	if s, known := i.Share(); known {
		share = fmt.Sprintf(" (%s of it)", percent(s))
	}
	amount := fmt.Sprintf("%s %s", u.index(0, math.Abs(m.CDays))[0], u.name)
	if m.CDays <= 0 {
		switch {
		case i.Direction == pipeline.NotBelow:
			return fmt.Sprintf("%s more than the design value%s.", amount, share)
		case m.Days == nil:
			return fmt.Sprintf("%s past the design value%s.", amount, share)
		}
		return fmt.Sprintf("%s past the design value%s: %s at the last week's rate.", amount, share, about(-*m.Days))
	}
	switch {
	case i.Direction == pipeline.NotBelow:
		return fmt.Sprintf("%s short of the design value%s.", amount, share)
	case m.Days == nil:
		return fmt.Sprintf("%s below the design value%s. The index did not rise in the last week.", amount, share)
	}
	return fmt.Sprintf("%s below the design value%s: %s at the last week's rate.", amount, share, about(*m.Days))
}

// about writes a number of days that is an estimate.
func about(n float64) string {
	switch {
	case n < 1:
		return "less than a day"
	case n < 1.5:
		return "about a day"
	case n > 365:
		return "more than a year"
	}
	return fmt.Sprintf("about %.0f days", n)
}

func howSure(i *delivery.Item, u unit) string {
	var s []string
	if i.ToDate.Low == i.ToDate.High {
		s = append(s, "No missing day leaves the index open.")
	} else {
		f := u.index(i.Design.CDays, i.ToDate.Low, i.ToDate.High)
		line := fmt.Sprintf("The index lies between %s and %s %s", f[0], f[1], u.name)
		switch {
		case i.Direction == pipeline.NotAbove && i.To == pipeline.Exceeded && i.Confirmed:
			line += "; even at its lowest it is past the design value"
		case i.Direction == pipeline.NotAbove && i.To == pipeline.Exceeded:
			line += "; at its lowest it would not be past the design value"
		}
		s = append(s, line+".")
	}
	if n := i.Design.NFactor; n != nil {
		s = append(s, fmt.Sprintf("It is the air index times an n-factor of %s, an approximation while the season lasts.", short(*n)))
	}
	if i.OnsetProvisional {
		s = append(s, "The season's start is provisional: a relapse may still move it.")
	}
	return strings.Join(s, " ")
}

func outlook(i *delivery.Item, u unit) string {
	o := i.Outlook
	if o == nil {
		return ""
	}
	var s []string
	verb := "passing"
	if i.Direction == pipeline.NotBelow {
		verb = "reaching"
	}
	open := i.To != pipeline.Exceeded && i.To != pipeline.FellShort
	if open {
		line := fmt.Sprintf("Chance of %s the design value this season: %s", verb, chance(o.Probability))
		if d := o.Date; d != nil {
			line += fmt.Sprintf("; if so about %s, in 8 of 10 cases between %s and %s", d.P50.Time().Format("2 January"),
				d.P10.Time().Format("2 January"), d.P90.Time().Format("2 January 2006"))
		}
		s = append(s, line+".")
	}
	if e := o.End; e != nil {
		f := u.index(i.Design.CDays, e.P50, e.P10, e.P90)
		s = append(s, fmt.Sprintf("By the season's end about %s %s, in 8 of 10 cases between %s and %s.", f[0], u.name, f[1], f[2]))
	}
	if len(s) == 0 {
		return ""
	}
	if o.Seasons > 0 {
		s = append(s, fmt.Sprintf("From %d past seasons.", o.Seasons))
	}
	return strings.Join(s, " ")
}

// chance writes a probability: never as certain or impossible, since it is a
// share of a few dozen past seasons.
func chance(p float64) string {
	switch {
	case p < 0.01:
		return "less than 1 %"
	case p > 0.99:
		return "more than 99 %"
	}
	return fmt.Sprintf("%.0f %%", p*100)
}

func rank(i *delivery.Item) string {
	r := i.Rank
	if r == nil || r.Of < 2 {
		return ""
	}
	nth := func(n int, what string) string {
		if n == 1 {
			return fmt.Sprintf("The %s of %d seasons on record at this date.", what, r.Of)
		}
		return fmt.Sprintf("The %s %s of %d seasons on record at this date.", ordinal(n), what, r.Of)
	}
	if fromBelow := r.Of + 1 - r.Place; fromBelow < r.Place {
		return nth(fromBelow, "lowest")
	}
	return nth(r.Place, "highest")
}

func data(i *delivery.Item, n delivery.Notice) string {
	var s []string
	if !i.Data.Newest.IsZero() {
		line := "Newest reading at " + clock(i.Data.Newest, n.Recipient.Zone)
		if age := n.Written.Sub(i.Data.Newest); age >= 0 {
			line += fmt.Sprintf(", %s before this was written", lasting(age.Round(time.Minute)))
		}
		s = append(s, line+".")
	}
	s = append(s, fmt.Sprintf("This season %s filled in, %s missing.", days(i.Data.DaysFilled), days(i.Data.DaysMissing)))
	if i.Data.LastVisit != nil {
		s = append(s, fmt.Sprintf("Station last visited on %s.", date(*i.Data.LastVisit)))
	}
	if i.Data.Provisional {
		s = append(s, "Nobody has approved this record yet.")
	}
	return strings.Join(s, " ")
}

func design(i *delivery.Item, u unit) string {
	d := &i.Design
	s := fmt.Sprintf("%s %s", short(d.Stated), d.Unit)
	if d.Unit != u.name {
		s += fmt.Sprintf(" (%s %s)", short(math.Round(d.CDays*u.factor*10)/10), u.name)
	}
	switch d.Of {
	case pipeline.OfSurface:
		s += " at the surface"
	case pipeline.OfAir:
		s += " of the air"
	}
	switch d.Definition {
	case pipeline.Curve:
		s += ", by the rise of the cumulative curve"
	case pipeline.Sum:
		s += ", by the sum of days on one side of the base"
	case pipeline.Monthly:
		s += ", from monthly means"
	default:
		s += "; its definition is not stated, it is compared with the rise of the cumulative curve"
	}
	if source := delivery.OneLine(d.Source, 200); source != "" {
		s += ". Source: " + source
	}
	return s + "."
}

var whyWords = map[string]string{
	"progress": "The season has gone on.", "correction": "Earlier data were corrected.",
	"gap": "Days have gone missing that may matter.", "gap closed": "Missing days have come in.",
	"first judgement": "First look at this season.", "design value replaced": "The design value was replaced by another.",
	"season over": "The season is over.",
}

// capital returns s with its first letter as a capital.
func capital(s string) string {
	r, n := utf8.DecodeRuneInString(s)
	return string(unicode.ToUpper(r)) + s[n:]
}

func changed(i *delivery.Item) string {
	if i.Kind == delivery.Drill {
		return ""
	}
	why, known := whyWords[i.Why]
	if !known {
		if why = delivery.OneLine(i.Why, 200); why != "" {
			why = capital(why)
			if !strings.HasSuffix(why, ".") {
				why += "."
			}
		}
	}
	if i.From != "" && i.From != i.To {
		why = strings.TrimSpace(why + fmt.Sprintf(" Before: %s.", stateWords[i.From]))
	}
	return why
}

func cites(i *delivery.Item, zone *time.Location) string {
	var s []string
	if first, told := i.First(); told {
		switch i.Kind {
		case delivery.Withdrawal:
			s = append(s, fmt.Sprintf("This withdraws what you were first told at %s (notice %s). That rested on figures which have since been corrected; "+
				"the record of it stays.", clock(first.Written, zone), first.Key))
		default:
			s = append(s, fmt.Sprintf("You were first told of this at %s (notice %s).", clock(first.Written, zone), first.Key))
		}
	}
	if i.Exceedance > 0 {
		s = append(s, fmt.Sprintf("Exceedance %d.", i.Exceedance))
	}
	return strings.Join(s, " ")
}

// alt says in words what the chart shows.
func alt(i *delivery.Item, u unit) string {
	c := i.Chart
	s := fmt.Sprintf("Chart of the %s of %s by day.", indexName(i), where(i))
	if len(c.Season) > 0 {
		first, last := c.Season[0], c.Season[len(c.Season)-1]
		f := u.index(i.Design.CDays, last.Low, last.High, i.Design.CDays)
		reached := f[0]
		if last.Low != last.High {
			reached = f[0] + " to " + f[1]
		}
		s += fmt.Sprintf(" Season %s: from %s to %s it rose to %s %s; the design value is %s.", delivery.OneLine(i.Season, 20),
			first.Day.Time().Format("2 January"), last.Day.Time().Format("2 January 2006"), reached, u.name, f[2])
		for _, p := range c.Past {
			if p.Day == last.Day {
				s += fmt.Sprintf(" On the last date %s.", past(p, u))
			}
		}
	}
	if n := len(c.Past); n > 0 {
		s += fmt.Sprintf(" By %s %s.", c.Past[n-1].Day.Time().Format("2 January"), past(c.Past[n-1], u))
		if c.PastSeasons > 0 {
			s += fmt.Sprintf(" Past seasons: %d.", c.PastSeasons)
		}
	}
	return s
}

func past(p delivery.ChartPast, u unit) string {
	return fmt.Sprintf("past seasons stood at %.0f %s in the middle, and 8 of 10 of them between %.0f and %.0f",
		p.P50*u.factor, u.name, p.P10*u.factor, p.P90*u.factor)
}
