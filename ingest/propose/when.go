package propose

import (
	"fmt"
	"regexp"
	"slices"
	"strings"

	"thawledger/pipeline"
)

// subDaily reports whether there are several times a day.
func (w *timing) subDaily() bool {
	return hasHour(w.format) && !(w.steady && w.stepS >= subDaily)
}

// setTime takes over how times are read and asks what the text leaves open.
func (p *Proposal) setTime(t *table, w *timing, f *temps) {
	c := &p.Layout.Time
	for _, column := range w.columns {
		c.Columns = append(c.Columns, column.ref())
	}
	c.Format, c.Zone = w.format, "station"
	p.askOrder(w)
	said, by := w.zoneSaid()
	if !w.subDaily() {
		c.Covers, c.SpanS = pipeline.CoversDay, dayS
		if w.clockS > 0 {
			c.Format = w.withClock()
		}
		p.askDay(w, said, by)
		return
	}
	if w.stepS >= subDaily {
		p.note("times are about a day apart, and not at the same time of the day: if a row is of a day, no layout reads its time of the day away")
	}
	p.setZone(t, w, said, by)
	p.setCovers(w, f)
}

// withClock writes the steady time of the day into the format, so that it reads
// days.
func (w *timing) withClock() string {
	h, m, s := w.clockS/3600, w.clockS/60%60, w.clockS%60
	hours := fmt.Sprintf("%02d", h)
	if !strings.Contains(w.format, "hh") {
		hours = fmt.Sprint(h)
	}
	return literal(w.format, hours, fmt.Sprintf("%02d", m), fmt.Sprintf("%02d", s))
}

func (p *Proposal) askOrder(w *timing) {
	if len(w.rivals) == 0 {
		return
	}
	q := Question{About: DayOrder, Options: []string{w.format}, Chosen: w.format}
	for _, r := range w.rivals {
		if format := r.format; !slices.Contains(q.Options, format) {
			q.Options = append(q.Options, format)
		}
	}
	row := 0
	for i, at := range w.at {
		if at != noTime && (w.at[row] == noTime || at != w.rivals[0].at[i]) {
			if row = i; at != w.rivals[0].at[i] {
				break
			}
		}
	}
	q.Text = fmt.Sprintf("every time of the sample can be read in %d ways: %s is %s by %s", 1+len(w.rivals), shown(string(w.text(row, nil))), dateOf(w.at[row]), w.format)
	for _, r := range w.rivals {
		q.Text += fmt.Sprintf(", %s by %s", dateOf(r.at[row]), r.format)
	}
	p.ask(q)
}

func dateOf(at int64) string {
	if at == noTime {
		return "no date"
	}
	return pipeline.Day(floorDiv(at, dayS)).String()
}

// askDay asks about rows that are of a day.
func (p *Proposal) askDay(w *timing, said, by string) {
	if w.clockS > 0 {
		p.ask(Question{About: Covers, Options: []string{"day"}, Chosen: "day",
			Text: fmt.Sprintf("each row has the time %02d:%02d and is taken for the day of its date: is it, or does the day end at that time? (Then set the station's day_starts)",
				w.clockS/3600, w.clockS/60%60)})
	}
	q := Question{About: Zone, Options: []string{"station"}, Chosen: "station",
		Text: "days are taken for those of the station's standard time, from 00:00 or its day_starts: are they?"}
	if said != "" {
		q.Text = fmt.Sprintf("%s says zone %s, and days are taken for the station's, in its standard time: if they are days of that zone, set its day_starts to suit", by, said)
	}
	p.ask(q)
}

var offsetInText = regexp.MustCompile(`(?i)\b(?:UTC|GMT)\s*([+\-\x{2212}])\s*([0-9]{1,2})(?::?([0-9]{2}))?\b`)

var zeroInText = regexp.MustCompile(`(?i)(?:\b|_)(UTC|GMT|zulu)(?:\b|_)`)

