package diagnostic

// Code names a kind of error. Codes are stable: messages may be reworded, codes
// may not.
type Code string

// The kinds of errors; [Kinds] explains each with an example.
const (
	// The text as a whole.
	TooLarge       Code = "too-large"
	LineTooLong    Code = "line-too-long"
	TooMany        Code = "too-many-statements"
	NotUTF8        Code = "not-utf8"
	BadCharacter   Code = "bad-character"
	Empty          Code = "empty"
	StatementLong  Code = "statement-too-long"
	NestedTooDeep  Code = "nested-too-deep"
	Bracket        Code = "bracket"
	OpenString     Code = "open-string"
	BadNumber      Code = "bad-number"
	Syntax         Code = "syntax"
	UnknownKeyword Code = "unknown-statement"
	UnknownWord    Code = "unknown-word"

	// Declarations.
	Duplicate       Code = "duplicate"
	NameClash       Code = "name-clash"
	UndeclaredName  Code = "undeclared-name"
	NoVariable      Code = "no-variable"
	MissingEquation Code = "missing-equation"
	WrongVariable   Code = "wrong-variable"
	WrongArgument   Code = "wrong-argument"
	AbsorbingFast   Code = "absorbing-fast"
	DomainBounds    Code = "domain-bounds"
	NotConstant     Code = "not-constant"
	BrokenSign      Code = "broken-sign"
	Cycle           Code = "cycle"

	// Expressions.
	NoiseAsNumber     Code = "noise-as-number"
	NotANoise         Code = "not-a-noise"
	DifferentialPlace Code = "differential-inside"
	DifferentialPower Code = "differential-product"
	NoDifferential    Code = "no-differential"
	NotAFunction      Code = "not-a-function"
	ArgumentCount     Code = "argument-count"
	BadDerivative     Code = "bad-derivative"
	DivisionByZero    Code = "division-by-zero"
	NotReal           Code = "not-real"
	TooComplex        Code = "too-complex"
	SmallParameter    Code = "small-parameter"

	// The system.
	LeavesSphere Code = "leaves-sphere"
	BadClaim     Code = "bad-claim"

	// Options and points.
	BadOverride  Code = "bad-override"
	BadPoint     Code = "bad-point"
	MissingValue Code = "missing-value"
)

// Kind explains a kind of error.
type Kind struct {
	Code     Code
	Sentence string // the rule that was broken
	Example  string // the smallest text that breaks it
	Where    Where  // what Example is
}

// Where tells how the example of a [Kind] is to be read.
type Where uint8

const (
	InModel    Where = iota // statements added to a correct model of slow x, fast y
	WholeModel              // a whole model file
	SetOption               // the text of a --set option for such a model
	AtOption                // the text of an --at option for such a model
	AskNumbers              // statements added to such a model, of which numbers are then asked
	OverLimit               // described, since it is too long to print
)

// Kinds returns the table of all kinds of errors.
func Kinds() []Kind {
	return []Kind{
		{TooLarge, "a model file has at most a megabyte", "a file of ten megabytes", OverLimit},
		{LineTooLong, "a line has at most 20000 characters", "a line of 20001 characters", OverLimit},
		{TooMany, "a model has at most 2000 statements", "2001 statements", OverLimit},
		{StatementLong, "an expression has at most 6000 names, numbers and signs", "1+1+1+... with 6001 signs", OverLimit},
		{NestedTooDeep, "brackets, signs and powers nest at most 100 deep", "101 opening parentheses", OverLimit},
		{NotUTF8, "a model file is UTF-8 text", "let q = \xff", InModel},
		{BadCharacter, "only letters, digits, + - * / ^ ( ) [ ] , = \" # and \\ have a meaning", "let q = x ; y", InModel},
		{Empty, "a model file holds statements", "# nothing but a remark", WholeModel},
		{Bracket, "brackets are closed, in order, by their like", "let q = (x + 1", InModel},
		{OpenString, "a quoted text ends on its line", `title "Crawlers`, InModel},
		{BadNumber, "a number is digits with an optional point and exponent", "let q = 2x", InModel},
		{Syntax, "a statement follows the grammar of its keyword", "let q = x +", InModel},
		{UnknownKeyword, "a line starts with a statement", "parm D = 1", InModel},
		{UnknownWord, "domains, walls, assumptions and claims are given by fixed words", "param D = 1 positve", InModel},
		{Duplicate, "a name is declared once and an equation given once", "let q = 1\nlet q = 2", InModel},
		{NameClash, "a name must not be a differential, a standard function, pi or the small parameter", "param dt = 1", InModel},
		{UndeclaredName, "a name is declared before numbers can be made of it", "let q = z", InModel},
		{NoVariable, "a model has slow and fast variables", "slow x\ndx = 1 dt", WholeModel},
		{MissingEquation, "every variable has an equation", "slow z on line", InModel},
		{WrongVariable, "some statements are for slow variables only", "claim drift y = 1", InModel},
		{WrongArgument, "a function is a function of distinct slow variables", "function f(y)", InModel},
		{AbsorbingFast, "only a slow variable can be absorbed", "fast z in [0, 1] absorbing\ndz = sqrt(2)/eps dW7", InModel},
		{DomainBounds, "an interval [A, B] has A < B", "slow z in [1, 0] periodic\ndz = 1 dt", InModel},
		{NotConstant, "bounds, values and initial values are made of numbers and parameters", "start x = x", InModel},
		{BrokenSign, "a value agrees with the declared assumption", "param D = -1 positive", InModel},
		{Cycle, "abbreviations and functions are not defined by themselves", "let p = q\nlet q = p", InModel},
		{NoiseAsNumber, "a Wiener increment stands in an equation and nowhere else", "let q = 2*dW1", InModel},
		{NotANoise, "the right-hand side of an equation holds dt and Wiener increments", "slow z on line\ndz = 1 dx", InModel},
		{DifferentialPlace, "a differential is not the argument of a function, an exponent or a divisor", "slow z on line\ndz = sin(dt)", InModel},
		{DifferentialPower, "an equation is linear in the differentials", "slow z on line\ndz = dW1*dW2", InModel},
		{NoDifferential, "each term of an equation has its differential", "slow z on line\ndz = x + 1 dt", InModel},
		{NotAFunction, "only functions take arguments", "let q = x(2)", InModel},
		{ArgumentCount, "a function takes its number of arguments", "let q = sin(x, y)", InModel},
		{BadDerivative, "diff(f, x) differentiates in variables and parameters, a whole number of times", "let q = diff(x^2, 2)", InModel},
		{DivisionByZero, "a divisor is not identically zero", "let q = 1/(x - x)", InModel},
		{NotReal, "an expression has a real value", "let q = sqrt(-1)", InModel},
		{TooComplex, "a power or product does not explode when it is worked out", "let q = (x + y)^100000", InModel},
		{SmallParameter, "the small parameter appears in integer and half-integer powers, in coefficients only", "slow z on line\ndz = sin(eps) dt", InModel},
		{LeavesSphere, "equations on the unit sphere keep a^2 + b^2 + c^2 = 1", "fast (a, b, c) on sphere\nda = 1 dt\ndb = 0 dt\ndc = 0 dt", InModel},
		{BadClaim, "a claim is about the limit: slow variables for drift, diffusion and density", "claim drift x = y", InModel},
		{BadOverride, "an option sets a declared parameter or function", "E=1", SetOption},
		{BadPoint, "a point gives every slow variable a value in its domain", "y=1", AtOption},
		{MissingValue, "numbers need a value for each parameter and a formula for each function", "param E", AskNumbers},
	}
}
