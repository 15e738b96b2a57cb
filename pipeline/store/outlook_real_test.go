package store_test

import (
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
	"thawledger/pipeline/store"
)

// One row a day and design value, the last day's is the one that is read, and
// design values are those in force for the season, as air indices.
func TestOutlooks(t *testing.T) {
	db, ctx := pipelinetest.New(t), t.Context()
	day := pipeline.DayOf
	err := db.State(ctx, store.Stated{
		Hash: "h", YAML: "y", Program: "p",
		Stations: []pipeline.Station{{ID: "TARN", Measures: pipeline.OfTheAir, Mean: pipeline.MeanMaxMin, ThawYear: pipeline.MonthDay{Month: 1, Day: 15}, FreezeYear: pipeline.MonthDay{Month: 7, Day: 15}}},
		Sites: []pipeline.Site{{ID: "strip", Station: "TARN", Surfaces: []pipeline.Surface{{
			ID: "apron",
			Factors: []pipeline.NFactor{
				{Kind: pipeline.Thaw, From: day(2000, 1, 1), Value: 2, Low: 2, High: 2}, {Kind: pipeline.Thaw, From: day(2031, 1, 16), Value: 4, Low: 4, High: 4},
			},
			Designs: []pipeline.DesignValue{
				{Kind: pipeline.Thaw, Definition: pipeline.NotStated, Of: pipeline.OfSurface, Index: 900, Unit: pipeline.DegCDays, Direction: pipeline.NotAbove, From: day(1990, 1, 1), NearShare: 0.9},
				{Kind: pipeline.Thaw, Definition: pipeline.NotStated, Of: pipeline.OfSurface, Index: 1000, Unit: pipeline.DegCDays, Direction: pipeline.NotAbove, From: day(2031, 1, 15), NearShare: 0.9},
				{Kind: pipeline.Freeze, Definition: pipeline.Sum, Of: pipeline.OfSurface, Index: 1000, Unit: pipeline.DegCDays, Direction: pipeline.NotBelow, From: day(1990, 1, 1), NearShare: 0.9},
				{Kind: pipeline.Freeze, Definition: pipeline.Sum, Of: pipeline.OfAir, Index: 24000, Unit: pipeline.KelvinHours, Direction: pipeline.NotBelow, From: day(1990, 1, 1), NearShare: 0.9},
			},
		}}}},
	})
	if err != nil {
		t.Fatal(err)
	}
	season := day(2031, 1, 15)
	for _, c := range []struct {
		thaw pipeline.Day
		want float64
	}{{season - 365, 450}, {season, 500}, {season + 365, 250}} {
		designs, err := db.AirDesigns(ctx, "TARN", c.thaw, day(2030, 7, 15))
		if err != nil || len(designs) != 3 {
			t.Fatalf("%v, %v", designs, err)
		}
		air, surface, thaw := designs[0], designs[1], designs[2]
		if air.AirCDays != 1000 || !air.Comparable || surface.Comparable || thaw.AirCDays != c.want || thaw.Compared != pipeline.Curve || thaw.Stated != pipeline.NotStated {
			t.Errorf("thaw year from %s: %+v; want %v", c.thaw, designs, c.want)
		}
	}

	designs, err := db.AirDesigns(ctx, "TARN", season, season-180)
	if err != nil {
		t.Fatal(err)
	}
	id := designs[2].ID
	if got, err := db.Outlook(ctx, "TARN", id, season); err != nil || got != nil {
		t.Fatalf("before there is any: %v, %v", got, err)
	}
	low, high, end, on, two := 0.1, 0.4, 700.0, day(2031, 8, 14), 2.0
	july := store.OutlookRow{
		Station: "TARN", Kind: pipeline.Thaw, Definition: pipeline.Curve, SeasonStart: season, Season: "2031", Through: day(2031, 7, 20),
		DesignValueID: &id, ThresholdCDays: 500, NFactor: &two, IndexLow: 300, IndexHigh: 300, ProbabilityLow: 0.6, ProbabilityHigh: 0.6,
		PassDay10: &on, PassDay50: &on, PassDay90: &on, End10: 480, End50: &end, End90: 800, Members: 25, Which: "raw", LeadMonth: 6, ScoredYears: 14,
		Skill: &store.OutlookSkill{Value: 0.3, Low: &low, High: &high}, AnnouncedAllowed: true,
	}
	june, again, other := july, july, july
	june.Through, june.ProbabilityLow, june.ProbabilityHigh, june.End50, june.Skill, june.PassDay90 = day(2031, 6, 20), 0.2, 0.7, nil, nil, nil
	again.ThresholdCDays, again.ProbabilityLow, again.ProbabilityHigh, again.BrierSkill = 250, 0.9, 0.9, &store.OutlookSkill{Value: 0.2}
	other.DesignValueID, other.ThresholdCDays = nil, 123
	for _, rows := range [][]store.OutlookRow{{july, other}, {june, other}, {again}} {
		if err := db.WriteOutlooks(ctx, rows); err != nil {
			t.Fatal(err)
		}
	}
	got, err := db.Outlook(ctx, "TARN", id, season)
	if err != nil || got == nil {
		t.Fatalf("%v, %v", got, err)
	}
	if diff := cmp.Diff(&again, got, cmpopts.IgnoreFields(store.OutlookRow{}, "MadeAt")); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if time.Since(got.MadeAt).Abs() > time.Hour {
		t.Errorf("made at %s", got.MadeAt)
	}
	want := []string{"(2031-06-20,500,,0.2,0.7,)", "(2031-07-20,123,0.6,0.6,0.6,0.3)", "(2031-07-20,250,0.9,0.9,0.9,0.3)"}
	if diff := cmp.Diff(want, db.Rows(t, `select through_day, threshold_c_days, probability, probability_low, probability_high, crps_skill
		from thaw.outlooks order by through_day, threshold_c_days`)); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}

	score := store.OutlookScoreRow{YearsFrom: "earlier", Which: "raw", LeadMonth: 6, Used: true, Years: 14, N: 28, ThresholdsCDays: []float64{500}}
	for range 2 {
		if err := db.WriteOutlookScores(ctx, "TARN", pipeline.Thaw, pipeline.Curve, []store.OutlookScoreRow{score}); err != nil {
			t.Fatal(err)
		}
	}
	if got := db.Rows(t, `select years_used, skill, thresholds_c_days from thaw.outlook_scores`); len(got) != 1 || got[0] != "(14,,{500})" {
		t.Errorf("scores %v", got)
	}
	// within a transaction of judging
	if err := pipelinetest.Exec(ctx, db.URL, `insert into thaw.changes (station, from_day) values ('TARN', '2031-07-20')`); err != nil {
		t.Fatal(err)
	}
	judged := false
	err = db.JudgeStation(ctx, "TARN", func(j *store.Judging, _ pipeline.Day) error {
		judged = true
		got, err := j.Outlook(ctx, id, season)
		if err == nil && (got == nil || got.ThresholdCDays != 250) {
			t.Errorf("while judging: %v", got)
		}
		return err
	})
	if err != nil || !judged {
		t.Fatal(err)
	}
}