// zoneIn returns the zone that a text names; "" if it names none.
func zoneIn(text string) string {
	if m := offsetInText.FindStringSubmatch(text); m != nil {
		sign, minutes := "-", m[3]
		if m[1] == "+" {
			sign = "+"
		}
		if minutes == "" {
			minutes = "00"
		}
		zone := fmt.Sprintf("%s%02s:%s", sign, m[2], minutes)
		if zone == "-00:00" {
			zone = utc
		}
		if anOffset.MatchString(zone) {
			return zone
		}
		return ""
	}
	if zeroInText.MatchString(text) {
		return utc
	}
	return ""
}

// anOffset is what settings take for a zone.
var anOffset = regexp.MustCompile(`^[+-](0[0-9]|1[0-3]):[0-5][0-9]$|^[+-]14:00$`)

// zoneSaid returns the zone that the times, or the names of their columns, state.
func (w *timing) zoneSaid() (zone, by string) {
	if anOffset.MatchString(w.zone) {
		return w.zone, "the text of the times"
	}
	for _, c := range w.columns {
		zone := zoneIn(c.name + " " + c.unit)
		if zone == "" && c.has("utc", "gmt") {
			zone = utc
		}
		if zone != "" {
			return zone, "the name " + shown(c.name)
		}
	}
	return "", ""
}

func (p *Proposal) setZone(t *table, w *timing, said, by string) {
	c := &p.Layout.Time
	if said != "" {
		c.Zone = said
		p.note("%s says that times are of zone %s", by, said)
		return
	}
	q := Question{About: Zone, Options: []string{"station", utc}, Chosen: "station",
		Text: "the file does not say of what zone its times are: the station's standard time, UTC, or another offset? If clocks were changed in summer, no layout reads it"}
	for _, text := range t.others {
		if zone := zoneIn(text); zone != "" {
			q.Chosen = zone
			q.Text = fmt.Sprintf("a line beside the rows names zone %s (%s): is it that of the times?", zone, shown(text))
			break
		}
	}
	if w.zone != "" && said == "" {
		q.Text += fmt.Sprintf(" (the text %s of the times is no offset that settings take)", shown(w.zone))
	}
	if w.second != nil {
		q.Text += "; " + listedColumns(w.second.columns) + " hold times as well, and others"
	}
	if q.Chosen != "station" && q.Chosen != utc {
		q.Options = append(q.Options, q.Chosen)
	}
	c.Zone = q.Chosen
	p.ask(q)
}

// setCovers sets what a time is of: the instant itself, or a span for values that
// are statistics.
func (p *Proposal) setCovers(w *timing, f *temps) {
	c := &p.Layout.Time
	c.Covers = pipeline.CoversInstant
	step := w.stepS
	if step <= 0 || step >= dayS {
		step = 3600
	}
	q := Question{About: Covers, Options: []string{"instant", "ending", "beginning"}}
	q.Text = fmt.Sprintf("rows are %s apart: is a value that of the instant, or a mean over the %s that end or begin at its time? (Then: variable air_temp_mean, and span: %s)",
		spanText(step), spanText(step), spanText(step))
	if f.values[0].variable != pipeline.AirTemp {
		c.Covers, c.SpanS = pipeline.CoversEnding, int32(step)
		q.Text = fmt.Sprintf("rows are %s apart and their values are said to be means or extremes: do the %s end or begin at the time? (Or is it a value of the instant: then variable air_temp, and no span)",
			spanText(step), spanText(step))
	}
	if w.stepS == 0 {
		q.Text += "; the sample has one time only, so the span is a guess"
	}
	q.Chosen = string(c.Covers)
	p.ask(q)
}

// spanText writes a span as settings take it.
func spanText(s int64) string {
	switch {
	case s%3600 == 0:
		return fmt.Sprintf("%dh", s/3600)
	case s%60 == 0:
		return fmt.Sprintf("%dm", s/60)
	}
	return fmt.Sprintf("%ds", s)
}
