package send

import (
	"fmt"
	"math"
	"strings"

	"thawledger/alerts/delivery"
	"thawledger/alerts/gather"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// item says in figures what a line says of a standing.
func (s *Sender) item(l *gather.Line, f *store.Figures) delivery.Item {
	i := delivery.Item{
		About: l.About, Kind: l.Kind, Site: f.Site, SiteName: f.SiteName, Surface: f.Surface, SurfaceName: f.SurfaceName,
		Index: f.Kind, Season: f.Season, Direction: f.Direction, From: l.From, To: f.State, Why: l.Why,
		Confirmed: f.ConfirmedOn != nil, Since: since(f), Day: f.Day,
		ToDate: delivery.Figures{Low: f.Low, High: f.High},
		Design: delivery.Design{CDays: f.DesignC, Stated: f.Stated, Unit: f.Unit, Definition: f.Definition, Of: f.Of, Source: f.Source,
			NearShare: f.NearShare, NFactor: f.NFactor},
		Data: delivery.Data{DaysFilled: f.DaysFilled, DaysMissing: f.DaysMissing, LastVisit: f.LastVisit,
			Provisional: f.ApprovedThrough == nil || *f.ApprovedThrough < f.Day},
		Exceedance: f.Exceedance, OnsetProvisional: f.OnsetProvisional, Cautions: cautions(l, f),
	}
	if f.Low == f.High {
		i.ToDate.Central = &f.Low
		i.Margin = margin(f)
	}
	if f.Newest != nil {
		i.Data.Newest = f.Newest.UTC()
	}
	if f.RankOf > 1 {
		i.Rank = &delivery.Rank{Place: f.Rank, Of: f.RankOf}
	}
	i.Outlook = outlook(f)
	if site := s.sites[f.Site]; site != nil {
		i.Instruction = site.Instructions[f.State]
	}
	for _, e := range l.Earlier {
		i.Earlier = append(i.Earlier, delivery.Cited{Key: e.Key, Written: e.At})
	}
	return i
}

// since is the first day of the state; nil where the store does not keep it.
func since(f *store.Figures) *pipeline.Day {
	switch f.State {
	case pipeline.Exceeded:
		return f.ExceededOn
	case pipeline.Expected:
		return f.ExpectedOn
	case pipeline.Near:
		return f.NearOn
	}
	return nil
}

// margin is nil for an index that missing days leave open.
func margin(f *store.Figures) *delivery.Margin {
	m := &delivery.Margin{CDays: f.DesignC - f.Low}
	if f.WeekAgo == nil {
		return m
	}
	// An index that does not rise has no rate, nor has one whose margin would be
	// more than a year.
	if rate := (f.Low - *f.WeekAgo) / 7; rate > 0 && math.Abs(m.CDays/rate) < 366 {
		days := m.CDays / rate
		m.Days = &days
	}
	return m
}

// outlook turns an outlook of the air index into one of the index compared, and
// its chance into that of ending on the wrong side.
func outlook(f *store.Figures) *delivery.Outlook {
	o := f.Outlook
	if o == nil || f.State == pipeline.FellShort {
		return nil
	}
	n := 1.0
	if f.NFactor != nil {
		n = *f.NFactor
	}
	out := &delivery.Outlook{Probability: (o.ProbabilityLow + o.ProbabilityHigh) / 2, Seasons: o.Members}
	if o.PassDay10 != nil && o.PassDay50 != nil && o.PassDay90 != nil {
		out.Date = &delivery.DateSpread{P10: *o.PassDay10, P50: *o.PassDay50, P90: *o.PassDay90}
	}
	if o.End50 != nil {
		out.End = &delivery.IndexSpread{P10: n * o.End10, P50: n * *o.End50, P90: n * o.End90}
	}
	return out
}

// cautions are what a reader has to know beside the figures, in whole sentences.
func cautions(l *gather.Line, f *store.Figures) (out []string) {
	if len(l.Passed) > 0 {
		var words []string
		for _, s := range l.Passed {
			words = append(words, strings.ReplaceAll(string(s), "_", " "))
		}
		out = append(out, fmt.Sprintf("While this waited to be told it also stood at: %s.", strings.Join(words, ", ")))
	}
	if f.Definition == pipeline.NotStated {
		text := "The design value does not state its definition; it is compared with the curve index."
		if f.SumBeside != nil {
			text += fmt.Sprintf(" The sum of positive daily means is %.1f degC.d.", *f.SumBeside)
			if f.Kind == pipeline.Freeze {
				text = strings.Replace(text, "positive", "negative", 1)
			}
		}
		out = append(out, text)
	}
	if f.NotHomogeneous {
		out = append(out, "The season's record is not made by one rule throughout.")
	}
	if f.DaysDoubtful > 0 {
		out = append(out, fmt.Sprintf("Days that rest on doubtful values, and are in the index: %d.", f.DaysDoubtful))
	}
	return out
}

// chart is the picture of a season.
func chart(days []store.CurveDay, past []store.PastDay, seasons int) *delivery.Chart {
	if len(days) < 2 {
		return nil
	}
	c := &delivery.Chart{PastSeasons: seasons}
	for _, d := range days {
		c.Season = append(c.Season, delivery.ChartDay{Day: d.Day, Low: d.Low, High: d.High})
	}
	for _, p := range past {
		c.Past = append(c.Past, delivery.ChartPast{Day: p.Day, P10: p.P10, P50: p.P50, P90: p.P90})
	}
	return c
}
