// Package quadrature solves the fast problem of one fast variable by the
// integrating factor, to near machine precision.
//
// It owns the classification of the ends of the domain (Feller's test), the
// adaptive mesh, the stationary density and the corrector of one-dimensional
// diffusions, and the moment problem of a one-dimensional law. It imports
// [epslim/perturb/cell/quadrature/fast] for the statement of the problem, and
// the standard library.
//
// # Method
//
// With L0 = f d + 1/2 a d^2 let W(y) be an antiderivative of 2 f/a. The speed
// density is m = (2/a) exp(W) and the scale density s = exp(-W), so that
// L0 = (1/m) d ((1/s) d). On an interval, half-line or line the stationary
// law is rho = m/int m, which exists exactly when m is integrable at both
// ends, and the corrector has
//
//	Phi'(y) = -2/(a rho) int_{left}^{y} (g - <g>) rho = 2/(a rho) int_y^{right} (g - <g>) rho.
//
// The first form is used left of the median of rho and the second right of
// it, so neither cancels. On a circle, with W growing by T over the period l,
//
//	rho(y) ~ (1/a) int_y^{y+l} exp(W(y) - W(z)) dz
//
// whatever the sign of T (written for T >= 0; mirrored otherwise), which holds
// with and without a stationary current, and Phi' is the periodic solution of
// the first-order equation with integral zero.
//
// Everything is represented on panels by values at Chebyshev nodes. Panels
// are linear in y in the middle and linear in the logarithm of the distance
// towards infinity and towards singular ends, so powers of the distance are
// exponentials there. Panels are bisected until 2 f/a, log a and every
// coefficient in use are resolved and until the logarithm of the density
// varies by a few units only; densities are handled by their logarithm, so
// narrow wells and large Peclet numbers cost panels but no accuracy. What is
// left beyond the last panel is a power law whose exponent is read off; where
// that exponent says the integral is infinite, the average is a
// [fast.Divergent] outcome.
//
// Literature: W. Feller, Ann. Math. 55 (1952) 468 (boundaries); S. Karlin,
// H.M. Taylor, A Second Course in Stochastic Processes (1981), ch. 15 (speed
// and scale); H. Risken, The Fokker-Planck Equation (1989), ch. 5 and 11;
// G.A. Pavliotis, A.M. Stuart, Multiscale Methods (2008), ch. 11 and 13;
// citations from memory.
package quadrature
