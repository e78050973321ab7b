// Package spectral solves the fast problem of several fast variables by a
// Galerkin method in a tensor basis.
//
// It owns the bases (Fourier on circles and periodic intervals, polynomials
// orthogonal with respect to a law fitted to the drift on lines, half-lines
// and reflecting intervals, spherical harmonics on the sphere), the assembly
// of operators, and a banded LU factorization. It imports
// [epslim/perturb/cell/quadrature] for one-dimensional laws and gonum for
// dense linear algebra.
//
// # Method
//
// Every coordinate (or sphere) has a basis phi_0 = 1, phi_1, ... orthonormal
// in L2(w), w a probability density; the tensor basis is orthonormal for the
// product weight. The Poisson equation L0 Phi = lambda - g is tested with the
// basis. As L0 phi_0 = 0, the first column carries the unknown lambda = <g>
// instead, which makes the matrix square and, for a process with one
// stationary law, regular. The average itself is the functional rho with
// <g> = rho.g obtained from one transposed solve; rho are the coefficients of
// the stationary density divided by w.
//
// At walls the second derivative is integrated by parts, which makes zero
// slope the natural boundary condition (zero flux for the density).
//
// # Weights
//
// On a line the weight of a coordinate is, in this order: the Gaussian of the
// Lyapunov equation, when the drift is linear and the noise constant; the
// stationary law of the coordinate with the others held at their centre, when
// the coordinate has noise of its own; for a position driven by a velocity,
// the Gibbs law of the force at the temperature of that velocity. Orthogonal
// polynomials come from the discretized Stieltjes procedure, so that for a
// gradient or Langevin system the basis is orthogonal for the true law.
//
// Literature: H. Risken, The Fokker-Planck Equation (1989), ch. 10-11 (Fourier
// and Hermite expansions); W. Gautschi, Orthogonal Polynomials (2004), ch. 2
// (Stieltjes procedure); G.H. Golub, J.H. Welsch, Math. Comp. 23 (1969) 221;
// citations from memory.
package spectral
