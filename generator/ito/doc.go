// Package ito reads model files: the text of a fast-slow stochastic system
// becomes a [System] of exact expressions, or a list of all errors with their
// places.
//
// It owns the meaning of the model language: what is declared, what each
// statement may use, how equations are linear in their differentials, how a
// Stratonovich system is converted, and which errors a model can have. The
// grammar is in package ito/syntax, the errors in ito/diagnostic, the
// expressions in generator/algebra; nothing else of the module is imported.
//
// [Parse] is a pipeline, each pass using what the former established:
//
//  1. syntax: text to statements
//  2. declarations: every name gets its one meaning; options override values
//  3. abbreviations and formulas: expressions become algebra, each once
//  4. domains, equations, claims, initial values, observables
//  5. declared signs against formulas
//  6. assembly of the system and its conversion to Ito form
//  7. equations on the sphere
//
// Beside equations and declarations the language has claims about every part of a
// derivation:
//
//	claim drift x       = EXPR     the Ito drift of the limit
//	claim diffusion x y = EXPR     an entry of A = sigma sigma^T
//	claim noise x 1     = EXPR     an entry of the noise factor sigma, column 1
//	claim density       = EXPR     the stationary density, up to a factor
//	claim corrector x   = EXPR     the corrector of the slow variable x
//	claim mean EXPR     = EXPR     an average over the fast process
//	claim invariant     = EXPR     the density of the fast process, up to a factor
//
// and a statement latex NAME = "..." for the user's own symbol. Results are
// printed in the language of the model; for those that need more than a person
// types it also has at(f, x, a), which is f with x replaced by a, and
// integral(f, s, a, b).
//
// A statement with an error still declares its names, so that one slip is one
// error.
package ito
