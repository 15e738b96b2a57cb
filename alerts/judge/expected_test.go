package judge

import (
	"testing"

	"thawledger/pipeline"
)

// The order of states, the limits of expected and its steadying: by definition.
func TestExpected(t *testing.T) {
	d := Design{CDays: 100, NearShare: 0.9, Direction: pipeline.NotAbove}
	short := Design{CDays: 100, NearShare: 0.9, Direction: pipeline.NotBelow}
	for _, tc := range []struct {
		name      string
		design    Design
		low, high float64
		over      bool
		outlook   *Outlook
		was       bool
		want      pipeline.State
	}{
		{"no outlook", d, 50, 50, false, nil, false, pipeline.Within},
		{"no outlook any more", d, 50, 50, false, nil, true, pipeline.Within},
		{"likely", d, 50, 50, false, &Outlook{0.5, 0.5, true}, false, pipeline.Expected},
		{"likely, without skill", d, 50, 50, false, &Outlook{0.9, 0.9, false}, false, pipeline.Within},
		{"likely, without skill any more", d, 50, 50, false, &Outlook{0.9, 0.9, false}, true, pipeline.Within},
		{"unlikely", d, 50, 50, false, &Outlook{0.49, 0.49, true}, false, pipeline.Within},
		{"a little less likely than it was", d, 50, 50, false, &Outlook{0.41, 0.41, true}, true, pipeline.Expected},
		{"much less likely than it was", d, 50, 50, false, &Outlook{0.39, 0.39, true}, true, pipeline.Within},
		{"likely at most, for missing days", d, 50, 60, false, &Outlook{0.3, 0.8, true}, false, pipeline.Within},
		{"before near", d, 95, 95, false, &Outlook{0.9, 0.9, true}, false, pipeline.Expected},
		{"after unknown", d, 95, 105, false, &Outlook{0.9, 0.9, true}, false, pipeline.Unknown},
		{"after exceeded", d, 100, 100, false, &Outlook{1, 1, true}, true, pipeline.Exceeded},
		{"the season is over", d, 95, 95, true, &Outlook{0.9, 0.9, true}, true, pipeline.Near},
		{"to fall short", short, 50, 50, false, &Outlook{0.6, 0.6, true}, false, pipeline.Expected},
		{"reached after all", short, 100, 100, false, &Outlook{0.6, 0.6, true}, true, pipeline.Within},
		{"fell short", short, 50, 50, true, &Outlook{0.6, 0.6, true}, true, pipeline.FellShort},
		{"may fall short", short, 50, 50, false, &Outlook{0.3, 0.3, true}, false, pipeline.Unknown},
	} {
		s := Season(tc.design, []Day{{Day: 1, Low: tc.low, High: tc.high}}, tc.over, tc.outlook, tc.was)
		if s.State != tc.want {
			t.Errorf("%s: %s; want %s", tc.name, s.State, tc.want)
		}
	}
	within := Standing{State: pipeline.Within, Level: pipeline.LevelWithin}
	expected := Standing{State: pipeline.Expected, Level: pipeline.LevelWithin, Expected: true}
	past := func(s Standing) *Past {
		return &Past{State: s.State, Level: s.Level, Straddles: s.Straddles, Expected: s.Expected}
	}
	if got := Why(past(within), expected, true) + ", " + Why(past(expected), within, true); got != "outlook, outlook" {
		t.Errorf("why: %s", got)
	}
	if !Told(pipeline.NotBelow, pipeline.Unknown, pipeline.Expected) || !Told(pipeline.NotAbove, pipeline.Within, pipeline.Expected) {
		t.Error("expected is not told")
	}
}
