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
//  5. checks that need the whole: missing equations, declared signs against
//     formulas, equations on the sphere
//  6. conversion to Ito form
//
// A statement with an error still declares its names, so that one slip is one
// error.
package ito
