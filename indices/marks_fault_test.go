package indices

import (
	"testing"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// A member commits while its joined record is being made: either the record has
// the member's days or its mark stays. Here the member's transaction has marked
// the record and not yet committed when the record is begun, which has to wait.
func TestMarksAreNotLost(t *testing.T) {
	w := newWorld(t, fell)
	both := fell
	both.ID, both.Joined = "BOTH", []pipeline.Member{{Station: "FELL"}}
	if err := w.State(t.Context(), store.Stated{Hash: "joined", Stations: []pipeline.Station{fell, both}, Feeds: []pipeline.Feed{{Name: "fell"}}}); err != nil {
		t.Fatal(err)
	}
	made := make(chan error, 1)
	err := w.TakeStation(t.Context(), "FELL", func(tx *store.Take) error {
		mean := 4.0
		day := pipeline.DayOf(2031, 5, 1)
		if err := tx.WriteDays(t.Context(), []store.DayRow{{Day: day, MeanC: &mean, LowC: mean, HighC: mean, Origin: pipeline.Observed, Rule: fell.Mean}},
			[]pipeline.Day{day}); err != nil {
			return err
		}
		if err := tx.AddChange(t.Context(), day); err != nil {
			return err
		}
		go func() { made <- w.service.Recompute(t.Context(), "BOTH") }()
		eventually(t, "the record waits for its member", func() bool {
			select {
			case err := <-made:
				made <- err
				return true // it has not waited
			default:
			}
			return w.Rows(t, `select count(*) from pg_stat_activity where datname = current_database() and wait_event_type = 'Lock'`)[0] == "(1)"
		})
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if err := <-made; err != nil {
		t.Fatal(err)
	}
	got := w.Rows(t, `select (select count(*) from thaw.daily_values where station = 'BOTH' and origin = 1), recompute from thaw.stations where station = 'BOTH'`)
	if got[0] != "(1,f)" && got[0] != "(0,t)" {
		t.Errorf("days and mark of the joined record: %s; want its member's day, or a mark that stays", got[0])
	}
}
