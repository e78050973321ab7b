// Package algebra is the exact core: canonical expressions with exact
// rational numbers, named functions and their derivatives, powers with
// rational and symbolic exponents, exponentials, logarithms, trigonometric
// and special functions, declared signs, differentiation, substitution,
// linear algebra and printing.
//
// It knows nothing of stochastics and imports no other package of the
// module.
//
// An expression is a quotient of Laurent polynomials with coefficients in
// Q(i) in indeterminates called kernels. Sines and cosines are Laurent
// polynomials in exp(i u), exponentials and symbolic powers are group-like
// kernels, so that their identities hold by construction; square roots of
// polynomials reduce by r^2 = base and are brought out of denominators.
// Two expressions of the supported class are equal exactly when the
// canonical form of their difference is zero. Dependencies that the form
// does not see (between logarithms or roots of related arguments, say) are
// caught by ZeroTest, which evaluates in extended precision and then
// answers Undecided, never NonZero.
//
// References: K.O. Geddes, S.R. Czapor, G. Labahn, Algorithms for Computer
// Algebra (1992); W.S. Brown, J. ACM 18 (1971) 478; E.H. Bareiss, Math.
// Comp. 22 (1968) 565.
package algebra
