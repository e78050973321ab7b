// Package fastslow computes the stationary density of a full fast-slow system at
// a finite value of the small parameter, without sampling: the fast variables in
// a spectral basis, the slow ones on a periodic or windowed grid.
//
// For slow variables x and fast ones y the stationary Fokker-Planck equation is
// div_x J_x + div_y J_y = 0. With p(x, y) = sum over m of c_m(x) phi_m(y),
// tested with psi_k(y), where <psi_k, phi_m> = delta_km, it becomes
//
//	sum over slow axes of d/dx [ (B + C) c - 1/2 d/dx (X c) ] - F c = 0
//
// with the matrices B = <psi, f_x phi>, C = <psi', A_xy phi>, X = <psi, A_xx phi>
// and F = <psi', f_y phi> + 1/2 <psi”, A_yy phi>, all functions of x. The first test
// function is one, so c_0 is the slow marginal and is conserved exactly. (Mixed
// slow diffusion A_xx' is not supported.)
//
// The slow drift is of the order of 1/eps and changes sign with y. An upwind
// flux would add a diffusion of the order of h/eps and drown the limit. The fluxes
// here are of fourth order with a third-order dissipation, max|f_x| h^3/12 times
// the fourth derivative, which removes the chessboard mode and little else.
//
// The package imports solver/grid and solver/volume.
package fastslow
