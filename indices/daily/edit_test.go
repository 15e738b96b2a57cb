package daily

import (
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/pipeline"
)

// What an edit does is this project's own rule; the cases are by hand.
func TestEdited(t *testing.T) {
	at := func(hour int64, c float64) Input {
		return Input{Feed: "logger", Sensor: "air", Variable: pipeline.AirTemp, StartS: hour * hourS, ValueC: c, Quality: pipeline.QualityGood}
	}
	and := func(r Input, change func(*Input)) Input { change(&r); return r }
	changed := func(r *Input) { r.Quality = pipeline.QualityChanged }
	wrong := func(r *Input) { r.Quality = pipeline.QualityWrong }
	from := func(hour, end int64, kind pipeline.EditKind, amount float64) Edit {
		return Edit{Kind: kind, FromS: hour * hourS, ToS: end * hourS, Amount: amount}
	}
	for _, c := range []struct {
		name     string
		edits    []Edit
		in, want []Input
	}{
		{"none", nil, []Input{at(1, 5)}, []Input{at(1, 5)}},
		{"exclude, half-open", []Edit{from(1, 2, pipeline.EditExclude, 0)}, []Input{at(0, 5), at(1, 5), at(2, 5)},
			[]Input{at(0, 5), and(at(1, 5), wrong), at(2, 5)}},
		{"offset", []Edit{from(0, 2, pipeline.EditOffset, -0.5)}, []Input{at(1, 5)}, []Input{and(at(1, 4.5), changed)}},
		{"two offsets add up", []Edit{from(0, 2, pipeline.EditOffset, 1), from(0, 2, pipeline.EditOffset, 2)}, []Input{at(1, 5)}, []Input{and(at(1, 8), changed)}},
		{"a worse mark stays", []Edit{from(0, 2, pipeline.EditOffset, 1)}, []Input{and(at(1, 5), func(r *Input) { r.Quality = pipeline.QualityDoubtful })},
			[]Input{and(at(1, 6), func(r *Input) { r.Quality = pipeline.QualityDoubtful })}},
		{"a wrong value is not made good", []Edit{from(0, 2, pipeline.EditOffset, 1)}, []Input{and(at(1, 5), wrong)}, []Input{and(at(1, 6), wrong)}},
		{"shift, in order of time", []Edit{from(0, 1, pipeline.EditShift, 3*hourS)}, []Input{at(0, 5), at(1, 6)}, []Input{at(1, 6), and(at(3, 5), changed)}},
		{"a shifted reading is not shifted on", []Edit{from(0, 1, pipeline.EditShift, hourS), from(1, 2, pipeline.EditShift, hourS)}, []Input{at(0, 5), at(1, 6)},
			[]Input{and(at(1, 5), changed), and(at(2, 6), changed)}},
		{"other sensor, feed, variable", []Edit{
			{Kind: pipeline.EditExclude, Sensor: "spare", ToS: dayS}, {Kind: pipeline.EditExclude, Feed: "paper", ToS: dayS},
			{Kind: pipeline.EditExclude, Variable: pipeline.AirTempMax, ToS: dayS}}, []Input{at(1, 5)}, []Input{at(1, 5)}},
		{"replace", []Edit{{Kind: pipeline.EditReplace, Variable: pipeline.AirTempMax, Sensor: "air", ToS: dayS, Amount: 7}}, nil,
			[]Input{{Feed: "edit", Rank: 1<<63 - 1, Sensor: "air", Variable: pipeline.AirTempMax, SpanS: dayS, ValueC: 7, Quality: pipeline.QualityChanged}}},
	} {
		t.Run(c.name, func(t *testing.T) {
			if diff := cmp.Diff(c.want, Edited(c.edits, c.in), cmp.Transformer("list", func(l []Input) []Input { return append([]Input{}, l...) })); diff != "" {
				t.Errorf("(-want +got):\n%s", diff)
			}
		})
	}
	if got := Reach([]Edit{from(0, 1, pipeline.EditShift, -7200), from(0, 1, pipeline.EditOffset, 90000)}); got != 7200 {
		t.Errorf("reach %d; want 7200", got)
	}
}
