package ito

import (
	"maps"
	"slices"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// linear is the right-hand side of an equation: a coefficient for each
// differential.
type linear struct {
	parts map[string]value // by differential, such as dt and dW1
}

// differentials returns the keys of parts in a fixed order, so that of several
// errors the same one is met first in every run.
func (f *linear) differentials() []string { return slices.Sorted(maps.Keys(f.parts)) }

// equations works out the equations and reports those that are missing.
func (r *reader) equations() {
	meant := map[string]bool{} // variables that a misspelt equation was probably for
	for _, st := range r.sequence {
		v := r.system.Variable(st.Variable)
		if v == nil {
			r.strayEquation(st, meant)
			continue
		}
		if first, ok := r.typed[v.Name]; ok {
			r.fail(st.Name.Where(), diagnostic.Duplicate, "the equation for "+quote(v.Name)+" is given twice; first in line "+itoa(first.Where().Line))
			continue
		}
		r.typed[v.Name] = st
		if st.Right == nil {
			continue
		}
		l := &lowering{r: r, src: r.file.Source}
		if form, ok := l.linearForm(st.Right); ok {
			r.linear[v.Name] = form
		}
	}
	for _, list := range [][]*Variable{r.system.Slow, r.system.Fast} {
		for _, v := range list {
			if r.typed[v.Name] == nil && !meant[v.Name] {
				d := r.fail(v.Position, diagnostic.MissingEquation, "the variable "+quote(v.Name)+" has no equation")
				d.Expected = "a statement \"d" + v.Name + " = ...\""
			}
		}
	}
}

// strayEquation reports an equation for something that is no variable.
func (r *reader) strayEquation(st *syntax.Equation, meant map[string]bool) {
	if e, ok := r.entities[st.Variable]; ok {
		if e.kind != entitySlow && e.kind != entityFast {
			r.fail(st.Name.Where(), diagnostic.WrongVariable, "the equation is for "+quote(st.Variable)+", which is "+article(e.kind)+" "+e.kind.String()).Expected =
				"an equation for a slow or fast variable"
		}
		return
	}
	d := r.fail(st.Name.Where(), diagnostic.UndeclaredName, "the equation is for "+quote(st.Variable)+", which is not a declared variable")
	var free []string
	for _, v := range r.names(entitySlow, entityFast) {
		if !r.hasEquation(v) {
			free = append(free, v)
		}
	}
	if near := diagnostic.Nearest(st.Variable, free); near != "" {
		d.Nearest = "d" + near
		meant[near] = true
		return
	}
	d.Expected = "a statement \"slow " + st.Variable + "\" or \"fast " + st.Variable + "\", or an equation for a declared variable"
}

func (r *reader) hasEquation(name string) bool {
	for _, st := range r.sequence {
		if st.Variable == name {
			return true
		}
	}
	return false
}

// differentialIn returns the first differential in an expression, or nil. It
// remembers the answer for every part, since it is asked on every level.
func (l *lowering) differentialIn(e syntax.Expr) (found *syntax.Differential) {
	if d, ok := l.found[e]; ok {
		return d
	}
	switch e := e.(type) {
	case *syntax.Differential:
		found = e
	case *syntax.Unary:
		found = l.differentialIn(e.X)
	case *syntax.Binary:
		if found = l.differentialIn(e.X); found == nil {
			found = l.differentialIn(e.Y)
		}
	case *syntax.Call:
		for i := 0; i < len(e.Args) && found == nil; i++ {
			found = l.differentialIn(e.Args[i])
		}
	}
	if l.found == nil {
		l.found = map[syntax.Expr]*syntax.Differential{}
	}
	l.found[e] = found
	return found
}

// linearForm works out an expression that is linear in the differentials.
func (l *lowering) linearForm(e syntax.Expr) (*linear, bool) {
	if l.differentialIn(e) == nil {
		return l.withoutDifferential(e)
	}
	switch e := e.(type) {
	case *syntax.Differential:
		if l.r.isVariableDifferential(e.Name) {
			l.fail(e.Where(), diagnostic.NotANoise, quote(e.Name)+" is the differential of the variable "+quote(e.Name[1:])+" and has no place on a right-hand side").Expected =
				"dt, or a Wiener increment such as dW1"
			return nil, false
		}
		return &linear{map[string]value{e.Name: {expr: l.r.ring.Int(1), grade: gradeNone}}}, true
	case *syntax.Unary:
		x, ok := l.linearForm(e.X)
		if ok && e.Op == "-" {
			for d, v := range x.parts {
				v.expr = v.expr.Neg()
				x.parts[d] = v
			}
		}
		return x, ok
	case *syntax.Binary:
		switch e.Op {
		case "+", "-":
			return l.linearSum(e)
		case "*", "/":
			return l.linearProduct(e)
		}
		d := l.differentialIn(e)
		l.fail(d.Where(), diagnostic.DifferentialPower, "the differential "+quote(d.Name)+" stands in a power: an equation is linear in its differentials").Expected =
			"a factor before the differential"
	case *syntax.Call:
		d := l.differentialIn(e)
		l.fail(d.Where(), diagnostic.DifferentialPlace, "the differential "+quote(d.Name)+" stands inside the function "+e.Fun.Name).Expected =
			"the differential as a factor, such as " + e.Fun.Name + "(...) " + d.Name
	}
	return nil, false
}

// withoutDifferential reports a term that lacks its differential; zero needs none.
func (l *lowering) withoutDifferential(e syntax.Expr) (*linear, bool) {
	v, ok := l.lower(e)
	if !ok {
		return nil, false
	}
	if v.expr.IsZero() {
		return &linear{map[string]value{}}, true
	}
	l.fail(e.Where(), diagnostic.NoDifferential, "the term "+shorten(e.String())+" has no differential").Expected = "dt or a Wiener increment after it; a sum before a differential stands in parentheses"
	return nil, false
}

func shorten(s string) string {
	if r := []rune(s); len(r) > 40 {
		return string(r[:37]) + "..."
	}
	return s
}

func (l *lowering) linearSum(e *syntax.Binary) (*linear, bool) {
	x, okX := l.linearForm(e.X)
	y, okY := l.linearForm(e.Y)
	if !okX || !okY {
		return nil, false
	}
	zero := value{expr: l.r.ring.Int(0), grade: gradeNone}
	for _, d := range y.differentials() {
		b := y.parts[d]
		a, ok := x.parts[d]
		if !ok {
			if e.Op == "-" {
				b.expr = b.expr.Neg()
			}
			x.parts[d] = b
			continue
		}
		if a.expr.IsZero() {
			a.grade = zero.grade
		}
		sum, ok := l.binary(e, a, b)
		if !ok {
			return nil, false
		}
		x.parts[d] = sum
	}
	return x, true
}

func (l *lowering) linearProduct(e *syntax.Binary) (*linear, bool) {
	form, factor := e.X, e.Y
	if l.differentialIn(e.X) == nil {
		form, factor = e.Y, e.X
	}
	if d := l.differentialIn(factor); d != nil || e.Op == "/" && form == e.Y {
		if e.Op == "/" {
			d = l.differentialIn(e.Y)
			l.fail(d.Where(), diagnostic.DifferentialPlace, "the differential "+quote(d.Name)+" stands in a divisor").Expected = "the differential as a factor"
			return nil, false
		}
		first := l.differentialIn(form)
		for _, operand := range []syntax.Expr{e.X, e.Y} {
			if call, ok := operand.(*syntax.Call); ok {
				return l.linearForm(call) // it stands inside a function, which is the simpler thing to say
			}
		}
		l.fail(d.Where(), diagnostic.DifferentialPower, "the product of the differentials "+quote(first.Name)+" and "+quote(d.Name)+": an equation is linear in its differentials").Expected =
			"one differential in each term"
		return nil, false
	}
	x, okX := l.linearForm(form)
	c, okC := l.lower(factor)
	if !okX || !okC {
		return nil, false
	}
	for _, d := range x.differentials() {
		v := x.parts[d]
		var ok bool
		if e.Op == "/" {
			v, ok = l.binary(e, v, c)
		} else {
			v, ok = l.binary(e, c, v)
		}
		if !ok {
			return nil, false
		}
		x.parts[d] = v
	}
	return x, true
}

// assemble makes the equations of the system, in Ito form.
func (r *reader) assemble() {
	s := r.system
	zero := r.ring.Int(0)
	for _, list := range [][]*Variable{s.Slow, s.Fast} {
		for _, v := range list {
			st, form := r.typed[v.Name], r.linear[v.Name]
			eq := &Equation{Variable: v.Name, Slow: v.Slow, Drift: zero, Text: st.Source(), Position: st.Where()}
			if dt, ok := form.parts["dt"]; ok {
				eq.Drift = dt.expr
			}
			eq.Typed = eq.Drift
			for _, w := range s.Noises {
				c := zero
				if p, ok := form.parts["d"+w]; ok {
					c = p.expr
				}
				eq.Noise = append(eq.Noise, c)
			}
			s.Equations = append(s.Equations, eq)
		}
	}
	if s.Calculus == Stratonovich {
		r.convert()
	}
	s.scope = r
}

// convert adds to each drift the terms 1/2 Noise_jk diff(Noise_ik, X_j) that a
// change from the Stratonovich to the Ito reading makes.
func (r *reader) convert() {
	s := r.system
	half := r.ring.Frac(1, 2)
	for _, eq := range s.Equations {
		drift := eq.Typed
		err := algebra.Guard(func() error {
			for k, w := range s.Noises {
				for _, other := range s.Equations {
					if other.Noise[k].IsZero() || !eq.Noise[k].DependsOn(other.Variable) {
						continue
					}
					term := half.Mul(other.Noise[k]).Mul(eq.Noise[k].Diff(other.Variable))
					if term.IsZero() {
						continue
					}
					eq.Corrections = append(eq.Corrections, Correction{Noise: w, Variable: other.Variable, Term: term})
					drift = drift.Add(term)
				}
			}
			return nil
		})
		if err != nil {
			r.fail(eq.Position, diagnostic.TooComplex, "the conversion of the equation for "+quote(eq.Variable)+" to Ito form is too large to be worked out")
			return
		}
		eq.Drift = drift
	}
}
