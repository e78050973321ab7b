// Package grid solves the fast problem of one or two fast variables by finite
// differences, for coefficients that are not smooth enough for the spectral
// route and as an independent check of the other two.
//
// The backward operator is discretized by central differences at the centres
// of the cells of a tensor grid, with zero slope at walls. A level solves on
// two grids, the second with half the step of the first, and every average is
// extrapolated; the error claimed is the change from one pair to the next. On a line
// the grid is uniform over the window that carries the law, or uniform in the
// logarithm of the distance where the law falls off like a power.
//
// It imports [epslim/perturb/cell/spectral] for the windows and its
// factorizations. Literature: R.J. LeVeque, Finite Difference Methods for
// Ordinary and Partial Differential Equations (2007), ch. 2-3; L.F.
// Richardson, Phil. Trans. A 226 (1927) 299 (extrapolation); from memory.
package grid
