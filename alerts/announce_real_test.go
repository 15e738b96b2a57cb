package alerts

import (
	"errors"
	"fmt"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

// What the bus refuses is not recorded as told, keeps its id, and holds back all
// that comes after it.
func TestAnnounceFails(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("a", thaw(100)), surface("b", thaw(110)), surface("c", thaw(120))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 125))
	full := errors.New("bus is full")
	w.refuse = func(id string) error {
		if id == "standing/2" {
			return full
		}
		return nil
	}
	if err := w.service.Pass(t.Context()); !errors.Is(err, full) {
		t.Errorf("pass: %v", err)
	}
	recorded := `select surface, announced_at is not null from thaw.standing_changes order by change_id`
	same(t, "recorded as told", w.Rows(t, recorded), []string{"(a,t)", "(b,f)", "(c,f)"})
	same(t, "standings", w.Rows(t, `select surface, state from thaw.standings order by 1`), []string{"(a,exceeded)", "(b,exceeded)", "(c,exceeded)"})
	if err := w.service.Pass(t.Context()); !errors.Is(err, full) {
		t.Errorf("pass: %v", err)
	}
	w.refuse = nil
	w.pass(t)
	w.pass(t)
	same(t, "tried", w.tried, []string{"standing/1", "standing/2", "standing/2", "standing/2", "standing/3"})
	same(t, "told", w.heard(), []string{"a -> exceeded, first judgement", "b -> exceeded, first judgement", "c -> exceeded, first judgement"})
	same(t, "recorded as told", w.Rows(t, recorded), []string{"(a,t)", "(b,t)", "(c,t)"})
}

// A crash between telling and recording tells twice, under one id.
func TestToldButNotRecorded(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	w.state(t, strip(surface("apron", thaw(100))))
	w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, at("2031-06-20", 125))
	w.exec(t, `create function fail() returns trigger language plpgsql as 'begin raise exception ''no''; end'`)
	w.exec(t, `create trigger fail before update on thaw.standing_changes for each row execute function fail()`)
	if err := w.service.Pass(t.Context()); err == nil {
		t.Error("no error")
	}
	w.exec(t, `drop trigger fail on thaw.standing_changes`)
	w.pass(t)
	same(t, "tried", w.tried, []string{"standing/1", "standing/1"})
	if diff := cmp.Diff(w.told[0].Announcement, w.told[1].Announcement); diff != "" {
		t.Error(diff)
	}
}

// More than is read at a time, and each in its turn.
func TestAnnounceMany(t *testing.T) {
	w := newWorld(t, "2031-08-01")
	var surfaces []pipeline.Surface
	var want []string
	for n := range 230 {
		surfaces = append(surfaces, surface(fmt.Sprintf("s%03d", n), thaw(100)))
		want = append(want, fmt.Sprintf("s%03d -> near, first judgement", n))
	}
	for n := range 230 {
		want = append(want, fmt.Sprintf("s%03d near -> exceeded, progress", n))
	}
	w.state(t, strip(surfaces...))
	days := []index{at("2031-06-01", 95), at("2031-06-02", 105)}
	w.refuse = func(string) error { return errors.New("out of reach") }
	for i := range days {
		w.set(t, "FELL", pipeline.Thaw, "2031-01-15", false, days[:i+1]...)
		if err := w.service.Pass(t.Context()); err == nil {
			t.Error("no error")
		}
	}
	w.refuse = nil
	w.pass(t)
	w.pass(t)
	same(t, "told", w.heard(), want)
}
