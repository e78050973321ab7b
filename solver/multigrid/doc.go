// Package multigrid solves the linear systems of the finite-volume operator of
// solver/volume: the singular stationary problem M p = 0 and the regular ones
// (M + shift V) x = b and (M^T + shift V) x = b.
//
// A geometric multigrid cycle, kept in single precision, preconditions
// BiCGStab in double precision. Every coarse operator is again a finite-volume
// operator, made of the links of the finer one, stretched and added up, or,
// for diffusion matrices that are not diagonal, discretised anew; so it is an
// M-matrix with zero column sums like the fine one. Rows are scaled to unit diagonal, residuals are
// restricted by summation (which keeps their total, the consistency condition
// of the singular problem), corrections are interpolated linearly, and the
// coarsest operator is eliminated without subtractions. Compare Trottenberg,
// Oosterlee and Schuller, Multigrid (Academic Press 2001), chapters 2, 5 and 7.
//
// The package imports solver/grid and solver/volume.
package multigrid
