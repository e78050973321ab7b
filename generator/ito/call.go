package ito

import (
	"math/big"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// call lowers a function with its arguments.
func (l *lowering) call(e *syntax.Call) (value, bool) {
	name := e.Fun.Name
	_, declared := l.r.entities[name]
	switch {
	case name == "diff":
		return l.derivative(e)
	case name == "at" && !declared:
		return l.replaced(e)
	case name == "integral" && !declared:
		return l.integral(e)
	}
	arity, ok := l.arity(e)
	if !ok {
		return value{}, false
	}
	args, ok := l.arguments(e, arity)
	if !ok {
		return value{}, false
	}
	return l.apply(e, args)
}

// arity returns the number of arguments of the function that is called, or
// reports that there is none of that name.
func (l *lowering) arity(e *syntax.Call) (int, bool) {
	r, name := l.r, e.Fun.Name
	entity, declared := r.entities[name]
	arity, builtin := algebra.IsBuiltin(name)
	switch {
	case builtin && !declared:
		return arity, true
	case !declared || l.closed:
		if r.noises[name] {
			r.undeclaredName(l.src, e.Fun)
			return 0, false
		}
		d := l.fail(e.Fun.Where(), diagnostic.UndeclaredName, "the function "+quote(name)+" is not declared")
		d.Nearest = diagnostic.Nearest(name, append(r.names(entityFunction), builtinNames()...))
		if d.Nearest == "" {
			d.Expected = "a standard function or a name declared by \"function\""
		}
		return 0, false
	case entity.kind != entityFunction:
		d := l.fail(e.Fun.Where(), diagnostic.NotAFunction, quote(name)+" is "+article(entity.kind)+" "+entity.kind.String()+", not a function")
		d.Expected = "an operator, such as " + name + "*(...)"
		return 0, false
	}
	// A function that could not be declared has been reported.
	return len(entity.args), r.system.Function(name) != nil
}

// apply calls the algebra. The small parameter may stand under a square root as
// a whole power, and in no other argument.
func (l *lowering) apply(e *syntax.Call, args []value) (value, bool) {
	name := e.Fun.Name
	out := value{grade: gradeNone}
	exprs := make([]algebra.Expr, len(args))
	for i, a := range args {
		exprs[i] = a.expr
		out.bits = max(out.bits, a.bits)
		out.depth = max(out.depth, a.depth)
		if a.grade.none() {
			continue
		}
		if name != "sqrt" {
			l.gradeError(e.Args[i], "the small parameter appears inside "+name)
			return value{}, false
		}
		var ok bool
		if out.grade, ok = a.grade.pow(big.NewRat(1, 2)); !ok {
			l.gradeError(e.Args[i], "the small parameter appears inside sqrt in another way than as an integer power")
			return value{}, false
		}
	}
	if out.depth++; !l.shallow(e, out.depth) {
		return value{}, false
	}
	if name == "sqrt" {
		if !l.rationalizable(e.Args[0], args[0]) {
			return value{}, false
		}
		out.addRoot(e, args[0])
	}
	err := algebra.Guard(func() (err error) {
		out.expr, err = l.r.ring.Call(name, exprs...)
		return err
	})
	return l.finish(e, out, err)
}

func article(k entityKind) string {
	switch k {
	case entityLet:
		return "an"
	case entitySmall:
		return "the"
	}
	return "a"
}

// arguments lowers the arguments and checks their number.
func (l *lowering) arguments(e *syntax.Call, arity int) ([]value, bool) {
	args, ok := make([]value, len(e.Args)), true
	for i, a := range e.Args {
		v, good := l.lower(a)
		args[i], ok = v, ok && good
	}
	if len(args) != arity {
		d := l.fail(e.Where(), diagnostic.ArgumentCount, "the function "+e.Fun.Name+" takes "+countOf(arity, "argument")+", not "+itoa(len(args)))
		if f := l.r.system.Function(e.Fun.Name); f != nil {
			d.Expected = syntaxOf(f.Name, f.Args)
		}
		return nil, false
	}
	return args, ok
}

func countOf(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return itoa(n) + " " + what + "s"
}

func syntaxOf(name string, args []string) string {
	s := name + "("
	for i, a := range args {
		if i > 0 {
			s += ", "
		}
		s += a
	}
	return s + ")"
}

// maxOrder bounds the order of a derivative.
const maxOrder = 12

// derivative lowers diff(f, x), diff(f, x, 2), diff(f, x, y) and mixtures of
// these.
func (l *lowering) derivative(e *syntax.Call) (value, bool) {
	const form = "diff(f, x), diff(f, x, 2) or diff(f, x, y)"
	if len(e.Args) < 2 {
		l.fail(e.Where(), diagnostic.BadDerivative, "diff needs an expression and a variable").Expected = form
		return value{}, false
	}
	v, ok := l.lower(e.Args[0])
	type step struct {
		name string
		n    int
	}
	var steps []step
	total := 0
	for i, a := range e.Args[1:] {
		switch a := a.(type) {
		case *syntax.Name:
			en, declared := l.r.entities[a.Name]
			if !declared {
				l.r.undeclaredName(l.src, a)
				return value{}, false
			}
			if en.kind != entitySlow && en.kind != entityFast && en.kind != entityParam {
				l.fail(a.Where(), diagnostic.BadDerivative, "diff differentiates in variables and parameters, and "+quote(a.Name)+" is "+article(en.kind)+" "+en.kind.String()).Expected = form
				return value{}, false
			}
			steps = append(steps, step{a.Name, 1})
			total++
			continue
		case *syntax.Number:
			if i > 0 && steps[len(steps)-1].n == 1 && a.Value.IsInt() && a.Value.Sign() > 0 && a.Value.Num().IsInt64() && a.Value.Num().Int64() <= maxOrder {
				if _, twice := e.Args[i].(*syntax.Number); !twice {
					steps[len(steps)-1].n = int(a.Value.Num().Int64())
					total += steps[len(steps)-1].n - 1
					continue
				}
			}
		}
		l.fail(a.Where(), diagnostic.BadDerivative, "diff differentiates in a variable, a whole number of times up to "+itoa(maxOrder)+", and "+quote(a.String())+" is neither").Expected = form
		return value{}, false
	}
	if total > maxOrder {
		l.fail(e.Where(), diagnostic.BadDerivative, "the order of the derivative is above "+itoa(maxOrder))
		return value{}, false
	}
	if !ok {
		return value{}, false
	}
	err := algebra.Guard(func() error {
		for _, s := range steps {
			for range s.n {
				v.expr = v.expr.Diff(s.name)
				v.bits += 16
				if v.expr.Size() > maxTerms {
					return algebra.ErrTooLarge
				}
			}
		}
		return nil
	})
	return l.finish(e, v, err)
}

// replaced lowers at(f, x, a, y, b): f with x replaced by a and y by b. It is how
// a derivative at other than the declared arguments is printed.
func (l *lowering) replaced(e *syntax.Call) (value, bool) {
	const form = "at(f, x, a) or at(f, x, a, y, b)"
	if len(e.Args) < 3 || len(e.Args)%2 == 0 {
		l.fail(e.Where(), diagnostic.ArgumentCount, "the function at takes an expression and pairs of a variable and its value").Expected = form
		return value{}, false
	}
	v, ok := l.lower(e.Args[0])
	with := map[string]algebra.Expr{}
	for i := 1; i < len(e.Args); i += 2 {
		n, isName := e.Args[i].(*syntax.Name)
		if isName {
			en, declared := l.r.entities[n.Name]
			isName = declared && (en.kind == entitySlow || en.kind == entityFast || en.kind == entityParam)
		}
		if !isName {
			l.fail(e.Args[i].Where(), diagnostic.ArgumentCount, quote(e.Args[i].String())+" is no variable that at can replace").Expected = form
			return value{}, false
		}
		a, good := l.lower(e.Args[i+1])
		if good && !a.grade.none() {
			l.gradeError(e.Args[i+1], "the small parameter appears inside at")
			good = false
		}
		ok = ok && good
		with[n.Name] = a.expr
		v.bits += a.bits
		v.depth += a.depth
	}
	if !ok || !l.affordable(e, v.expr.Size(), v.bits) || !l.shallow(e, v.depth) {
		return value{}, false
	}
	err := algebra.Guard(func() (err error) {
		v.expr, err = v.expr.Subs(with)
		return err
	})
	return l.finish(e, v, err)
}

// integral lowers integral(f, s, a, b), the integral of f over s from a to b. It
// is how results that are left as integrals are printed. The name s is bound: it
// need not be declared.
func (l *lowering) integral(e *syntax.Call) (value, bool) {
	const form = "integral(f, s, a, b)"
	var dummy *syntax.Name
	if len(e.Args) == 4 {
		dummy, _ = e.Args[1].(*syntax.Name)
	}
	if dummy == nil {
		l.fail(e.Where(), diagnostic.ArgumentCount, "the function integral takes an expression, a name and two bounds").Expected = form
		return value{}, false
	}
	if en := l.r.entities[dummy.Name]; en != nil && en.kind != entitySlow && en.kind != entityFast || isBuiltin(dummy.Name) {
		l.fail(dummy.Where(), diagnostic.NameClash, quote(dummy.Name)+" has a meaning of its own and cannot be integrated over").Expected = form
		return value{}, false
	}
	lo, okLo := l.lower(e.Args[2])
	hi, okHi := l.lower(e.Args[3])
	if l.bound == nil {
		l.bound = map[string]int{}
	}
	l.bound[dummy.Name]++
	f, ok := l.lower(e.Args[0])
	l.bound[dummy.Name]--
	if !ok || !okLo || !okHi {
		return value{}, false
	}
	out := value{grade: gradeNone, bits: f.bits + lo.bits + hi.bits, depth: 1 + max(f.depth, lo.depth, hi.depth)}
	for i, v := range []value{f, lo, hi} {
		if !v.grade.none() {
			l.gradeError(e.Args[[]int{0, 2, 3}[i]], "the small parameter appears inside integral")
			return value{}, false
		}
	}
	if !l.shallow(e, out.depth) {
		return value{}, false
	}
	err := algebra.Guard(func() error {
		l.r.ring.Declare(dummy.Name, algebra.Attr{})
		out.expr = l.r.ring.Integral(f.expr, dummy.Name, lo.expr, hi.expr)
		return nil
	})
	return l.finish(e, out, err)
}
