// Package density answers questions about the probability density of a
// diffusion process on a grid: the stationary density with its current and
// entropy production, relaxation in time, exit times and splitting
// probabilities, and how a numerical density compares with a formula.
//
// It imports solver/grid, solver/volume and solver/multigrid. Coefficients
// come in through volume.Coefficients.
package density
