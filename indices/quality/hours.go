package quality

import (
	"fmt"
	"math"
	"time"

	"thawledger/pipeline"
)

// Limits of the tests on readings.
const (
	flatCount = 12               // Persistence: least readings that stand still; judgement
	flatTime  = 60 * time.Minute // Persistence: Zahumensky, 2004, second-hand
	naughts   = 4                // Naught: least readings, as many as synoptic hours; judgement
	hourSpike = 0.75             // Spike: share of the limit of Step, on both sides; judgement
)

// Hours tests a day's readings of one series, in order of start. Readings
// marked wrong or missing are passed over. The tests:
//
//   - Range: any beyond Options.Bounds. Such a reading takes part in no other test.
//   - Step: a change beyond StepLimitC for the time between the two.
//   - Spike: off the readings before and after, to the same side, by 0.75 of
//     that or more. A front or the end of an inversion goes one way.
//   - Persistence: at least 12 readings in a row, through at least an hour, with
//     less than 0.1 degC between the highest and the lowest. The guidelines' hour
//     is for values a minute apart; hourly values stand still for 12 hours.
//     Surface: unless all are within 0.2 degC of zero. Soil: not tested.
//   - Naught: four or more readings, all 0 degC (air), or all 0 degF.
//
// Hours panics if readings are not in order, or a value is not finite or beyond
// 1e6 degC.
func Hours(day pipeline.Day, readings []pipeline.Reading, opt Options) Outcome {
	opt.check()
	o := Outcome{Day: day, Mark: pipeline.QualityMissing}
	b := opt.bounds()
	used := make([]*pipeline.Reading, 0, len(readings))
	for i := range readings {
		r := &readings[i]
		if i > 0 && r.StartS <= readings[i-1].StartS {
			panic(fmt.Sprintf("quality: reading of %s after one of %s; readings must be in order, each time at most once",
				r.Start().Format(time.RFC3339), readings[i-1].Start().Format(time.RFC3339)))
		}
		if r.Quality == pipeline.QualityWrong || r.Quality == pipeline.QualityMissing {
			continue
		}
		if !isTemperature(r.ValueC) {
			panic(fmt.Sprintf("quality: value %v degC of %s is not a temperature", r.ValueC, r.Start().Format(time.RFC3339)))
		}
		within := b.LowestC <= r.ValueC && r.ValueC <= b.HighestC
		o.note(Range, !within)
		if within {
			used = append(used, r)
		}
	}
	for i := 1; i < len(used); i++ {
		limit := StepLimitC(opt.Medium, apart(used[i-1], used[i]))
		change := used[i].ValueC - used[i-1].ValueC
		o.note(Step, math.Abs(change) > limit)
		if i+1 < len(used) {
			limit = max(limit, StepLimitC(opt.Medium, apart(used[i], used[i+1])))
			next := used[i+1].ValueC - used[i].ValueC
			o.note(Spike, change*next < 0 && min(math.Abs(change), math.Abs(next)) >= hourSpike*limit)
		}
	}
	if opt.Medium != Soil {
		o.stands(used, opt.Medium)
	}
	o.naught(used, opt.Medium)
	if o.Tested != 0 {
		o.settle()
	}
	return o
}

func apart(a, b *pipeline.Reading) time.Duration {
	return time.Duration(b.StartS-a.StartS) * time.Second
}

// StepLimitC is the largest change in degC that passes the Step test between two
// values so far apart.
//
// For values a minute apart it is that of the guidelines (Zahumensky, 2004,
// second-hand): air 3 degC, surface 10 degC; soil 0.5 degC (from memory). Those
// limits are for a minute and would throw out the end of an inversion in hourly
// values. They are widened with the square root of the time between, as the
// changes of a quantity spread that is the sum of small independent ones, up to
// what the spike test of daily values allows (25 degC, Durre et al., 2010,
// second-hand; surface 40 and soil 10 degC: judgement). For air: 6.7 degC in 5
// minutes, 23.2 in an hour, 25 from 70 minutes on.
func StepLimitC(m Medium, apart time.Duration) float64 {
	aMinute, most := 3.0, stepC
	switch m {
	case Surface:
		aMinute, most = 10, 40
	case Soil:
		aMinute, most = 0.5, 10
	}
	return min(most, aMinute*math.Sqrt(max(1, apart.Minutes())))
}

// stands makes Persistence: it looks for a run of readings that stand still.
func (o *Outcome) stands(used []*pipeline.Reading, m Medium) {
	begin := 0
	for i := range used {
		lowest, highest := used[i].ValueC, used[i].ValueC
		// the longest run that ends here begins no earlier than that of the one before
		first := i
		for first > begin {
			c := used[first-1].ValueC
			if max(highest, c)-min(lowest, c) >= flatC-1e-9 { // tenths are not exact in binary
				break
			}
			first--
			lowest, highest = min(lowest, c), max(highest, c)
		}
		begin = first
		run := i - begin + 1
		if m == Surface && lowest >= -curtainC && highest <= curtainC {
			continue
		}
		if i+1 >= flatCount {
			o.note(Persistence, run >= flatCount && apart(used[begin], used[i]) >= flatTime)
		}
	}
}

// naught makes Naught.
func (o *Outcome) naught(used []*pipeline.Reading, m Medium) {
	if len(used) < naughts {
		return
	}
	zero, degF := m == Air, true
	for _, r := range used {
		zero = zero && r.ValueC == 0
		degF = degF && math.Abs(r.ValueC-naughtDegFC) < 0.05
	}
	o.note(Naught, zero || degF)
}
