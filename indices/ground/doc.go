// Package ground turns surface indices into depths of thaw and frost, and into
// the measures of permafrost that follow from a year's indices, by closed
// formulas. It is pure: no I/O, no clock.
//
//	layers as stated -> Build -> Profile -> ThawDepth, FrostDepth, IndexToThaw,
//	                                        IndexToFreeze, Berggren, FreezeBack
//	indices of years ------------------> TTOP, MAGST, FrostNumber
//
// Lengths are in m, temperatures in degC, indices in degC.d and positive for
// both kinds, conductivities in W/(m K), heat capacities and latent heats in J of
// a m3 of ground. A surface index is wanted everywhere: n-factor times air index.
//
// It promises: the conductivity is that of the zone between the surface and the
// front (thawed for thaw, frozen for frost), and the mean of both only in the
// modified Berggren formula; a depth and the index that reaches it are inverse to
// one another; a depth depends on the index that has gathered, not on the way
// there (Stefan); nothing that leaves it is NaN or infinite.
//
// It refuses, with an error: what is no ground, formulas outside the range of
// their data (RangeError), depths below a profile that ends (ErrBelow), and thaw
// of ground without water (ErrDry).
//
// All are formulas for one dimension, without flow of water, for thaw (frost)
// that goes down from the surface once. They are off by some 10 to 30 % where
// properties are well known, and by as much as properties are off where not.
package ground
