package quality

import (
	"encoding/csv"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"thawledger/pipeline"
)

// A real record, mild and clean (vega-datasets 3.2.1, see SOURCE beside it):
// nothing of its four years fails.
func TestSeattleIsClean(t *testing.T) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "vega_seattle", "seattle-weather.csv"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	rows, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var rec Record
	for _, row := range rows[1:] {
		d, err := pipeline.ParseDay(row[0])
		if err != nil {
			t.Fatal(err)
		}
		v := DayValue{Day: d, HasMax: true, HasMin: true, Observed: true}
		v.MaxC, _ = strconv.ParseFloat(row[2], 64)
		v.MinC, _ = strconv.ParseFloat(row[3], 64)
		v.MeanC = (v.MaxC + v.MinC) / 2
		rec = append(rec, v)
	}
	for i, o := range Daily(rec, Options{}) {
		if o.Mark != pipeline.QualityGood {
			t.Errorf("%s: %s, %s (%+v)", o.Day, o.Mark, o.Failed, rec[i])
		}
	}
	if len(rec) < 700 {
		t.Errorf("%d days", len(rec))
	}
}
