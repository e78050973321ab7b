// Package kernel turns arithmetic expressions into flat programs that run over
// blocks of points, and owns the vector kernels those programs are made of.
//
// A Builder collects named inputs, constants and operations; equal
// subexpressions are one node. Builder.Compile lowers a set of outputs to an
// immutable Program: a list of operations on rows of numbers, with rows reused
// as soon as their last reader is done. Program.Eval runs it over rows of any
// length. All scratch memory belongs to the caller (Scratch), so one Program
// may be run by any number of goroutines, each with a Scratch of its own.
//
// # Bits
//
// Every operation is an IEEE 754 basic operation or an explicit fused
// multiply-add, so the portable Go code and the AVX2 and AVX-512 assembly give
// the same bits for +, -, *, /, sqrt, abs, min, max, floor, sin, cos, tan, exp,
// log, integer powers and normal variates. General powers, sinh, cosh, tanh,
// erf, gamma and the Bessel functions are scalar Go on every path: the same
// bits for every path on one machine, while another architecture may differ in
// the last place where the Go compiler fuses operations inside package math.
//
// sin, cos, exp and log are within 2 units in the last place over their whole
// range. sin(-0) is +0.
//
// The package imports the standard library and golang.org/x/sys/cpu only.
package kernel
