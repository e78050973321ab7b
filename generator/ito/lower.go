package ito

import (
	"errors"
	"math/big"
	"slices"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// value is an expression of the algebra with what the reader keeps an eye on.
type value struct {
	expr  algebra.Expr
	bits  int   // bound on the size of the numbers in it
	depth int   // how deep functions and roots are nested in it
	grade grade // how it depends on the small parameter

	fraction bool     // it was made by a division by a sum
	roots    []string // the roots it is made of, sorted, as typed
	nested   bool     // one of them contains roots
}

// The arithmetic of a model is bounded: a short text such as (x+y)^100000
// must not exhaust time or memory.
const (
	maxTerms = 20_000    // terms of one result
	maxPair  = 40_000    // product of the sizes of two operands
	maxBits  = 100_000   // of the numbers in a result
	maxWork  = 5_000_000 // sum of the products of sizes over the file
	maxDepth = 10        // of functions and roots within each other, through abbreviations too
)

// lowering turns expressions of one text into algebra. Its methods report errors
// and then return false; an expression that contains one is left alone, so that
// nothing is reported twice.
type lowering struct {
	r   *reader
	src *syntax.Source
	// names tells whether declared names may be used; a point in an option is
	// made of numbers alone.
	closed bool
	found  map[syntax.Expr]*syntax.Differential // see differentialIn
	bound  map[string]int                       // names that are being integrated over
}

func (l *lowering) fail(at Position, code diagnostic.Code, message string) *Diagnostic {
	return l.r.failIn(l.src, at, code, message)
}

// lower returns the value of an expression without differentials.
func (l *lowering) lower(e syntax.Expr) (value, bool) {
	switch e := e.(type) {
	case *syntax.Number:
		return value{expr: l.r.ring.Rat(e.Value), bits: e.Value.Num().BitLen() + e.Value.Denom().BitLen(), grade: gradeNone}, true
	case *syntax.Name:
		return l.name(e)
	case *syntax.Differential:
		l.differential(e)
		return value{}, false
	case *syntax.Unary:
		v, ok := l.lower(e.X)
		if ok && e.Op == "-" {
			v.expr = v.expr.Neg()
		}
		return v, ok
	case *syntax.Binary:
		x, okX := l.lower(e.X)
		y, okY := l.lower(e.Y)
		if !okX || !okY {
			return value{}, false
		}
		return l.binary(e, x, y)
	case *syntax.Call:
		return l.call(e)
	}
	return value{}, false
}

// differential reports a differential where a number belongs.
func (l *lowering) differential(e *syntax.Differential) {
	switch {
	case l.r.isVariableDifferential(e.Name):
		l.fail(e.Where(), diagnostic.NoiseAsNumber, quote(e.Name)+" is the differential of the variable "+quote(e.Name[1:])+", not a number")
	case e.Name == "dt":
		l.fail(e.Where(), diagnostic.NoiseAsNumber, "\"dt\" is the differential of time, not a number").Expected = "dt in equations only"
	default:
		l.fail(e.Where(), diagnostic.NoiseAsNumber, quote(e.Name)+" is a Wiener increment, not a number").Expected = "Wiener increments in equations only"
	}
}

func (l *lowering) name(n *syntax.Name) (value, bool) {
	r := l.r
	if n.Name == "pi" {
		return value{expr: r.ring.Pi(), grade: gradeNone}, true
	}
	if l.bound[n.Name] > 0 {
		return value{expr: r.ring.Declare(n.Name, algebra.Attr{}), grade: gradeNone}, true
	}
	e, ok := r.entities[n.Name]
	if l.closed {
		l.fail(n.Where(), diagnostic.NotConstant, "the value depends on "+quote(n.Name)).Expected = "numbers and pi"
		return value{}, false
	}
	if !ok {
		r.undeclaredName(l.src, n)
		return value{}, false
	}
	switch e.kind {
	case entityLet:
		return r.abbreviation(e)
	case entityFunction:
		if f := r.system.Function(e.name); f != nil {
			return value{expr: f.Expr, grade: gradeNone}, true
		}
		return value{}, false
	}
	expr, ok := r.ring.Symbol(e.name)
	if !ok {
		return value{}, false
	}
	g := gradeNone
	if e.kind == entitySmall {
		g = grade{halves: 2, single: true}
	}
	return value{expr: expr, grade: g}, true
}

// undeclaredName reports a name without a meaning, once for each name.
func (r *reader) undeclaredName(src *syntax.Source, n *syntax.Name) {
	switch {
	case r.noises[n.Name]:
		r.failIn(src, n.Where(), diagnostic.NoiseAsNumber, quote(n.Name)+" is a Wiener process, not a number").Expected =
			"its increment " + quote("d"+n.Name) + ", in an equation"
		return
	case isBuiltin(n.Name):
		r.failIn(src, n.Where(), diagnostic.ArgumentCount, "the function "+n.Name+" has no argument here").Expected = n.Name + "(...)"
		return
	}
	if d, ok := r.undeclared[n.Name]; ok && d.File == src.Name {
		r.missing[n.Name]++
		d.Message = "the name " + quote(n.Name) + " is not declared (it is used " + itoa(r.missing[n.Name]+1) + " times)"
		return
	}
	d := r.failIn(src, n.Where(), diagnostic.UndeclaredName, "the name "+quote(n.Name)+" is not declared")
	r.undeclared[n.Name] = d
	switch n.Name {
	case "t":
		d.Expected = "coefficients that do not depend on time"
	case "π":
		d.Nearest = "pi"
	default:
		d.Nearest = diagnostic.Nearest(n.Name, append(r.names(entitySlow, entityFast, entityParam, entityFunction, entityLet, entitySmall), builtinNames()...))
		if d.Nearest == "" {
			d.Expected = "the name of a variable, parameter, function or abbreviation"
		}
	}
}

// abbreviation returns the value of a let statement, which is worked out once.
func (r *reader) abbreviation(e *entity) (value, bool) {
	switch e.state {
	case 0:
		e.state = 1
		l := &lowering{r: r, src: e.src}
		if e.value != nil {
			e.low, e.ok = l.lower(e.value)
		}
		e.state = 2
	case 1:
		// Reported with the cycle; see cycles.
		return value{}, false
	}
	return e.low, e.ok
}

// mergeRoots notes the roots of both operands in the result.
func (out *value) mergeRoots(x, y value) {
	out.nested = x.nested || y.nested
	out.fraction = x.fraction || y.fraction
	out.roots = x.roots
	if len(y.roots) > 0 {
		out.roots = append(append([]string(nil), x.roots...), y.roots...)
		slices.Sort(out.roots)
		out.roots = slices.Compact(out.roots)
		out.roots = out.roots[:min(len(out.roots), rootsNoted)]
	}
}

const rootsNoted = 8 // more than rationalizable asks for

// addRoot makes e, a root of x, the one root of the result.
func (out *value) addRoot(e syntax.Expr, x value) {
	if _, constant := x.expr.IsConstant(); constant {
		return
	}
	out.nested = len(x.roots) > 0
	out.roots = []string{e.String()}
}

// rationalizable guards divisors and radicands: roots are brought out of them,
// and where one root also stands inside another that work grows without bound.
func (l *lowering) rationalizable(e syntax.Expr, x value) bool {
	if x.expr.Size() > 1 && x.nested && len(x.roots) > 1 {
		l.tooComplex(e, "it divides by, or takes the root of, a sum of several nested roots")
		return false
	}
	return true
}

func (l *lowering) binary(e *syntax.Binary, x, y value) (out value, ok bool) {
	out.mergeRoots(x, y)
	cost := x.expr.Size() * y.expr.Size()
	switch e.Op {
	case "+", "-":
		out.depth = max(x.depth, y.depth)
		if out.fraction {
			// A common denominator multiplies both sides out.
			sizes := x.expr.Size() + y.expr.Size()
			cost = sizes * sizes / 2
			l.r.work += 6 * cost
		}
		out.bits = max(x.bits, y.bits) + 1
		out.grade = x.grade.add(y.grade)
	case "*", "/":
		out.depth = max(x.depth, y.depth)
		out.bits = x.bits + y.bits
	case "^":
		return l.power(e, x, y)
	}
	if !l.affordable(e, cost, out.bits) || e.Op == "/" && !l.rationalizable(e.Y, y) {
		return out, false
	}
	out.fraction = out.fraction || e.Op == "/" && y.expr.Size() > 1
	switch e.Op {
	case "*":
		out.grade, ok = x.grade.mul(y.grade)
	case "/":
		out.grade, ok = x.grade.div(y.grade)
	default:
		ok = true
	}
	if !ok {
		l.gradeError(e.Y, "the divisor "+shorten(e.Y.String())+" is not a power of "+l.r.small.name+" times something free of it")
		return out, false
	}
	err := algebra.Guard(func() (err error) {
		switch e.Op {
		case "+":
			out.expr = x.expr.Add(y.expr)
		case "-":
			out.expr = x.expr.Sub(y.expr)
		case "*":
			out.expr = x.expr.Mul(y.expr)
		case "/":
			out.expr, err = x.expr.Div(y.expr)
		}
		return err
	})
	if errors.Is(err, algebra.ErrDivisionByZero) {
		l.fail(e.Y.Where(), diagnostic.DivisionByZero, "the divisor "+shorten(e.Y.String())+" is identically zero")
		return out, false
	}
	return l.finish(e, out, err)
}

func (l *lowering) gradeError(at syntax.Expr, message string) {
	small := l.r.small.name
	l.fail(at.Where(), diagnostic.SmallParameter, message).Expected =
		small + " in factors that are integer or half-integer powers, such as " + small + "^2 or sqrt(" + small + ")"
}

func (l *lowering) power(e *syntax.Binary, x, y value) (out value, ok bool) {
	if !y.grade.none() {
		l.gradeError(e.Y, "the exponent "+shorten(e.Y.String())+" depends on the small parameter")
		return out, false
	}
	q, constant := y.expr.IsConstant()
	out.depth = max(x.depth, y.depth)
	out.mergeRoots(x, value{})
	if constant && q.Sign() < 0 || constant && !q.IsInt() {
		if !l.rationalizable(e.X, x) {
			return out, false
		}
		out.fraction = out.fraction || x.expr.Size() > 1
	}
	if constant && !q.IsInt() {
		out.addRoot(e, x)
	}
	if !constant || !q.IsInt() {
		if out.depth++; !l.shallow(e, out.depth) {
			return out, false
		}
	}
	terms, bits, ok := l.powerSize(e, x, q, constant)
	if !ok || !l.affordable(e, terms*x.expr.Size(), bits) {
		return out, false
	}
	// Repeated squaring multiplies two sums that have the terms of the half power.
	half := min(terms, maxPair)
	l.r.work += min(half*half/4, maxWork/4)
	out.bits = bits
	if constant {
		out.grade, ok = x.grade.pow(q)
	} else {
		out.grade, ok = gradeNone, x.grade.none()
	}
	if !ok {
		l.gradeError(e, "the small parameter appears in "+shorten(e.String())+" in another way than as an integer or half-integer power")
		return out, false
	}
	err := algebra.Guard(func() (err error) {
		out.expr, err = x.expr.Pow(y.expr)
		return err
	})
	if errors.Is(err, algebra.ErrDivisionByZero) {
		l.fail(e.Where(), diagnostic.DivisionByZero, "zero has no negative power: "+shorten(e.X.String())+" is identically zero")
		return out, false
	}
	return l.finish(e, out, err)
}

// powerSize bounds the terms of x^q and the size of the numbers in them, and
// refuses powers that are far too large.
func (l *lowering) powerSize(e *syntax.Binary, x value, q *big.Rat, constant bool) (terms, bits int, ok bool) {
	terms, bits = x.expr.Size(), x.bits
	if constant && q.IsInt() {
		n := new(big.Int).Abs(q.Num())
		if !n.IsInt64() || n.Int64() > 1_000_000 {
			l.tooComplex(e, "the exponent is too large")
			return 0, 0, false
		}
		k := int(n.Int64())
		switch c, number := x.expr.IsConstant(); {
		case terms > 1:
			bits = max(bits, 1)*max(k, 1) + 8*k
			terms = termsOfPower(terms, k)
		case !number || c.IsInt() && c.Num().BitLen() <= 1:
			bits *= max(k, 1) // powers of 1 and of symbols have no digits of their own
		default:
			bits = max(bits, 1) * max(k, 1)
		}
	} else if constant {
		f, _ := new(big.Rat).Abs(q).Float64()
		bits = int(min(float64(max(bits, 1))*(f+1), 2*maxBits))
		if f > 1 {
			terms = termsOfPower(terms, int(min(f, maxTerms))+1)
		}
	}
	if terms > maxTerms {
		l.tooComplex(e, "it would have more than "+itoa(maxTerms)+" terms when worked out")
		return 0, 0, false
	}
	return terms, bits, true
}

// termsOfPower returns binomial(terms+k-1, k), or more than maxTerms.
func termsOfPower(terms, k int) int {
	if terms <= 1 {
		return 1
	}
	n := 1.0
	for i := 1; i <= k; i++ {
		if n = n * float64(terms-1+i) / float64(i); n > maxTerms {
			return maxTerms + 1
		}
	}
	return int(n)
}

func (l *lowering) tooComplex(e syntax.Expr, why string) {
	text := e.String()
	if len(text) > 40 {
		text = "this expression"
	}
	l.fail(e.Where(), diagnostic.TooComplex, text+" is too large to be worked out: "+why)
}

// shallow checks how deep functions are nested: the work grows exponentially
// with the depth.
func (l *lowering) shallow(e syntax.Expr, depth int) bool {
	if depth > maxDepth {
		l.tooComplex(e, "functions and roots are nested more than "+itoa(maxDepth)+" deep")
	}
	return depth <= maxDepth
}

// affordable counts the work of an operation against the budget.
func (l *lowering) affordable(e syntax.Expr, cost, bits int) bool {
	switch {
	case cost > maxPair:
		l.tooComplex(e, "it multiplies long sums")
	case bits > maxBits:
		l.tooComplex(e, "its numbers have too many digits")
	case l.r.work > maxWork:
		l.tooComplex(e, "the model as a whole needs too much arithmetic")
	default:
		l.r.work += cost
		return true
	}
	return false
}

// finish turns an error of the algebra into one with a place.
func (l *lowering) finish(at syntax.Expr, out value, err error) (value, bool) {
	switch {
	case err == nil:
		if out.expr.Size() > maxTerms {
			l.tooComplex(at, "it has more than "+itoa(maxTerms)+" terms when worked out")
			return out, false
		}
		return out, true
	case errors.Is(err, algebra.ErrTooLarge):
		l.tooComplex(at, "it grows beyond the limit of the algebra")
	case errors.Is(err, algebra.ErrDivisionByZero):
		l.fail(at.Where(), diagnostic.DivisionByZero, shorten(at.String())+" has no value: it divides by zero")
	case errors.Is(err, algebra.ErrNegativeRoot):
		l.fail(at.Where(), diagnostic.NotReal, shorten(at.String())+" is the root of a negative quantity").Expected = "a radicand that can be positive"
	default:
		l.fail(at.Where(), diagnostic.NotReal, shorten(at.String())+" has no value: "+err.Error())
	}
	return out, false
}
