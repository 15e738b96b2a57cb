package indices

import (
	"context"
	"fmt"

	"thawledger/indices/degreeday"
	"thawledger/indices/outlook"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// bootstrapSeed makes the intervals of skills repeatable.
const bootstrapSeed = 1

// MadeOutlook is an outlook for one design value.
type MadeOutlook struct {
	Design store.AirDesign
	Row    store.OutlookRow
}

// OutlookIndex is what outlooks and scores of a station are of.
type OutlookIndex struct {
	Kind       pipeline.Kind
	Definition pipeline.Definition
}

// Question returns what is asked of the station's record.
func (of OutlookIndex) Question(st *pipeline.Station) outlook.Question {
	q := outlook.Question{Kind: of.Kind, Definition: of.Definition, BaseC: st.BaseC, Starts: st.ThawYear}
	if of.Kind == pipeline.Freeze {
		q.Starts = st.FreezeYear
	}
	return q
}

// StationOutlooks is what was made of one station's record.
type StationOutlooks struct {
	Station  string
	Outlooks []MadeOutlook
	Notes    []string // what could not be made, and why

	through pipeline.Day // last day used; the day before 1970 if there is no record
	scores  map[OutlookIndex][]store.OutlookScoreRow
	order   []OutlookIndex
}

// Outlooks makes outlooks of a station's seasons that are not over for every
// design value in force on it, from the days up to a day.
func (s *Service) Outlooks(ctx context.Context, st *pipeline.Station, until pipeline.Day) (*StationOutlooks, error) {
	m := &StationOutlooks{Station: st.ID, through: -1, scores: map[OutlookIndex][]store.OutlookScoreRow{}}
	days, err := DaysUntil(ctx, s.DB, st.ID, until)
	if err != nil || len(days) == 0 {
		return m, err
	}
	through := days[len(days)-1].Day
	m.through = through
	designs, err := s.DB.AirDesigns(ctx, st.ID, degreeday.WindowAt(st.ThawYear, through+1).First, degreeday.WindowAt(st.FreezeYear, through+1).First)
	if err != nil {
		return nil, err
	}
	byIndex := map[OutlookIndex][]store.AirDesign{}
	for _, d := range designs {
		switch {
		case st.Measures == pipeline.OfTheSurface:
			m.note("%s / %s: no outlook: station %s measures a surface and not the air", d.Site, d.Surface, st.ID)
		case len(st.Bases) > 0:
			m.note("%s / %s: no outlook: the base of station %s changes with the date", d.Site, d.Surface, st.ID)
		case !d.Comparable:
			m.note("%s / %s: no outlook: its %s design value is of the surface, and no n-factor is in force", d.Site, d.Surface, d.Kind)
		case d.BaseC != st.BaseC:
			m.note("%s / %s: no outlook: its base is %g degC, the station's is %g degC", d.Site, d.Surface, d.BaseC, st.BaseC)
		default:
			of := OutlookIndex{d.Kind, d.Compared}
			if byIndex[of] == nil {
				m.order = append(m.order, of)
			}
			byIndex[of] = append(byIndex[of], d)
		}
	}
	if len(m.order) == 0 {
		return m, nil
	}
	record := outlook.NewRecord(days)
	for _, of := range m.order {
		s.outlook(m, record, days, st, of, byIndex[of])
	}
	return m, nil
}

func (m *StationOutlooks) note(format string, args ...any) {
	m.Notes = append(m.Notes, fmt.Sprintf(format, args...))
}

// DaysUntil returns a station's daily means up to a day. Days at its end that
// nobody had seen by then, filled from later ones or from the climate, are left
// out.
func DaysUntil(ctx context.Context, db *store.DB, station string, until pipeline.Day) ([]degreeday.DayMean, error) {
	rows, err := db.DailyMeans(ctx, station)
	if err != nil {
		return nil, err
	}
	days := make([]degreeday.DayMean, 0, len(rows))
	for _, r := range rows {
		if r.Day <= until {
			days = append(days, degreeday.DayMean{Day: r.Day, Origin: r.Origin, MeanC: r.MeanC, LowC: r.LowC, HighC: r.HighC})
		}
	}
	for n := len(days); n > 0 && days[n-1].Origin != pipeline.Observed && days[n-1].Origin != pipeline.ByNeighbour; n-- {
		days = days[:n-1]
	}
	return days, nil
}

// outlook makes the outlooks of one index.
func (s *Service) outlook(m *StationOutlooks, record *outlook.Record, days []degreeday.DayMean, st *pipeline.Station, of OutlookIndex, designs []store.AirDesign) {
	q, through := of.Question(st), record.Last()
	w := degreeday.WindowAt(q.Starts, through+1)
	if w.First < record.First() {
		m.note("%s: no %s outlook of %s: the record begins on %s", st.ID, of.Kind, w.Label(), record.First())
		return
	}
	thresholds := make([]float64, len(designs))
	for i := range designs {
		thresholds[i] = designs[i].AirCDays
	}
	h := s.hindcasts.of(hindcastKey{st.ID, of}, record, days[:w.First-record.First()], q, thresholds)
	m.scores[of] = scoreRows(h)
	o, err := record.Outlook(q, through, h.Better())
	if err != nil { // too few past years
		m.note("%s: no %s outlook of %s: %v", st.ID, of.Kind, w.Label(), err)
		return
	}
	lead := outlook.LeadMonth(w, through)
	for _, d := range designs {
		m.Outlooks = append(m.Outlooks, MadeOutlook{Design: d, Row: outlookRow(st.ID, &d, o, h, lead)})
	}
}

func (m *StationOutlooks) rows() []store.OutlookRow {
	rows := make([]store.OutlookRow, len(m.Outlooks))
	for i := range m.Outlooks {
		rows[i] = m.Outlooks[i].Row
	}
	return rows
}

// Keep stores what was made; scores only if asked for.
func (m *StationOutlooks) Keep(ctx context.Context, db *store.DB, scores bool) error {
	if rows := m.rows(); len(rows) > 0 {
		if err := db.WriteOutlooks(ctx, rows); err != nil {
			return err
		}
	}
	if scores {
		return m.keepScores(ctx, db)
	}
	return nil
}

func (m *StationOutlooks) keepScores(ctx context.Context, db *store.DB) error {
	for _, of := range m.order {
		if err := db.WriteOutlookScores(ctx, m.Station, of.Kind, of.Definition, m.scores[of]); err != nil {
			return err
		}
	}
	return nil
}
