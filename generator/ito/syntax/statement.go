package syntax

// Statement is one statement of a model file: *Title, *Small, *Calculus,
// *Variable, *Param, *Function, *Let, *Equation, *Claim, *Assign or *Latex.
type Statement interface {
	// Where returns the place of the statement.
	Where() Position
	// Source returns the statement as it was typed, without comments after it.
	Source() string
	// Bad tells whether an error was reported in the statement. What could be
	// read is there nevertheless, so that one slip does not make the names of
	// the statement unknown.
	Bad() bool
	base() *common
}

// common is what every statement has.
type common struct {
	Span
	text string
	bad  bool
}

func (c *common) Source() string { return c.text }
func (c *common) Bad() bool      { return c.bad }
func (c *common) base() *common  { return c }

// Title is `title "..."`.
type Title struct {
	common
	Text string
}

// Small is `small NAME`.
type Small struct {
	common
	Name *Name
}

// Calculus is `calculus ito` or `calculus stratonovich`.
type Calculus struct {
	common
	Name *Name
}

// Variable is `slow NAME DOMAIN`, `fast NAME DOMAIN` or
// `fast (a, b, c) on sphere`.
type Variable struct {
	common
	Slow   bool
	Names  []*Name // one, or three for a sphere
	Domain Domain
}

// DomainKind is the shape of a variable's domain.
type DomainKind uint8

// The domains.
const (
	Line       DomainKind = iota // the real line
	HalfLine                     // (0, inf)
	Circle                       // angles modulo 2*pi
	Reflecting                   // an interval with reflecting ends
	Periodic                     // an interval with its ends identified
	Absorbing                    // an interval with absorbing ends
	Sphere                       // a component of a unit vector in R^3
)

func (k DomainKind) String() string {
	return [...]string{"line", "halfline", "circle", "reflecting", "periodic", "absorbing", "sphere"}[k]
}

// Interval tells whether a domain of this kind is a finite interval [A, B].
func (k DomainKind) Interval() bool { return k == Reflecting || k == Periodic || k == Absorbing }

// Domain is where a variable lives.
type Domain struct {
	Kind       DomainKind
	At         Position // of the word that names it
	Interval   *Bounds  // for the intervals
	Window     *Bounds  // the box that grids and plots use; nil when absent
	Understood bool     // false when the words could not be read; then it is a line
}

// Bounds is `[A, B]`.
type Bounds struct {
	Span
	A, B Expr
}

// Param is `param NAME [= NUMBER] [ASSUMPTION]`.
type Param struct {
	common
	Name       *Name
	Value      Expr  // nil when absent
	Assumption *Name // nil when absent
}

// Function is `function NAME(ARGS) [= EXPR] [ASSUMPTION]`.
type Function struct {
	common
	Name       *Name
	Args       []*Name
	Body       Expr  // nil when absent
	Assumption *Name // nil when absent
}

// Let is `let NAME = EXPR`.
type Let struct {
	common
	Name  *Name
	Value Expr
}

// Equation is `dNAME = ...`.
type Equation struct {
	common
	Name     *Name  // with the d
	Variable string // without it
	Right    Expr
}

// ClaimKind tells what a claim is about.
type ClaimKind uint8

// The claims.
const (
	ClaimDrift     ClaimKind = iota // claim drift NAME = EXPR
	ClaimDiffusion                  // claim diffusion NAME NAME = EXPR: an entry of sigma sigma^T
	ClaimDensity                    // claim density = EXPR
	ClaimMean                       // claim mean EXPR = EXPR: an average over the fast process
	ClaimInvariant                  // claim invariant = EXPR: the density of the fast process
	ClaimCorrector                  // claim corrector NAME = EXPR
	ClaimNoise                      // claim noise NAME k = EXPR: an entry of the noise factor
)

func (k ClaimKind) String() string { return claimWords[k] }

var claimWords = [...]string{"drift", "diffusion", "density", "mean", "invariant", "corrector", "noise"}

// Claim is a hand calculation.
type Claim struct {
	common
	Kind  ClaimKind
	Names []*Name // one for drift, corrector and noise, two for diffusion
	Index int     // for noise: the column, from 1
	Left  Expr    // for mean
	Right Expr
}

// Assign is `start NAME = EXPR` or `observe NAME = EXPR`.
type Assign struct {
	common
	Observe bool
	Name    *Name
	Value   Expr
}

// Latex is `latex NAME = "..."`.
type Latex struct {
	common
	Name *Name
	Text string
}

// The words of the language.
var keywords = []string{"title", "small", "calculus", "slow", "fast", "param", "function", "let", "claim", "start", "observe", "latex"}

func isKeyword(s string) bool {
	for _, k := range keywords {
		if k == s {
			return true
		}
	}
	return false
}

var assumptionWords = []string{"real", "positive", "nonnegative", "negative", "integer"}

func isAssumption(s string) bool {
	for _, k := range assumptionWords {
		if k == s {
			return true
		}
	}
	return false
}
