package judge

import (
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"thawledger/pipeline"
)

// There is no outside table for these rules: they are this project's own, as
// documented on Season ("common practice, no source" for the share of 0.9).
func TestSeason(t *testing.T) {
	day := func(n int) *pipeline.Day { d := pipeline.Day(n); return &d }
	above := Design{CDays: 100, NearShare: 0.9, Direction: pipeline.NotAbove}
	below := Design{CDays: 100, NearShare: 0.9, Direction: pipeline.NotBelow}
	for _, tc := range []struct {
		name   string
		design Design
		over   bool
		days   []Day
		want   Standing
	}{
		{"within", above, false, []Day{{1, 10, 10}, {2, 89.9, 89.9}},
			Standing{State: pipeline.Within, Level: pipeline.LevelWithin, Low: 89.9, High: 89.9}},
		{"near from the share on", above, false, []Day{{1, 89, 89}, {2, 90, 90}, {3, 99.9, 99.9}},
			Standing{State: pipeline.Near, Level: pipeline.LevelNear, Low: 99.9, High: 99.9, NearOn: day(2)}},
		{"exceeded at the design value", above, false, []Day{{1, 95, 95}, {2, 100, 100}, {3, 100, 100}},
			Standing{State: pipeline.Exceeded, Level: pipeline.LevelExceeded, Low: 100, High: 100, NearOn: day(1), ExceededOn: day(2), ConfirmedOn: day(2)}},
		{"unknown when a gap may hide a crossing", above, false, []Day{{1, 80, 80}, {2, 82, 105}},
			Standing{State: pipeline.Unknown, Level: pipeline.LevelWithin, Straddles: true, Low: 82, High: 105}},
		{"unknown hides near, whose day is kept", above, false, []Day{{1, 91, 91}, {2, 91, 100}},
			Standing{State: pipeline.Unknown, Level: pipeline.LevelNear, Straddles: true, Low: 91, High: 100, NearOn: day(1)}},
		{"a gap that cannot reach is no doubt", above, false, []Day{{1, 50, 50}, {2, 52, 99.9}},
			Standing{State: pipeline.Within, Level: pipeline.LevelWithin, Low: 52, High: 99.9}},
		{"unknown never replaces exceeded", above, false, []Day{{1, 100, 100}, {2, 100, 180}},
			Standing{State: pipeline.Exceeded, Level: pipeline.LevelExceeded, Low: 100, High: 180, NearOn: day(1), ExceededOn: day(1), ConfirmedOn: day(1)}},
		{"not below, still open", below, false, []Day{{1, 10, 10}},
			Standing{State: pipeline.Unknown, Level: pipeline.LevelWithin, Low: 10, High: 10}},
		{"not below, reached early", below, false, []Day{{1, 120, 120}},
			Standing{State: pipeline.Within, Level: pipeline.LevelWithin, Low: 120, High: 120}},
		{"not below, fell short", below, true, []Day{{1, 99, 99}},
			Standing{State: pipeline.FellShort, Level: pipeline.LevelWithin, Low: 99, High: 99}},
		{"not below, over with a gap", below, true, []Day{{1, 99, 130}},
			Standing{State: pipeline.Unknown, Level: pipeline.LevelWithin, Straddles: true, Low: 99, High: 130}},
	} {
		t.Run(tc.name, func(t *testing.T) {
			if diff := cmp.Diff(tc.want, Season(tc.design, tc.days, tc.over, nil, false)); diff != "" {
				t.Error(diff)
			}
		})
	}
}

// A further day can only raise the level, and the true index, wherever it lies
// between the bounds, is never exceeded while the state says within or near.
func TestSeasonProperties(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		d := Design{CDays: 100, NearShare: rapid.Float64Range(0.1, 1).Draw(t, "near"), Direction: pipeline.NotAbove}
		var days []Day
		var low, high float64
		level := pipeline.LevelWithin
		for i := range rapid.IntRange(1, 40).Draw(t, "days") {
			rise := rapid.Float64Range(0, 8).Draw(t, "rise")
			low, high = low+rise, high+rise+rapid.Float64Range(0, 2).Draw(t, "doubt")
			days = append(days, Day{pipeline.Day(i), low, high})
			s := Season(d, days, false, nil, false)
			if order(s.Level) < order(level) {
				t.Fatalf("level fell from %s to %s", level, s.Level)
			}
			level = s.Level
			if s.State != pipeline.Exceeded && s.State != pipeline.Unknown && high >= d.CDays {
				t.Fatalf("state %s, but the index may be %g", s.State, high)
			}
			if s.State == pipeline.Exceeded && low < d.CDays {
				t.Fatalf("exceeded, but the index may be %g", low)
			}
		}
	})
}

func order(l pipeline.Level) int {
	return map[pipeline.Level]int{pipeline.LevelWithin: 0, pipeline.LevelNear: 1, pipeline.LevelExceeded: 2}[l]
}

func TestTold(t *testing.T) {
	for _, tc := range []struct {
		direction     pipeline.Direction
		before, after pipeline.State
		want          bool
	}{
		{pipeline.NotAbove, "", pipeline.Within, false},
		{pipeline.NotAbove, "", pipeline.Exceeded, true},
		{pipeline.NotAbove, pipeline.Near, pipeline.Near, false},
		{pipeline.NotAbove, pipeline.Exceeded, pipeline.Within, true},
		{pipeline.NotBelow, pipeline.Unknown, pipeline.Within, false},
		{pipeline.NotBelow, pipeline.Unknown, pipeline.FellShort, true},
	} {
		if got := Told(tc.direction, tc.before, tc.after); got != tc.want {
			t.Errorf("Told(%s, %q, %q) = %t", tc.direction, tc.before, tc.after, got)
		}
	}
}
