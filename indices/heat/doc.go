// Package heat conducts heat down through layered ground that thaws and freezes,
// from a series of surface temperatures, in one dimension. It is pure: no I/O, no
// clock.
//
//	layers, Grid, Bottom -> New -> Column -> Run (surface temperatures) -> Track
//	                                 SpinUp (one year, over and over)
//
// It is the finer answer beside the closed formulas of package ground: it knows of
// the heat that warms the ground, of the winter before, and of what season follows
// what. It knows nothing of flowing water, snow, or water that stays unfrozen.
//
// Method: conservation of enthalpy in cells (finite volumes), explicit in time. A
// cell's enthalpy H in J/m3, 0 for frozen ground at 0 degC, gives its temperature:
// H/Cf below 0, 0 from 0 to L, (H - L)/Ct above. The front is sharp and lies within
// the one cell that is partly thawed, at the share of H/L, and what conducts to it
// from either side is the ground between: so the front moves smoothly through a
// cell and not by leaps (compare V. R. Voller and M. Cross, 1981, "Accurate
// solutions of moving boundary problems using the enthalpy method", International
// Journal of Heat and Mass Transfer 24, who correct for the leaps). With Range the
// latent heat is spread over so many K below 0 degC, and a cell conducts by its
// share of thawed ground.
//
// The time step is the longest that keeps the scheme stable, whatever the state
// of the cells, chosen by New. Against Neumann's exact solution the depth of the
// front is within 1 % for cells of 0.05 m, in truth within 0.05 %, and the error falls
// to less than a half where cells are halved (TestNeumann). Each value of a series is
// held for the whole of its time.
//
// It promises: heat is conserved to rounding (TestEnergyCloses); no temperature
// leaves the range of those that were put in; nothing that leaves it is NaN.
package heat
