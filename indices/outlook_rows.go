package indices

import (
	"thawledger/indices/outlook"
	"thawledger/pipeline/store"
)

// outlookRow returns the row that keeps an outlook for a design value.
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

// scoreRows returns the rows that keep a hindcast.
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
