// Package numbers turns the results of a derivation into what the solvers
// run: compiled coefficients, grids, closed-form densities on blocks of
// points, and models for ensembles.
//
// It owns the step from exact expressions to floating-point programs:
// functions are replaced by their formulas and parameters by their values
// here and nowhere else. It imports cmd/epslim/derivation, the solver packages
// and generator/algebra.
package numbers
