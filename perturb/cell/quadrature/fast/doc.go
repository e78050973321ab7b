// Package fast is the vocabulary shared by the numerical routes to a fast
// problem: what a problem is, what an operator and a function of the fast
// variables are, and what a solver promises. It owns no numerical method; it
// imports the standard library only.
//
// # The problem
//
// At one fixed point of the slow variables the fast generator is
//
//	L0 = sum_i f_i(y) d_i + 1/2 sum_ij a_ij(y) d_i d_j,   a = sigma sigma^T,
//
// on fast variables y whose domains are circles (period 2 pi), periodic or
// reflecting intervals, half-lines, lines and unit spheres in R^3 (a sphere
// takes three consecutive coordinates and its operators are written in them).
// A [Problem] holds the domains and the coefficients f and a as plain Go
// functions.
//
// # What a solver gives
//
// A [Solver] knows the stationary law rho of L0 through its averages <.>, and
// solves the Poisson equation
//
//	L0 Phi = -(g - <g>),   <Phi> = 0.
//
// A [Function] is a handle to a function of y that lives in a solver. Handles
// are made from coefficients, from operators applied to other handles, from
// linear combinations and from solves, so a whole perturbation expansion can
// be written down; nothing is discretised for good. A number is computed when
// [Solver.Mean] asks for one: the solver then evaluates the whole chain of
// operations at two resolutions, raises both until they agree, and returns
// the value with the difference as its error. An error that stays above the
// tolerance within the budget comes back as [*NotSettled] together with the
// best value.
//
// # The slow derivatives
//
// With a slow parameter x, g_x = dg/dx and the operator L0_x (f_x, a_x in the
// place of f, a), differentiating the Poisson equation gives
//
//	d<g>/dx  = <g_x + L0_x Phi>,
//	L0 Phi_x = -(g_x + L0_x Phi - d<g>/dx),
//
// and Phi_x up to a constant, which is fixed here by <Phi_x> = 0; where the
// caller needs d/dx of the centred corrector it subtracts the constant itself
// (it drops out of every limit equation). In code:
//
//	phi, mean, err := s.Solve(ctx, s.Coefficient(g))
//	rhs := s.Sum(fast.Scaled{1, s.Coefficient(gx)}, fast.Scaled{1, s.Apply(l0x, phi)})
//	phix, dmean, err := s.Solve(ctx, rhs)
//	drift, err := s.Mean(ctx, s.Apply(fast.Multiply(b), phix))   // <b Phi_x>
//
// # Outcomes
//
// What is wrong with a problem is an error value of one of the types in this
// package: [*NotErgodic] (no stationary law, or more than one), [*Divergent]
// (an average that is infinite), [*Undefined] (a coefficient that has no
// finite value somewhere in the domain, with the place), [*NotSettled] (budget
// used up), [*Unsupported] (this route does not apply; another may). No NaN
// is ever returned as a value.
package fast
