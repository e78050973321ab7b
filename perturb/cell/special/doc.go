// Package special holds the special functions of a real argument that the
// printed results need and gonum lacks: modified Bessel functions of the first
// kind, incomplete gamma functions that are not regularized, the exponential
// integral and the Langevin function. It imports gonum's mathext and the
// standard library.
//
// Formulas: M. Abramowitz, I.A. Stegun, Handbook of Mathematical Functions
// (1964), ch. 5, 6 and 9; the recurrence downwards is J.C.P. Miller's (ibid.,
// 9.12, example 1). Arguments outside the domain give NaN, as in package math.
package special
