// Package extreme is the arithmetic of design values: how often a season's index
// comes, and which index comes once in so many years. It is pure: no I/O, no
// clock.
//
//	seasons' indices -> SampleLMoments -> Fit -> Distribution -> ReturnLevel, ReturnPeriod
//	                                       \-> Resample -> how well it fits, how sure that is
//	seasons with bounds -> MostSevere: the mean of the three warmest of 30, the warmest of 10
//
// Four distributions are fitted, all by L-moments: the generalised extreme value
// (GEV), Gumbel, the normal and Pearson III. Source of the fits: J. R. M. Hosking
// and J. R. Wallis, 1997, "Regional Frequency Analysis", appendix; formulas from
// memory where a function says so, and checked by numbers from elsewhere.
//
// Sign of the GEV's shape: that of Hosking. Shape k > 0 has an upper bound, k < 0
// a heavy upper tail, k = 0 is Gumbel. S. Coles, 2001, "An Introduction to
// Statistical Modeling of Extreme Values", and much software have it the other
// way round: their shape is -k.
//
// A seasonal index is a sum over a whole season and no largest value of many, so
// that no theorem makes it GEV or Gumbel; real freezing indices are often skewed to
// the low side, where Gumbel, whose skew is fixed, gives far too high values of
// 100 years. So all four are fitted and their fit is shown. The mean of the three
// warmest of 30 seasons is, by simulation, about the value of 20 to 25 years
// (normal 21, Gumbel 23), and not of 100.
//
// It promises: no NaN and no infinity leaves a function; the same numbers in
// whatever order give the same result; what is drawn at random depends on the seed
// and nothing else. It refuses, with an error, samples of fewer than MinSample
// values, of one value only, and values that are not finite. A person who asks for
// a probability or return period out of range is at fault, and that panics.
package extreme
