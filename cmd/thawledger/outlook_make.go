package main

import (
	"context"
	"fmt"
	"math"

	"thawledger/indices/degreeday"
	"thawledger/indices/outlook"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// lastOfAll is after every record.
const lastOfAll = pipeline.Day(math.MaxInt32)

// expectedShare is the chance from which a crossing is expected: common sense,
// no source.
const expectedShare = 0.5

// bootstrapSeed makes the intervals of skills repeatable.
const bootstrapSeed = 1

// madeOutlook is an outlook for one design value.
type madeOutlook struct {
	design store.AirDesign
	row    store.OutlookRow
}

// adverse returns the chance of ending on the wrong side of the design value.
func (m *madeOutlook) adverse() (low, high float64) {
	if m.design.Direction == pipeline.NotBelow {
		return 1 - m.row.ProbabilityHigh, 1 - m.row.ProbabilityLow
	}
	return m.row.ProbabilityLow, m.row.ProbabilityHigh
}

// expected reports whether even the lowest chance of that is enough.
func (m *madeOutlook) expected() bool {
	low, _ := m.adverse()
	return low >= expectedShare
}

// outlookIndex is what outlooks and scores of a station are of.
type outlookIndex struct {
	kind       pipeline.Kind
	definition pipeline.Definition
}

// stationOutlooks is what was made of one station's record.
type stationOutlooks struct {
	station  string
	outlooks []madeOutlook
	scores   map[outlookIndex][]store.OutlookScoreRow
	order    []outlookIndex
	notes    []string // what could not be made, and why
}

// makeOutlooks makes outlooks of a station's seasons that are not over for every
// design value in force on it, from the days up to a day.
func makeOutlooks(ctx context.Context, db *store.DB, st *pipeline.Station, until pipeline.Day) (*stationOutlooks, error) {
	m := &stationOutlooks{station: st.ID, scores: map[outlookIndex][]store.OutlookScoreRow{}}
	record, err := recordUntil(ctx, db, st.ID, until)
	if err != nil {
		return nil, err
	}
	if record == nil {
		return m, nil
	}
	through := record.Last()
	designs, err := db.AirDesigns(ctx, st.ID, degreeday.WindowAt(st.ThawYear, through+1).First, degreeday.WindowAt(st.FreezeYear, through+1).First)
	if err != nil {
		return nil, err
	}
	byIndex := map[outlookIndex][]store.AirDesign{}
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
			of := outlookIndex{d.Kind, d.Compared}
			if byIndex[of] == nil {
				m.order = append(m.order, of)
			}
			byIndex[of] = append(byIndex[of], d)
		}
	}
	for _, of := range m.order {
		m.make(record, st, of, byIndex[of])
	}
	return m, nil
}

func (m *stationOutlooks) note(format string, args ...any) {
	m.notes = append(m.notes, fmt.Sprintf(format, args...))
}

// recordUntil returns a station's record up to a day; nil if there is none. Days
// at its end that nobody had seen by then, filled from later ones or from the
// climate, are left out.
func recordUntil(ctx context.Context, db *store.DB, station string, until pipeline.Day) (*outlook.Record, error) {
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
	if len(days) == 0 {
		return nil, nil
	}
	return outlook.NewRecord(days), nil
}

func outlookQuestion(st *pipeline.Station, of outlookIndex) outlook.Question {
	q := outlook.Question{Kind: of.kind, Definition: of.definition, BaseC: st.BaseC, Starts: st.ThawYear}
	if of.kind == pipeline.Freeze {
		q.Starts = st.FreezeYear
	}
	return q
}

// make makes the outlooks of one index.
func (m *stationOutlooks) make(record *outlook.Record, st *pipeline.Station, of outlookIndex, designs []store.AirDesign) {
	q, through := outlookQuestion(st, of), record.Last()
	w := degreeday.WindowAt(q.Starts, through+1)
	if w.First < record.First() {
		m.note("%s: no %s outlook of %s: the record begins on %s", st.ID, of.kind, w.Label(), record.First())
		return
	}
	thresholds := make([]float64, len(designs))
	for i := range designs {
		thresholds[i] = designs[i].AirCDays
	}
	h := record.Hindcast(q, outlook.HindcastOptions{Thresholds: thresholds, Seed: bootstrapSeed})
	m.scores[of] = scoreRows(h)
	o, err := record.Outlook(q, through, h.Better())
	if err != nil { // too few past years
		m.note("%s: no %s outlook of %s: %v", st.ID, of.kind, w.Label(), err)
		return
	}
	lead := outlook.LeadMonth(w, through)
	for _, d := range designs {
		m.outlooks = append(m.outlooks, madeOutlook{design: d, row: outlookRow(st.ID, &d, o, h, lead)})
	}
}

