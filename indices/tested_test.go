package indices

import (
	"fmt"
	"math"
	"testing"

	"thawledger/indices/daily"
	"thawledger/indices/quality"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// A spike of one series among hourly readings of two is found, kept apart from
// the outcomes of the day's own tests, and takes nothing out.
func TestReadingsAreTested(t *testing.T) {
	st := fell
	st.Mean, st.MinHours, st.MaxHole = pipeline.MeanHourly, 20, 3
	day := pipeline.DayOf(2031, 7, 1)
	var in []daily.Input
	for h := range 24 {
		c := 8 + math.Sin(float64(h)/4)
		if h == 12 {
			c += 40
		}
		at := st.DayStart(day).Unix() + int64(h)*3600
		in = append(in, daily.Input{Feed: "a", Variable: pipeline.AirTemp, StartS: at, ValueC: c},
			daily.Input{Feed: "b", Variable: pipeline.AirTemp, StartS: at, ValueC: 8 + math.Sin(float64(h)/4)})
	}
	v := daily.Make(&st, day, in)
	if testReadings(&st, &v, in); v.TestsFailed != uint32(quality.MaskOf(quality.Step, quality.Spike))<<16 {
		t.Errorf("failed %s", quality.Mask(v.TestsFailed>>16))
	}
	values := []daily.Value{v}
	test(&st, values)
	if values[0].TestsFailed != v.TestsFailed || values[0].TestsMade&dayTests == 0 {
		t.Errorf("after the tests of days: made %b, failed %b", values[0].TestsMade, values[0].TestsFailed)
	}
	row := toRow(&values[0])
	if !isDoubtful(&row) || row.MeanC == nil {
		t.Errorf("doubtful %t, mean %v", isDoubtful(&row), row.MeanC)
	}
}

// The table of tests names every bit that may be set.
func TestQualityTestsAreListed(t *testing.T) {
	w := newWorld(t, fell)
	listed := map[string]bool{}
	for _, row := range w.Rows(t, `select bit from thaw.quality_tests`) {
		listed[row] = true
	}
	for bit := range quality.Count {
		if !listed[fmt.Sprintf("(%d)", bit)] {
			t.Errorf("%s is not in thaw.quality_tests", quality.Test(bit))
		}
	}
	for _, of := range []quality.Test{quality.Range, quality.Step, quality.Spike, quality.Persistence, quality.Naught} {
		if !listed[fmt.Sprintf("(%d)", of+readingTests)] {
			t.Errorf("%s of readings is not in thaw.quality_tests", of)
		}
	}
	if got := w.Rows(t, `select thaw.mark_after_tests(4::smallint, 3, 0), thaw.mark_after_tests(4::smallint, 3, 2), thaw.mark_after_tests(0::smallint, 3, 1),
		thaw.mark_after_tests(5::smallint, 3, 0), thaw.mark_after_tests(7::smallint, 3, 1), thaw.mark_after_tests(4::smallint, 0, 0)`); got[0] != "(0,1,2,5,7,4)" {
		t.Errorf("marks %v", got)
	}
}

// What is written of a day's tests is read again.
func TestOutcomesAreKept(t *testing.T) {
	w := newWorld(t, fell)
	readings := days(may, 1, thawHand...)
	readings[6].ValueC = 60 // a maximum of 60 degC on the fourth day
	w.take(t, w.open(t, "fell", 1, delivery{"file", readings}, 500)...)
	got := w.Rows(t, `select day, count(*) filter (where failed) > 0, max(quality) from thaw.quality_outcomes where station = 'FELL' group by day
		having bool_or(failed) order by day`)
	if len(got) == 0 {
		t.Fatal("nothing is found in a maximum of 60 degC")
	}
	season := w.Rows(t, `select days_doubtful, index_low_c_days > without_doubtful_low_c_days, without_doubtful_high_c_days >= without_doubtful_low_c_days
		from thaw.air_index_season where kind = 'thaw' and definition = 'curve'`)
	if season[0] != fmt.Sprintf("(%d,t,t)", len(got)) {
		t.Errorf("season %v of %d doubtful days %v", season, len(got), got)
	}
	var kept []store.DayRow
	if err := w.TakeStation(t.Context(), "FELL", func(tx *store.Take) (err error) { kept, err = tx.Days(t.Context()); return err }); err != nil {
		t.Fatal(err)
	}
	failed := 0
	for i := range kept {
		if kept[i].TestsFailed != 0 {
			failed++
		}
	}
	if failed != len(got) {
		t.Errorf("%d days with failed tests read again; want %d", failed, len(got))
	}
}
