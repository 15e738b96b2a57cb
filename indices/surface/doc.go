// Package surface turns air indices into surface indices with n-factors. It is
// pure: no I/O, no clock.
//
//	air season + dated n-factors -> Applied -> surface index, low, central, high
//	measured surface and air indices of seasons -> Measured -> n, its mean and spread
//	Table: published n-factors to choose from
//
// The n-factor is the surface index over the air index of the same season: n_t
// of thawing indices, n_f of freezing indices (US Army TM 5-852-4 / AFM 88-19
// ch. 4, 1983). n_t belongs to thaw and n_f to freeze, and neither is ever
// applied to the other. It is a figure of a whole season: snow makes n_f differ
// by more than 0.2 between years, and n_t is not constant through a summer. On
// part of a season it is an approximation, which is said (PartOfSeason).
// Surfaces that are heated, shaded or ventilated need an n of their own.
//
// It promises: the surface index to date never falls, does not jump where an n
// gives way to another, and rises with the air index and with n.
package surface