func outlookRow(station string, d *store.AirDesign, o *outlook.Outlook, h *outlook.Hindcast, lead int) store.OutlookRow {
	p, end := o.Passing(d.AirCDays), o.End()
	row := store.OutlookRow{
		Station: station, Kind: d.Kind, Definition: d.Compared, SeasonStart: o.Window.First, Season: o.Window.Label(), Through: o.Through,
		DesignValueID: &d.ID, ThresholdCDays: d.AirCDays, NFactor: d.NFactor, IndexLow: o.ToDate.Low, IndexHigh: o.ToDate.High,
		ProbabilityLow: p.Probability.Low, ProbabilityHigh: p.Probability.High, Passed: p.Passed,
		End10: end.P10.Low, End90: end.P90.High, Members: len(o.Members), Which: string(o.Which), LeadMonth: lead,
		AnnouncedAllowed: h.Skilful(lead),
	}
	if end.P50.Known() {
		row.End50 = &end.P50.Low
	}
	if p.HasOn {
		row.PassDay10, row.PassDay50, row.PassDay90 = &p.On.P10, &p.On.P50, &p.On.P90
	}
	if s, ok := h.Score(outlook.Earlier, o.Which, lead); ok {
		row.ScoredYears, row.Skill, row.BrierSkill = s.Years, skillColumns(s.Skill), skillColumns(s.BrierSkill)
	}
	return row
}

func skillColumns(s outlook.Skill) *store.OutlookSkill {
	switch {
	case !s.OK:
		return nil
	case !s.HasInterval:
		return &store.OutlookSkill{Value: s.Value}
	}
	return &store.OutlookSkill{Value: s.Value, Low: &s.Low, High: &s.High}
}

func scoreRows(h *outlook.Hindcast) []store.OutlookScoreRow {
	rows := make([]store.OutlookScoreRow, len(h.Scores))
	better := h.Better()
	for i := range h.Scores {
		s := &h.Scores[i]
		rows[i] = store.OutlookScoreRow{
			YearsFrom: string(s.Information), Which: string(s.Which), LeadMonth: s.LeadMonth,
			Used: s.Information == outlook.Earlier && s.Which == better, Years: s.Years, N: s.N,
			CRPS: s.CRPS, CRPSFair: s.FairCRPS, CRPSClimatology: s.ClimatologyCRPS,
			CRPSClimatologyRaw: s.RawClimatologyCRPS, CRPSClimatologyMoved: s.MovedClimatologyCRPS,
			Skill: skillColumns(s.Skill), Brier: s.Brier, BrierClimatology: s.ClimatologyBrier, BrierSkill: skillColumns(s.BrierSkill),
			Pinball:            [3]float64{s.Pinball.P10, s.Pinball.P50, s.Pinball.P90},
			PinballClimatology: [3]float64{s.ClimatologyPinball.P10, s.ClimatologyPinball.P50, s.ClimatologyPinball.P90},
			ThresholdsCDays:    h.Thresholds,
		}
		if s.FairSkill.OK {
			rows[i].SkillFair = &s.FairSkill.Value
		}
	}
	return rows
}

// keep stores what was made; scores only if asked for.
func (m *stationOutlooks) keep(ctx context.Context, db *store.DB, scores bool) error {
	rows := make([]store.OutlookRow, len(m.outlooks))
	for i := range m.outlooks {
		rows[i] = m.outlooks[i].row
	}
	if len(rows) > 0 {
		if err := db.WriteOutlooks(ctx, rows); err != nil {
			return err
		}
	}
	for _, of := range m.order {
		if scores {
			if err := db.WriteOutlookScores(ctx, m.station, of.kind, of.definition, m.scores[of]); err != nil {
				return err
			}
		}
	}
	return nil
}
