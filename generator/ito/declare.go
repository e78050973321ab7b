package ito

import (
	"slices"
	"strings"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// assumption is what is declared of a parameter or function.
type assumption struct {
	word    string
	sign    algebra.Sign
	integer bool
}

func assumptionOf(n *syntax.Name) assumption {
	a := assumption{word: "real", sign: algebra.AnyReal}
	if n == nil {
		return a
	}
	a.word = n.Name
	switch n.Name {
	case "positive":
		a.sign = algebra.Positive
	case "nonnegative":
		a.sign = algebra.NonNegative
	case "negative":
		a.sign = algebra.Negative
	case "integer":
		a.integer = true
	}
	return a
}

// isBuiltin tells whether a name belongs to the expression language itself. The
// further functions that appear in printed results (at, integral, polygamma) are
// understood as well, unless the model declares their names.
func isBuiltin(name string) bool {
	return slices.Contains(builtinNames(), name)
}

func builtinNames() []string {
	return []string{"sin", "cos", "tan", "sinh", "cosh", "tanh", "exp", "log", "sqrt", "abs", "sign", "erf", "gamma", "besseli", "diff", "pi"}
}

// declare gives every name of the file its meaning and sorts the statements.
func (r *reader) declare() {
	latex := []*syntax.Latex{}
	var title *syntax.Title
	var calculus *syntax.Calculus
	var small *syntax.Small
	r.reserveSmall(&small)
	for _, st := range r.file.Statements {
		switch st := st.(type) {
		case *syntax.Title:
			if title != nil {
				r.duplicate(st.Where(), "the title", title.Where())
				continue
			}
			title = st
			r.system.Title = st.Text
		case *syntax.Small:
			if st != small {
				r.duplicate(st.Where(), "the small parameter", small.Where())
			}
		case *syntax.Calculus:
			if calculus != nil {
				r.duplicate(st.Where(), "the calculus", calculus.Where())
				continue
			}
			calculus = st
			if st.Name.Name == "stratonovich" {
				r.system.Calculus = Stratonovich
			}
		case *syntax.Variable:
			kind := entityFast
			if st.Slow {
				kind = entitySlow
			}
			for _, n := range st.Names {
				r.enter(&entity{kind: kind, name: n.Name, at: n.Where(), stmt: st})
			}
			r.variables = append(r.variables, st)
		case *syntax.Param:
			r.enter(&entity{kind: entityParam, name: st.Name.Name, at: st.Name.Where(), stmt: st, value: st.Value, sign: assumptionOf(st.Assumption)})
		case *syntax.Function:
			e := &entity{kind: entityFunction, name: st.Name.Name, at: st.Name.Where(), stmt: st, value: st.Body, sign: assumptionOf(st.Assumption)}
			for _, a := range st.Args {
				e.args = append(e.args, a.Name)
			}
			r.enter(e)
		case *syntax.Let:
			r.enter(&entity{kind: entityLet, name: st.Name.Name, at: st.Name.Where(), stmt: st, value: st.Value})
		case *syntax.Equation:
			r.sequence = append(r.sequence, st)
		case *syntax.Claim:
			r.claimed = append(r.claimed, st)
		case *syntax.Assign:
			r.assigned = append(r.assigned, st)
		case *syntax.Latex:
			latex = append(latex, st)
		}
	}
	r.differentialClashes()
	r.collectNoises()
	r.arguments()
	r.symbols(latex)
	r.variablesPresent()
}

func (r *reader) duplicate(at Position, what string, first Position) {
	r.fail(at, diagnostic.Duplicate, what+" is given twice; first in line "+itoa(first.Line))
}

// reserveSmall enters the small parameter before everything else, since its
// name may not be used again; it is eps when the file does not name it.
func (r *reader) reserveSmall(first **syntax.Small) {
	e := &entity{kind: entitySmall, name: "eps"}
	for _, st := range r.file.Statements {
		if s, ok := st.(*syntax.Small); ok {
			*first = s
			e.name, e.at, e.stmt = s.Name.Name, s.Name.Where(), s
			break
		}
	}
	r.small = e
	r.enter(e)
	r.system.Small = e.name
}

// enter declares a name, or reports why it cannot be.
func (r *reader) enter(e *entity) {
	e.src = r.file.Source
	switch {
	case isBuiltin(e.name):
		what := "a standard function"
		if e.name == "pi" {
			what = "a number"
		}
		r.fail(e.at, diagnostic.NameClash, "the "+e.kind.String()+" cannot be called "+quote(e.name)+", which is "+what).Expected = "another name"
		if e.kind != entitySmall {
			return
		}
	case e.name == "dt":
		r.fail(e.at, diagnostic.NameClash, "the "+e.kind.String()+" cannot be called \"dt\", which is the differential of time").Expected = "another name"
		return
	case strings.HasPrefix(e.name, "dW"):
		r.fail(e.at, diagnostic.NameClash, "the "+e.kind.String()+" cannot be called "+quote(e.name)+": names that begin with dW are Wiener increments").Expected = "another name"
		return
	case e.name == "t" && (e.kind == entitySlow || e.kind == entityFast):
		r.fail(e.at, diagnostic.NameClash, "a variable cannot be called \"t\", since \"dt\" is the differential of time").Expected = "another name"
	}
	old, ok := r.entities[e.name]
	if ok {
		switch {
		case old.kind == entitySmall && old.stmt == nil:
			r.fail(e.at, diagnostic.NameClash, "the name \"eps\" is taken by the small parameter, which is called so when no \"small\" statement names it").Expected =
				"another name, or a \"small\" statement"
		case old.kind == entitySmall:
			r.fail(e.at, diagnostic.NameClash, "the name "+quote(e.name)+" is taken by the small parameter")
		default:
			r.fail(e.at, diagnostic.Duplicate, "the name "+quote(e.name)+" is declared twice; first in line "+itoa(old.at.Line)+" as a "+old.kind.String())
		}
		return
	}
	r.entities[e.name] = e
	r.order = append(r.order, e)
}

// differentialClashes reports names that read as the differential of a variable.
func (r *reader) differentialClashes() {
	for _, e := range r.order {
		if !strings.HasPrefix(e.name, "d") {
			continue
		}
		if v, ok := r.entities[e.name[1:]]; ok && (v.kind == entitySlow || v.kind == entityFast) {
			r.fail(e.at, diagnostic.NameClash, "the name "+quote(e.name)+" is the differential of the variable "+quote(v.name)).Expected = "another name for one of the two"
		}
	}
}

// isVariableDifferential tells whether a name is d with a declared variable.
func (r *reader) isVariableDifferential(name string) bool {
	if !strings.HasPrefix(name, "d") {
		return false
	}
	v, ok := r.entities[name[1:]]
	return ok && (v.kind == entitySlow || v.kind == entityFast)
}

// collectNoises lists the Wiener processes in the order of first appearance.
func (r *reader) collectNoises() {
	for _, eq := range r.sequence {
		syntax.Walk(eq.Right, func(e syntax.Expr) bool {
			if d, ok := e.(*syntax.Differential); ok && strings.HasPrefix(d.Name, "dW") && !r.isVariableDifferential(d.Name) {
				if w := d.Name[1:]; !r.noises[w] {
					r.noises[w] = true
					r.system.Noises = append(r.system.Noises, w)
				}
			}
			return true
		})
	}
}

// arguments checks that functions are functions of slow variables.
func (r *reader) arguments() {
	for _, e := range r.order {
		if e.kind != entityFunction {
			continue
		}
		seen := map[string]bool{}
		for _, a := range e.stmt.(*syntax.Function).Args {
			v, ok := r.entities[a.Name]
			switch {
			case !ok:
				d := r.fail(a.Where(), diagnostic.WrongArgument, "the argument "+quote(a.Name)+" of "+e.name+" is not a slow variable")
				d.Expected = "the names of slow variables"
				d.Nearest = diagnostic.Nearest(a.Name, r.names(entitySlow))
			case v.kind != entitySlow:
				d := r.fail(a.Where(), diagnostic.WrongArgument, "the argument "+quote(a.Name)+" of "+e.name+" is a "+v.kind.String()+"; functions are functions of slow variables")
				if v.kind == entityFast {
					d.Expected = "the names of slow variables; write the dependence on fast ones out, or abbreviate it with \"let\""
				}
			case seen[a.Name]:
				r.fail(a.Where(), diagnostic.WrongArgument, "the argument "+quote(a.Name)+" of "+e.name+" is given twice")
			default:
				seen[a.Name] = true
				continue
			}
			e.ok = false
			e.state = 2 // no use is complained about
		}
	}
}

// symbols attaches the TeX of latex statements.
func (r *reader) symbols(list []*syntax.Latex) {
	first := map[string]Position{}
	for _, st := range list {
		e, ok := r.entities[st.Name.Name]
		if !ok {
			r.undeclaredName(r.file.Source, st.Name)
			continue
		}
		if at, ok := first[e.name]; ok {
			r.duplicate(st.Where(), "the symbol of "+quote(e.name), at)
			continue
		}
		first[e.name] = st.Where()
		e.latex = st.Text
	}
}

// variablesPresent reports a model without slow or fast variables.
func (r *reader) variablesPresent() {
	for _, c := range []struct {
		kind     entityKind
		expected string
	}{{entitySlow, "a statement such as \"slow x on line\""}, {entityFast, "a statement such as \"fast y on line\""}} {
		if len(r.names(c.kind)) == 0 && r.readable() {
			d := r.fail(Position{Line: 1, Column: 1}, diagnostic.NoVariable, "the model has no "+c.kind.String())
			d.Expected = c.expected
		}
	}
}

// readable tells whether all statements could be read, so that what is missing
// is missing and not misspelt.
func (r *reader) readable() bool {
	for _, d := range r.errs {
		switch d.Code {
		case diagnostic.UnknownKeyword, diagnostic.Empty, diagnostic.Bracket, diagnostic.NameClash, diagnostic.Syntax, diagnostic.BadCharacter:
			return false
		}
	}
	return true
}

// declareSymbols makes the names known to the algebra. Their order is that of
// printed output: small parameter, parameters, slow variables, functions, fast
// variables.
func (r *reader) declareSymbols() {
	s := r.system
	r.ring.Declare(r.small.name, algebra.Attr{Sign: algebra.Positive, Parameter: true, Latex: r.small.latex})
	s.Latex = r.small.latex
	r.each(entityParam, func(e *entity) {
		expr := r.ring.Declare(e.name, algebra.Attr{Sign: e.sign.sign, Integer: e.sign.integer, Parameter: true, Latex: e.latex})
		s.Parameters = append(s.Parameters, &Parameter{Name: e.name, Sign: e.sign.sign, Integer: e.sign.integer, Expr: expr, Latex: e.latex, Position: e.at})
	})
	r.each(entitySlow, r.declareVariable)
	r.each(entityFunction, func(e *entity) {
		f := &Function{Name: e.name, Args: e.args, Sign: e.sign.sign, Integer: e.sign.integer, Latex: e.latex, Position: e.at}
		if e.state == 2 || len(e.args) == 0 {
			e.state = 2
			return
		}
		if err := r.ring.DeclareFunction(e.name, e.args, algebra.Attr{Sign: e.sign.sign, Integer: e.sign.integer, Latex: e.latex}); err != nil {
			r.fail(e.at, diagnostic.WrongArgument, err.Error())
			e.state = 2
			return
		}
		args := make([]algebra.Expr, len(e.args))
		for i, a := range e.args {
			args[i], _ = r.ring.Symbol(a)
		}
		expr, err := r.ring.Call(e.name, args...)
		if err != nil {
			r.fail(e.at, diagnostic.WrongArgument, err.Error())
			e.state = 2
			return
		}
		f.Expr = expr
		s.Functions = append(s.Functions, f)
	})
	r.each(entityFast, r.declareVariable)
}

func (r *reader) each(kind entityKind, f func(*entity)) {
	for _, e := range r.order {
		if e.kind == kind {
			f(e)
		}
	}
}

func (r *reader) declareVariable(e *entity) {
	st := e.stmt.(*syntax.Variable)
	attr := algebra.Attr{Latex: e.latex}
	if st.Domain.Kind == HalfLine {
		attr.Sign = algebra.Positive
	}
	v := &Variable{Name: e.name, Slow: st.Slow, Latex: e.latex, Position: e.at}
	v.Domain.Kind = st.Domain.Kind
	v.Expr = r.ring.Declare(e.name, attr)
	s := r.system
	if st.Slow {
		v.Index = len(s.Slow)
		s.Slow = append(s.Slow, v)
		return
	}
	v.Index = len(s.Fast)
	s.Fast = append(s.Fast, v)
	if st.Domain.Kind == OnSphere && len(st.Names) == 3 && st.Names[2].Name == e.name {
		s.Spheres = append(s.Spheres, Sphere{[3]string{st.Names[0].Name, st.Names[1].Name, st.Names[2].Name}})
	}
}
