// Package multigrid solves the linear systems of the finite-volume operator of
// solver/volume: the singular stationary problem M p = 0 and the regular ones
// (M + shift V) x = b and (M^T + shift V) x = b.
//
// A geometric multigrid cycle, kept in single precision, preconditions
// BiCGStab in double precision. Every coarse operator is discretised anew from
// the coefficients on the merged grid, so it is an M-matrix with zero column
// sums like the fine one. Unknowns are the ratios u = p/q to a reference
// density q that every level computes for itself on the way up from the
// coarsest grid (a full multigrid start); rows are scaled to unit diagonal. In
// these variables a density that spans hundreds of decades is a vector of
// ones, and single precision is enough for the corrections. Compare Trottenberg,
// Oosterlee and Schuller, Multigrid (Academic Press 2001), sections 2.6, 5.1
// and 7.8, and for the scaling by the current iterate Horton and Leutenegger,
// Proc. SIGMETRICS 1994, 191-200.
//
// The package imports solver/grid and solver/volume.
package multigrid
