package outlook

import (
	"math/rand/v2"
	"slices"
)

// Score is what outlooks at one lead were worth. Scores in degC.d unless said
// otherwise; all are lower the better.
type Score struct {
	Information Information
	Which       Which
	LeadMonth   int
	Years, N    int // seasons and outlooks scored

	CRPS, FairCRPS float64
	// The climatology is the end indices of seasons known by the same rule of
	// information, as they were, and moved along their own trend to the season's
	// year. Skill, and the scores of the climatology without a name before them,
	// are against the one of them that scores the better here: against the first
	// alone an outlook seems skilful that has only noticed that it gets warmer.
	RawClimatologyCRPS, MovedClimatologyCRPS float64
	ClimatologyCRPS, ClimatologyFairCRPS     float64
	Skill, FairSkill                         Skill

	// Quantile scores of the 10, 50 and 90 %.
	Pinball, ClimatologyPinball Range[float64]

	// Brier is over all thresholds together, without unit.
	Brier, ClimatologyBrier float64
	BrierSkill              Skill
	Reliability             []Bin
}

// Skill is the share by which a score is better than the climatology's: 1 -
// score / climatology's. 0 is no better, 1 perfect. Low and High hold the middle
// 90 % of the skills of samples drawn from the seasons with replacement (B. Efron,
// 1979, "Bootstrap methods: another look at the jackknife", Annals of Statistics
// 7). OK is false where the climatology's score is zero; with fewer than
// LeastYears seasons Low and High are equal to Value, and HasInterval false.
type Skill struct {
	Value, Low, High float64
	OK, HasInterval  bool
}

// Bin is a line of a reliability table: forecasts of nearly the same probability
// and how often it happened.
type Bin struct {
	From, To float64 // from included, to excluded but for 1
	N        int
	Forecast float64 // mean
	Happened float64 // share
}

var binEdges = [...]float64{0, 0.1, 0.3, 0.5, 0.7, 0.9, 1}

// sums are what is needed of one season, or of several.
type sums struct {
	n          int
	crps, fair float64
	pinball    [3]float64
	brier      float64
	climate    [2]climateSums // as they were, moved
}

type climateSums struct {
	crps, fair float64
	pinball    [3]float64
	brier      float64
}

func (s *sums) add(o *sums) {
	s.n += o.n
	s.crps += o.crps
	s.fair += o.fair
	s.brier += o.brier
	for i := range s.pinball {
		s.pinball[i] += o.pinball[i]
	}
	for c := range s.climate {
		s.climate[c].crps += o.climate[c].crps
		s.climate[c].fair += o.climate[c].fair
		s.climate[c].brier += o.climate[c].brier
		for i := range s.pinball {
			s.climate[c].pinball[i] += o.climate[c].pinball[i]
		}
	}
}

// tally gathers the scores of one lead, season by season.
type tally struct {
	thresholds []float64
	seasons    []int
	sums       []sums // of each season
	forecasts  []float64
	happened   []bool
}

var shares = [3]float64{0.1, 0.5, 0.9}

// add scores one outlook: its members' end indices, the climatologies, and what
// the season came to.
func (t *tally) add(season int, members, raw, moved []float64, outcome float64) {
	if n := len(t.seasons); n == 0 || t.seasons[n-1] != season {
		t.seasons, t.sums = append(t.seasons, season), append(t.sums, sums{})
	}
	s := &t.sums[len(t.sums)-1]
	s.n++
	s.crps += CRPS(members, outcome)
	s.fair += FairCRPS(members, outcome)
	for i, p := range shares {
		s.pinball[i] += Pinball(Quantile(members, p), p, outcome)
	}
	for c, climate := range [2][]float64{raw, moved} {
		into := &s.climate[c]
		into.crps += CRPS(climate, outcome)
		into.fair += FairCRPS(climate, outcome)
		for i, p := range shares {
			into.pinball[i] += Pinball(Quantile(climate, p), p, outcome)
		}
	}
	each := float64(len(t.thresholds))
	for _, threshold := range t.thresholds {
		f, did, o := share(members, threshold), outcome >= threshold, 0.0
		if did {
			o = 1
		}
		t.forecasts, t.happened = append(t.forecasts, f), append(t.happened, did)
		s.brier += square(f-o) / each
		s.climate[0].brier += square(share(raw, threshold)-o) / each
		s.climate[1].brier += square(share(moved, threshold)-o) / each
	}
}

