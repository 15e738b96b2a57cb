package main

import (
	"fmt"
	"math"
	"strings"
	"testing"
	"time"
)

// daysOf writes daily maxima and minima of an invented place.
func daysOf(first string, n int, as func(c float64) float64) string {
	var b strings.Builder
	b.WriteString("date,tmax,tmin\n")
	at, err := time.Parse(time.DateOnly, first)
	if err != nil {
		panic(err)
	}
	for i := range n {
		d := at.AddDate(0, 0, i)
		c := -10 + 20*math.Sin(2*math.Pi*float64(d.YearDay()-110)/365) + 5*math.Sin(float64(i*i%97))
		fmt.Fprintf(&b, "%s,%.1f,%.1f\n", d.Format(time.DateOnly), as(c+3), as(c-3))
	}
	return b.String()
}

// A file in degF, declared as degC, is held back once the record knows better,
// and used if somebody says so.
func TestWrongUnitIsHeldBack(t *testing.T) {
	t.Parallel()
	p := newPlace(t, fmt.Sprintf(apartSettings, "data", "feed"), nil)
	same := func(c float64) float64 { return c }
	degF := func(c float64) float64 { return c*1.8 + 32 }
	p.dated(t, "feed/history.csv", daysOf("2019-01-01", 5*365, same), 1)
	p.run(t, "run", "--until-idle")
	p.dated(t, "feed/degf.csv", daysOf("2024-06-01", 40, degF), 2)
	p.dated(t, "feed/degc.csv", daysOf("2024-08-01", 40, same), 3)
	d := p.start(t, "run", "--until-idle")
	<-d.ended
	if d.err == nil || !strings.Contains(d.said(), "looks like degF, declared as degC") || strings.Count(d.said(), "held back: feed") != 1 {
		t.Errorf("%v\n%s", d.err, d.said())
	}
	if got := p.rows(t, `select count(*) filter (where day between '2024-06-01' and '2024-07-10'), count(*) filter (where day >= '2024-08-01')
		from thaw.daily_values where origin = 1`); got[0] != "(0,40)" {
		t.Errorf("days %v; want those of the other file only", got)
	}
	id := strings.Trim(p.rows(t, `select batch_id from thaw.ledger where state = 'held_back'`)[0], "()")
	p.run(t, "feed", "take", id)
	p.run(t, "run", "--until-idle")
	if got := p.rows(t, `select count(*) from thaw.daily_values where day between '2024-06-01' and '2024-07-10' and origin = 1`); got[0] != "(40)" {
		t.Errorf("days %v once it is taken", got)
	}
}
