package alerts

import (
	"fmt"
	"testing"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// A surface is expected to exceed, and the next that is heard of it is that its
// season is over: those who were told of the one are told of the other.
func TestExpectedSeasonEnds(t *testing.T) {
	for _, tc := range []struct {
		today string
		told  bool
	}{{"2032-01-14", true}, {"2032-01-20", true}, {"2032-04-01", false}} {
		w := newWorld(t, "2031-08-05")
		w.state(t, strip(surface("apron", thaw(100))))
		w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-01", 10), at("2031-07-31", 50))
		w.pass(t)
		designs, err := w.AirDesigns(t.Context(), "FELL", date("2031-01-15"), date("2031-07-15"))
		if err != nil || len(designs) != 1 {
			t.Fatal(designs, err)
		}
		low := 0.1
		err = w.WriteOutlooks(t.Context(), []store.OutlookRow{{Station: "FELL", Kind: pipeline.Thaw, Definition: pipeline.Curve, SeasonStart: date("2031-01-15"),
			Season: "2031", Through: date("2031-07-31"), DesignValueID: &designs[0].ID, ThresholdCDays: 100, IndexLow: 50, IndexHigh: 50,
			ProbabilityLow: 0.7, ProbabilityHigh: 0.7, Members: 25, Which: "raw", LeadMonth: 5, ScoredYears: 20,
			Skill: &store.OutlookSkill{Value: 0.3, Low: &low, High: &low}, AnnouncedAllowed: true}})
		if err != nil {
			t.Fatal(err)
		}
		w.exec(t, `insert into thaw.changes (station, from_day) values ('FELL', '2031-07-31')`)
		w.pass(t)
		w.today = date(tc.today)
		w.set(t, "FELL", pipeline.Thaw, "2031-01-15", true, at("2031-06-01", 10), at("2031-07-31", 50), at("2031-09-30", 80))
		w.pass(t)
		same(t, tc.today, w.Rows(t, `select from_state, to_state, why, announce from thaw.standing_changes where from_state is not null order by change_id`),
			[]string{"(within,expected,outlook,t)", fmt.Sprintf(`(expected,within,"season over",%.1s)`, fmt.Sprint(tc.told))})
	}
}
