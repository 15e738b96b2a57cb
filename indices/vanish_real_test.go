package indices

import (
	"testing"
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/pipelinetest"
)

// Where a record's first seasons vanish, the judge is told from their beginning,
// so that nothing is left of their standings.
func TestSeasonsThatVanish(t *testing.T) {
	w := newWorld(t, fell)
	early, late := pipeline.DayOf(2029, time.June, 1), pipeline.DayOf(2031, time.June, 1)
	w.take(t, w.open(t, "fell", 1, delivery{"one", days(early, 1, 9, 9, 9, 9)}, 500)...)
	w.take(t, w.open(t, "fell", 2, delivery{"two", days(late, 1, 9, 9, 9, 9)}, 500)...)
	if err := pipelinetest.Exec(t.Context(), w.URL, `delete from thaw.changes`); err != nil {
		t.Fatal(err)
	}
	wrong := days(early, 1, 9, 9, 9, 9)
	for i := range wrong {
		wrong[i].Quality = pipeline.QualityWrong
	}
	w.take(t, w.open(t, "fell", 3, delivery{"three", wrong}, 500)...)
	if got := w.Rows(t, `select min(season_start) from thaw.air_index_season`); got[0] != "(2030-07-15)" {
		t.Errorf("first season %v", got)
	}
	if got := w.Rows(t, `select min(from_day) <= date '2029-01-15' from thaw.changes`); got[0] != "(t)" {
		t.Errorf("to be judged from %v", w.Rows(t, `select min(from_day) from thaw.changes`))
	}
}
