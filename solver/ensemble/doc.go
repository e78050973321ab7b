// Package ensemble simulates many independent paths of a system of Ito
// equations and owns everything that is statistical about it: streams of random
// numbers, time-stepping schemes, boundaries, moments, histograms, rates and
// their uncertainties.
//
// A Model is numeric: drift and noise as nodes of a kernel.Builder, with numbers
// for all parameters. The full fast-slow system at one value of the scale
// parameter and its limit are both Models.
//
// # Reproducibility
//
// Path k of a run is a function of the seed and of k alone: paths are grouped in
// blocks of kernel.BlockSize, block B draws from the stream (seed, B), and a
// block that is needed in part is computed in full. Sums over paths are exact
// (Sum keeps the whole of every addend), hence independent of the order of
// addition, so any number of workers, any slicing of the range of paths and any
// interruption with a later resumption give the same bytes. No statistic needs
// memory that grows with the number of paths.
//
// The package imports solver/kernel and gonum.
package ensemble
