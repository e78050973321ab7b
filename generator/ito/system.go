package ito

import (
	"math/big"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// The error types of the reader.
type (
	// ErrorList is all errors of a file; see [diagnostic.List].
	ErrorList = diagnostic.List
	// Diagnostic is one error.
	Diagnostic = diagnostic.Diagnostic
	// Position is a place in the model file; lines and columns start at 1.
	Position = diagnostic.Position
	// Limits bounds what is read.
	Limits = syntax.Limits
)

// ClaimKind tells what a claim is about.
type ClaimKind = syntax.ClaimKind

// The kinds of claims.
const (
	ClaimDrift     = syntax.ClaimDrift
	ClaimDiffusion = syntax.ClaimDiffusion
	ClaimDensity   = syntax.ClaimDensity
	ClaimMean      = syntax.ClaimMean
	ClaimInvariant = syntax.ClaimInvariant
	ClaimCorrector = syntax.ClaimCorrector
	ClaimNoise     = syntax.ClaimNoise
)

// DomainKind is the shape of a variable's domain.
type DomainKind = syntax.DomainKind

// The domains.
const (
	Line       = syntax.Line
	HalfLine   = syntax.HalfLine
	Circle     = syntax.Circle
	Reflecting = syntax.Reflecting
	Periodic   = syntax.Periodic
	Absorbing  = syntax.Absorbing
	OnSphere   = syntax.Sphere
)

// Calculus tells how the noise terms of a model were typed.
type Calculus uint8

// The two readings of a stochastic integral.
const (
	Ito Calculus = iota
	Stratonovich
)

func (c Calculus) String() string {
	if c == Stratonovich {
		return "stratonovich"
	}
	return "ito"
}

// System is a fast-slow system of stochastic differential equations
//
//	dX_i = Drift_i dt + sum_k Noise_ik dW_k
//
// in the Ito sense, with everything else the model file says. All expressions
// belong to Ring.
type System struct {
	Name   string // name of the file, for messages
	Title  string
	Source string   // text of the file, byte for byte
	SHA256 string   // of Source, in hexadecimal
	Set    []string // the options that values were set with

	Small    string // the name of the small parameter
	Latex    string // the user's TeX for it; may be empty
	Calculus Calculus
	Ring     *algebra.Ring

	Slow, Fast []*Variable // in the order of declaration
	Spheres    []Sphere    // fast variables that are components of unit vectors

	Parameters []*Parameter
	Functions  []*Function
	Lets       []*Let

	Noises    []string // Wiener processes in the order of first appearance: W1 for dW1
	Equations []*Equation

	Claims      []*Claim
	Starts      []*Start
	Observables []*Observable

	// MustBePositive holds the lengths of intervals whose sign the declared
	// assumptions do not settle: they are conditions of every result.
	MustBePositive []algebra.Expr

	// Warnings are remarks that do not stop the reading: a formula that breaks its
	// declared sign somewhere outside the box that matters.
	Warnings ErrorList

	scope *reader // the names, for reading points later
}

// Variable is a slow or fast variable.
type Variable struct {
	Name   string
	Slow   bool
	Index  int // in System.Slow or System.Fast
	Domain Domain
	Expr   algebra.Expr // the symbol
	Latex  string       // the user's own TeX; may be empty
	Position
}

// Domain is where a variable lives. A and B are the ends of an interval, WindowA
// and WindowB those of the box that grids and plots use for an unbounded one; an
// end that is absent is not Valid. They hold numbers and parameters only.
type Domain struct {
	Kind             DomainKind
	A, B             algebra.Expr
	WindowA, WindowB algebra.Expr

	interval, window *syntax.Bounds
}

// Sphere is a group of three fast variables that are the components of a unit
// vector.
type Sphere struct {
	Names [3]string
}

// Parameter is a constant of the model. It stays a symbol in the derivation.
type Parameter struct {
	Name    string
	Value   *big.Rat // nil when the model gives none
	Sign    algebra.Sign
	Integer bool
	Expr    algebra.Expr
	Latex   string
	Position
}

// Function is a named function of slow variables. It stays a name in the
// derivation; its formula is for numbers.
type Function struct {
	Name  string
	Args  []string
	Body  algebra.Expr // not Valid when the function is arbitrary
	Sign  algebra.Sign
	Expr  algebra.Expr // the function at its own arguments
	Latex string
	Position

	Integer bool
}

// Let is an abbreviation; its value has been put in everywhere.
type Let struct {
	Name  string
	Value algebra.Expr
	Latex string
	Position
}

// Equation is the stochastic differential equation of one variable.
type Equation struct {
	Variable string
	Slow     bool
	Drift    algebra.Expr   // Ito
	Noise    []algebra.Expr // one entry for each of System.Noises
	// For a Stratonovich model, the drift as typed and the terms that were
	// added to it; Drift = Typed + sum of Corrections. For an Ito model Typed is
	// Drift and there are no Corrections.
	Typed       algebra.Expr
	Corrections []Correction
	Text        string // as typed
	Position
}

// Correction is one term of the conversion from Stratonovich to Ito form: for
// the equation of X_i, noise W_k and variable X_j,
//
//	1/2 Noise_jk diff(Noise_ik, X_j).
//
// Source: C. Gardiner, Handbook of Stochastic Methods, section 4.3.6 (from
// memory); B. Oksendal, Stochastic Differential Equations, chapter 6 (from memory).
type Correction struct {
	Noise    string
	Variable string
	Term     algebra.Expr
}

// Claim is a hand calculation to be proven or refuted.
type Claim struct {
	Kind  ClaimKind
	Names []string     // slow variables; one for drift, corrector and noise, two for diffusion
	Index int          // for noise: the column, from 1
	Left  algebra.Expr // for mean: the expression that is averaged
	Right algebra.Expr
	Text  string // as typed
	Position
}

// Label returns the claim without its right-hand side, such as "drift x".
func (c *Claim) Label() string {
	label := c.Kind.String()
	for _, n := range c.Names {
		label += " " + n
	}
	switch c.Kind {
	case ClaimNoise:
		label += " " + itoa(c.Index)
	case ClaimMean:
		label += " " + c.Left.String()
	}
	return label
}

// Start is the initial value of a variable, made of numbers and parameters.
type Start struct {
	Variable string
	Value    algebra.Expr
	Position
}

// Observable is a named function of the slow variables.
type Observable struct {
	Name  string
	Value algebra.Expr
	Position
}

// Variable returns the variable of that name, or nil.
func (s *System) Variable(name string) *Variable {
	for _, list := range [][]*Variable{s.Slow, s.Fast} {
		for _, v := range list {
			if v.Name == name {
				return v
			}
		}
	}
	return nil
}

// Parameter returns the parameter of that name, or nil.
func (s *System) Parameter(name string) *Parameter {
	for _, p := range s.Parameters {
		if p.Name == name {
			return p
		}
	}
	return nil
}

// Function returns the function of that name, or nil.
func (s *System) Function(name string) *Function {
	for _, f := range s.Functions {
		if f.Name == name {
			return f
		}
	}
	return nil
}

// Equation returns the equation of the variable of that name, or nil.
func (s *System) Equation(name string) *Equation {
	for _, e := range s.Equations {
		if e.Variable == name {
			return e
		}
	}
	return nil
}

// Definitions returns the formulas of all functions that have one, for
// algebra's SubsFunc.
func (s *System) Definitions() map[string]algebra.FuncDef {
	defs := map[string]algebra.FuncDef{}
	for _, f := range s.Functions {
		if f.Body.Valid() {
			defs[f.Name] = algebra.FuncDef{Args: f.Args, Body: f.Body}
		}
	}
	return defs
}

// Values returns the values of all parameters that have one, for algebra's Subs.
func (s *System) Values() map[string]algebra.Expr {
	values := map[string]algebra.Expr{}
	for _, p := range s.Parameters {
		if p.Value != nil {
			values[p.Name] = s.Ring.Rat(p.Value)
		}
	}
	return values
}