// gather makes scores of the tallies, in a fixed order.
func (h *Hindcast) gather(all map[key]*tally, o HindcastOptions) {
	if o.Resamples == 0 {
		o.Resamples = 1000
	}
	for _, info := range []Information{Earlier, Others} {
		for _, which := range []Which{Raw, Moved} {
			for lead := 12; lead >= 0; lead-- {
				k := key{info, which, lead}
				if t := all[k]; t != nil {
					h.scored[k] = len(h.Scores)
					h.Scores = append(h.Scores, t.score(k, o))
				}
			}
		}
	}
}

func (t *tally) score(k key, o HindcastOptions) Score {
	var total sums
	for i := range t.sums {
		total.add(&t.sums[i])
	}
	n := float64(total.n)
	s := Score{
		Information: k.information, Which: k.which, LeadMonth: k.lead, Years: len(t.seasons), N: total.n,
		CRPS: total.crps / n, FairCRPS: total.fair / n, Brier: total.brier / n,
		Pinball: mean(total.pinball, n), Reliability: t.reliability(),
	}
	s.RawClimatologyCRPS, s.MovedClimatologyCRPS = total.climate[0].crps/n, total.climate[1].crps/n
	c := &total.climate[0]
	if total.climate[1].crps < c.crps {
		c = &total.climate[1]
	}
	fair, brier := min(total.climate[0].fair, total.climate[1].fair), min(total.climate[0].brier, total.climate[1].brier)
	s.ClimatologyCRPS, s.ClimatologyFairCRPS, s.ClimatologyBrier, s.ClimatologyPinball = c.crps/n, fair/n, brier/n, mean(c.pinball, n)
	var samples [3][]float64
	if len(t.sums) >= LeastYears {
		samples = t.resampled(o)
	}
	s.Skill = interval(skillOf(total.crps, c.crps), samples[0])
	s.FairSkill = interval(skillOf(total.fair, fair), samples[1])
	s.BrierSkill = interval(skillOf(total.brier, brier), samples[2])
	return s
}

func mean(sum [3]float64, n float64) Range[float64] {
	return Range[float64]{sum[0] / n, sum[1] / n, sum[2] / n}
}

// skill is a skill that may be without meaning.
type skill struct {
	value float64
	ok    bool
}

func skillOf(score, reference float64) skill {
	if reference <= 0 {
		return skill{}
	}
	return skill{1 - score/reference, true}
}

func interval(s skill, samples []float64) Skill {
	out := Skill{Value: s.value, Low: s.value, High: s.value, OK: s.ok}
	if s.ok && len(samples) > 0 {
		sorted(samples)
		out.Low, out.High, out.HasInterval = Quantile(samples, 0.05), Quantile(samples, 0.95), true
	}
	return out
}

// resampled returns the skills, by CRPS, fair CRPS and Brier score, of samples
// of the seasons drawn with replacement. Each sample is held against the
// climatology that scores the better in it.
func (t *tally) resampled(o HindcastOptions) (out [3][]float64) {
	rng := rand.New(rand.NewPCG(o.Seed, uint64(len(t.sums))))
	for range o.Resamples {
		var s sums
		for range t.sums {
			s.add(&t.sums[rng.IntN(len(t.sums))])
		}
		for i, v := range []skill{
			skillOf(s.crps, min(s.climate[0].crps, s.climate[1].crps)),
			skillOf(s.fair, min(s.climate[0].fair, s.climate[1].fair)),
			skillOf(s.brier, min(s.climate[0].brier, s.climate[1].brier)),
		} {
			if v.ok {
				out[i] = append(out[i], v.value)
			}
		}
	}
	return out
}

// reliability returns the table of the lead's forecasts over all thresholds,
// without empty lines.
func (t *tally) reliability() []Bin {
	var bins [len(binEdges) - 1]Bin
	for i := range bins {
		bins[i].From, bins[i].To = binEdges[i], binEdges[i+1]
	}
	for i, f := range t.forecasts {
		at := 0
		for at < len(bins)-1 && f >= bins[at].To {
			at++
		}
		bins[at].N++
		bins[at].Forecast += f
		if t.happened[i] {
			bins[at].Happened++
		}
	}
	out := make([]Bin, 0, len(bins))
	for _, b := range bins {
		if b.N > 0 {
			b.Forecast, b.Happened = b.Forecast/float64(b.N), b.Happened/float64(b.N)
			out = append(out, b)
		}
	}
	return slices.Clip(out)
}
