// Package check is the examiner. From the client's model and an answer it recomputes feasibility, stationarity,
// complementarity, the gap and the validity of certificates, in arithmetic of its own: it uses nothing of bridges,
// planner or back ends, and nothing of package model but its types.
//
// # Residuals
//
// Residuals are relative to the sizes of the terms that make them up, in the spirit of the error measures of the 7th
// DIMACS Challenge (H. D. Mittelmann 2003, from memory), but constraint by constraint, so that a model of mixed scales
// cannot hide a broken constraint behind a large one:
//
//	primal           distance of the rows from their cone / (1 + size of the largest row's terms)
//	dual             distance of a multiplier from its dual cone / (1 + its size), and of a block's reduced cost from the
//	                 dual of the block's cone / (1 + size of the largest entry's terms)
//	complementarity  |<y, F(x)>| / (1 + |objective| + |bound|)
//	gap              |objective - bound| / (1 + |objective| + |bound|)
//	price            sum of violations times multipliers, and of reduced cost misses times entries / (1 + |objective|):
//	                 what the violations could be worth, which tells points and multipliers that run off to infinity
//
// # Certificates
//
// A certificate of infeasibility is scaled to value 1. If its residual (stationarity and dual cones) is r, no feasible
// point is smaller than about 1/r: an exact certificate has r = 0. A weakly infeasible model has no certificate, but
// things that look like one, with residuals as small as you please, bought by growth: their size times their residual
// stays of order one. A certificate passes when its residual is within tolerance, that product is small, and every
// residual is small against the terms that it is left of: sums must cancel, not only be small, as those of a model written
// in small numbers are. Numbers that are next to nothing beside the certificate's largest may be left out for that.
// Rays of unboundedness are judged likewise.
package check
