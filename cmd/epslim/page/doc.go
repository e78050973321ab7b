// Package page writes one self-contained HTML page: text, formulas in MathML with their TeX, tables, code
// and figures inlined as SVG. The page needs no network and no script to be read; a small
// script adds buttons that copy the TeX of a formula. It is light or dark as the reader prefers, prints, and
// never scrolls sideways as a whole: wide formulas, tables and code scroll in boxes of their own.
//
// A [Document] is a tree of blocks; [Document.HTML] checks and writes it. All text is escaped. The two places
// where markup comes in from outside, [MathML] and the SVG of a [Figure], are parsed, and what could run
// or load something is refused. The same document gives the same bytes.
//
// The functions of mathml.go build formulas with what browsers need to know and what is easily got wrong: see [Minus],
// [Partial], [ScriptL], [Differential] and [Rows].
//
// The package imports the standard library only.
package page
