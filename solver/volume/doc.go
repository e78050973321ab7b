// Package volume turns the drift and diffusion of an Ito process into a
// finite-volume operator on a grid.
//
// For dX = f dt + sigma dW with A = sigma sigma^T the Fokker-Planck equation is
// dp/dt + div J = 0 with the current J_i = f_i p - 1/2 sum_j d_j(A_ij p). The
// operator M of this package is the net outflow of every cell,
//
//	(M p)_k = sum over the links of cell k of the probability that leaves per unit time,
//
// so that V dp/dt = -M p with the cell volumes V, column sums of M vanish up
// to what absorbing sides take away, and 1^T M = 0 without them. Every link
// joins two cells and carries an exponentially fitted flux, the scheme of
// Scharfetter and Gummel (IEEE Trans. Electron Devices 16 (1969) 64-77) and,
// for Fokker-Planck equations, of Chang and Cooper (J. Comput. Phys. 6 (1970)
// 1-16). With non-negative link coefficients M is a singular M-matrix and the
// stationary density is positive.
//
// The package owns the coefficient interface, the assembly, the products with
// M and its transpose, elimination without subtractions, and the analysis of
// the graph of M. It imports solver/grid.
package volume
