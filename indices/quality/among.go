package quality

import "math"

// This file has the tests that compare a day's values with one another and with
// those of the days around it.

// consistency makes Consistency.
func (s *sheet) consistency(out []Outcome) {
	mean, top, low := &s.elements[meanOf], &s.elements[maxOf], &s.elements[minOf]
	above := func(a, b *element, i int) {
		if a.has[i] && b.has[i] {
			out[i].note(Consistency, a.c[i] > b.c[i]+toleranceC)
		}
	}
	for i := range out {
		above(low, top, i)
		above(mean, top, i)
		above(low, mean, i)
	}
}

// steps makes Step and Spike. The limit of a change is that of the month of its
// later day.
func (s *sheet) steps(e *element, out []Outcome) {
	change := func(i int) (float64, bool) {
		if !s.follows(e, i) {
			return 0, false
		}
		return e.c[i] - e.c[i-1], true
	}
	limits, spikes := [12]float64{}, [12]float64{}
	for m, v := range s.byMonth(change) {
		limits[m], spikes[m] = stepC, stepC
		if _, sd, ok := biweight(sorted(v)); ok {
			limits[m] = max(leastStepC, stepTimes*sd)
			spikes[m] = spikeShare * limits[m]
		}
	}
	spiked := false // the day before
	for i := range out {
		here, ok := change(i)
		next, okNext := change(i + 1)
		if ok && !spiked {
			out[i].note(Step, math.Abs(here) >= limits[s.month[i]])
		}
		spiked = false
		if ok && okNext {
			off := min(here, -next)
			if here < 0 {
				off = min(-here, next)
			}
			spiked = off >= spikes[s.month[i]]
			out[i].note(Spike, spiked)
		}
	}
}

// streaks makes Streak.
func (s *sheet) streaks(e *element, m Medium, out []Outcome) {
	if m == Soil {
		return
	}
	begin := 0
	for i := range out {
		if !s.follows(e, i) || e.c[i] != e.c[begin] {
			begin = i
		}
		if !e.has[i] || m == Surface && math.Abs(e.c[i]) <= curtainC {
			continue
		}
		n := i - begin + 1
		out[i].note(Streak, n >= streakDays)
		if n == streakDays {
			for j := begin; j < i; j++ {
				out[j].note(Streak, true)
			}
		}
	}
}

// within makes the tests that look at maximum and minimum together.
func (s *sheet) within(m Medium, out []Outcome) {
	top, low := &s.elements[maxOf], &s.elements[minOf]
	for i := range out {
		if top.has[i] && low.has[i] {
			a, b := top.c[i], low.c[i]
			zero := m == Air && a == 0 && b == 0
			degF := math.Abs(a-naughtDegFC) < 0.05 && math.Abs(b-naughtDegFC) < 0.05
			out[i].note(Naught, zero || degF)
			if m == Air || m == Surface && !(math.Abs(a) <= curtainC && math.Abs(b) <= curtainC) {
				out[i].note(Persistence, math.Abs(a-b) < flatC-1e-9) // 1e-9: tenths are not exact in binary
			}
		}
		if m == Surface {
			continue
		}
		if warmest, ok := s.around(low, i, func(a, b float64) bool { return a > b }); ok && top.has[i] {
			out[i].note(LaggedRange, top.c[i] >= warmest+laggedC)
		}
		if coldest, ok := s.around(top, i, func(a, b float64) bool { return a < b }); ok && low.has[i] {
			out[i].note(LaggedRange, low.c[i] <= coldest-laggedC)
		}
	}
}

// around returns the best value of the day before, the day and the day after.
func (s *sheet) around(e *element, i int, better func(a, b float64) bool) (best float64, ok bool) {
	for j := max(i-1, 0); j <= min(i+1, len(s.days)-1); j++ {
		if apart := s.days[j] - s.days[i]; e.has[j] && -1 <= apart && apart <= 1 && (!ok || better(e.c[j], best)) {
			best, ok = e.c[j], true
		}
	}
	return best, ok
}
