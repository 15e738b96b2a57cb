package quality

import (
	"math"
	"testing"
	"time"

	"thawledger/pipeline"
)

// readings returns values a step apart from the day's start on.
func readings(step time.Duration, valuesC ...float64) []pipeline.Reading {
	out := make([]pipeline.Reading, len(valuesC))
	for i, c := range valuesC {
		out[i] = pipeline.Reading{StartS: int64(winter)*86400 + int64(i)*int64(step/time.Second), ValueC: c}
	}
	return out
}

// many repeats a value.
func many(n int, c float64) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = c
	}
	return out
}

// WMO guidelines (Zahumensky, 2004, second-hand): 3 degC for air, 10 for a
// surface, from minute to minute. Beyond, the square-root law: 3 sqrt(60) =
// 23.237900077 for an hour.
func TestStepLimit(t *testing.T) {
	for _, c := range []struct {
		m     Medium
		apart time.Duration
		want  float64
	}{
		{Air, time.Minute, 3}, {Air, time.Second, 3}, {Surface, time.Minute, 10}, {Soil, time.Minute, 0.5},
		{Air, 5 * time.Minute, 6.708203932}, {Air, 15 * time.Minute, 11.618950039}, {Air, time.Hour, 23.237900077},
		{Air, 70 * time.Minute, 25}, {Air, 24 * time.Hour, 25}, {Surface, time.Hour, 40}, {Soil, time.Hour, 3.872983346},
	} {
		if got := StepLimitC(c.m, c.apart); math.Abs(got-c.want) > 1e-9 {
			t.Errorf("medium %d, %s: %v; want %v", c.m, c.apart, got, c.want)
		}
	}
	for apart := time.Minute; apart < 48*time.Hour; apart += time.Minute {
		if StepLimitC(Air, apart+time.Minute) < StepLimitC(Air, apart) {
			t.Fatalf("falls at %s", apart)
		}
	}
}

func TestHours(t *testing.T) {
	// an inversion that breaks up: 18 degC in an hour
	breakUp := []float64{-41, -41.6, -42.3, -42.8, -43, -42.6, -41.9, -40.2, -38.5, -20.5, -14.1, -12.3, -12.9, -13.4, -14, -14.2, -15}
	for _, c := range []struct {
		name   string
		opt    Options
		rows   []pipeline.Reading
		failed Mask
		mark   pipeline.Quality
	}{
		{"none", Options{}, nil, 0, pipeline.QualityMissing},
		{"one", Options{}, readings(time.Hour, 4), 0, pipeline.QualityGood},
		{"end of an inversion", Options{}, readings(time.Hour, breakUp...), 0, pipeline.QualityGood},
		{"3 degC in a minute", Options{}, readings(time.Minute, 1, 4), 0, pipeline.QualityGood},
		{"3.1 degC in a minute", Options{}, readings(time.Minute, 1, 4.1), MaskOf(Step), pipeline.QualityDoubtful},
		{"3.1 degC in an hour", Options{}, readings(time.Hour, 1, 4.1, 7.2, 3.9), 0, pipeline.QualityGood},
		{"24 degC in an hour", Options{}, readings(time.Hour, -30, -6), MaskOf(Step), pipeline.QualityDoubtful},
		{"10 degC of a surface in a minute", Options{Medium: Surface}, readings(time.Minute, 1, 11), 0, pipeline.QualityGood},
		{"up and down", Options{}, readings(time.Hour, -30, -12, -30), MaskOf(Spike), pipeline.QualityDoubtful},
		{"up and on", Options{}, readings(time.Hour, -30, -12, 6), 0, pipeline.QualityGood},
		{"beyond", Options{}, readings(time.Hour, 5, 5.5, 61, 5.2), MaskOf(Range), pipeline.QualityWrong},
		{"60 flat minutes", Options{}, readings(time.Minute, many(61, -8.1)...), MaskOf(Persistence), pipeline.QualityDoubtful},
		{"59 flat minutes", Options{}, readings(time.Minute, many(60, -8.1)...), 0, pipeline.QualityGood},
		{"flat within less than a tenth", Options{}, readings(time.Minute, append(many(40, -8.1), many(21, -8.05)...)...), MaskOf(Persistence), pipeline.QualityDoubtful},
		{"a tenth is not flat", Options{}, readings(time.Minute, append(many(40, -8.1), many(30, -8.2)...)...), 0, pipeline.QualityGood},
		{"11 flat hours of fog", Options{}, readings(time.Hour, many(11, 2.3)...), 0, pipeline.QualityGood},
		{"12 flat hours", Options{}, readings(time.Hour, many(12, 2.3)...), MaskOf(Persistence), pipeline.QualityDoubtful},
		{"air at zero all day", Options{}, readings(time.Hour, many(24, 0)...), MaskOf(Persistence, Naught), pipeline.QualityDoubtful},
		{"surface at zero all day", Options{Medium: Surface}, readings(time.Hour, many(24, 0)...), 0, pipeline.QualityGood},
		{"surface flat elsewhere", Options{Medium: Surface}, readings(time.Hour, many(24, 0.3)...), MaskOf(Persistence), pipeline.QualityDoubtful},
		{"soil at rest", Options{Medium: Soil}, readings(time.Hour, many(24, -3.4)...), 0, pipeline.QualityGood},
		{"0 degF four times", Options{}, readings(6*time.Hour, many(4, -17.8)...), MaskOf(Naught), pipeline.QualityDoubtful},
		{"0 degC three times", Options{}, readings(8*time.Hour, many(3, 0)...), 0, pipeline.QualityGood},
	} {
		o := Hours(winter, c.rows, c.opt)
		if o.Failed != c.failed || o.Mark != c.mark || o.Day != winter || o.Failed&^o.Tested != 0 {
			t.Errorf("%s: %s, failed %q, tested %q; want %s, %q", c.name, o.Mark, o.Failed, o.Tested, c.mark, c.failed)
		}
	}
}

// Readings that are known to be wrong or missing are not tested with.
func TestHoursPassOverWhatIsKnown(t *testing.T) {
	rows := readings(time.Minute, 1, 50, 1.2, 999, 1.1)
	rows[1].Quality, rows[3].Quality = pipeline.QualityWrong, pipeline.QualityMissing
	if o := Hours(winter, rows, Options{}); o.Mark != pipeline.QualityGood {
		t.Errorf("%+v", o)
	}
	rows[1].Quality = pipeline.QualityDoubtful // stays in
	if o := Hours(winter, rows, Options{}); !o.Failed.Has(Step) || !o.Failed.Has(Spike) {
		t.Errorf("%+v", o)
	}
	if o := Hours(winter, rows[3:4], Options{}); o.Mark != pipeline.QualityMissing {
		t.Errorf("%+v", o)
	}
}

func TestHoursRefuse(t *testing.T) {
	twice := readings(0, 1, 2)
	mustPanic(t, "in order", func() { Hours(winter, twice, Options{}) })
	mustPanic(t, "not a temperature", func() { Hours(winter, readings(time.Hour, math.NaN()), Options{}) })
}
