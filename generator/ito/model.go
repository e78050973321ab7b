package ito

import (
	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// parameters works out the values of parameters, which are exact numbers.
func (r *reader) parameters() {
	for _, p := range r.system.Parameters {
		e := r.entities[p.Name]
		if e.value == nil {
			continue
		}
		usesName := false
		syntax.Walk(e.value, func(n syntax.Expr) bool {
			if name, ok := n.(*syntax.Name); ok && !isBuiltin(name.Name) && !usesName {
				usesName = true
				r.failIn(e.src, name.Where(), diagnostic.NotConstant, "the value of the parameter "+quote(p.Name)+" depends on "+quote(name.Name)).Expected =
					"a number; a quantity that depends on others is a \"let\""
			}
			return true
		})
		l := &lowering{r: r, src: e.src}
		if usesName {
			e.value = nil
			continue
		}
		v, ok := l.lower(e.value)
		if !ok {
			e.value = nil
			continue
		}
		q, rational := v.expr.IsConstant()
		if !rational {
			r.failIn(e.src, e.value.Where(), diagnostic.NotConstant, "the value of the parameter "+quote(p.Name)+" is not an exact number").Expected =
				"a decimal or a fraction; for others use \"let\""
			e.value = nil
			continue
		}
		if problem := e.sign.broken(algebra.Sign(1<<(q.Sign()+1)), q.IsInt()); problem != "" {
			r.failIn(e.src, e.value.Where(), diagnostic.BrokenSign, "the parameter "+quote(p.Name)+" is declared "+e.sign.word+", and its value "+e.value.String()+" is "+problem)
			e.value = nil
			continue
		}
		p.Value = q
	}
}

// broken tells how a value of the given sign breaks the assumption, or returns "".
func (a assumption) broken(sign algebra.Sign, isInt bool) string {
	if a.integer && !isInt {
		return "not an integer"
	}
	if sign.Is(a.sign) {
		return ""
	}
	switch sign {
	case algebra.Zero:
		return "zero"
	case algebra.Negative:
		return "negative"
	}
	return "positive"
}

// domains works out the bounds of intervals and windows and compares them.
func (r *reader) domains() {
	r.cycles()
	for _, st := range r.variables {
		if !st.Domain.Understood {
			continue
		}
		for _, n := range st.Names {
			v := r.system.Variable(n.Name)
			if v == nil {
				continue
			}
			if st.Domain.Kind == Absorbing && !st.Slow {
				r.fail(st.Domain.At, diagnostic.AbsorbingFast, "the fast variable "+quote(n.Name)+" cannot be absorbed: it would have no stationary law").Expected = "reflecting or periodic"
			}
			v.Domain.interval, v.Domain.window = st.Domain.Interval, st.Domain.Window
			v.Domain.A, v.Domain.B = r.bounds(v, st.Domain.Interval, "interval")
			v.Domain.WindowA, v.Domain.WindowB = r.bounds(v, st.Domain.Window, "window")
			if w := st.Domain.Window; w != nil && st.Domain.Kind == HalfLine && v.Domain.WindowA.Valid() {
				if a, ok := r.number(w.A, nil); ok && a < 0 {
					r.fail(w.A.Where(), diagnostic.DomainBounds, "the window of "+quote(v.Name)+" begins at "+w.A.String()+", outside the half-line (0, inf)")
				}
			}
		}
	}
}

func (r *reader) bounds(v *Variable, b *syntax.Bounds, what string) (lo, hi algebra.Expr) {
	if b == nil {
		return lo, hi
	}
	p := place{what: "the " + what + " of " + quote(v.Name), code: diagnostic.NotConstant, expected: "bounds made of numbers and parameters"}
	l := &lowering{r: r, src: r.file.Source}
	okA := r.admitted(l.src, b.A, p)
	okB := r.admitted(l.src, b.B, p)
	var x, y value
	if okA {
		x, okA = l.lower(b.A)
	}
	if okB {
		y, okB = l.lower(b.B)
	}
	if !okA || !okB {
		return lo, hi
	}
	width := y.expr.Sub(x.expr)
	wrong := width.Sign().Is(algebra.NonPositive)
	if !wrong && !width.Sign().Is(algebra.Positive) {
		if b == v.Domain.interval {
			r.system.MustBePositive = append(r.system.MustBePositive, width)
		}
		a, known := r.number(b.A, nil)
		c, known2 := r.number(b.B, nil)
		wrong = known && known2 && a >= c
	}
	if wrong {
		r.fail(b.Where(), diagnostic.DomainBounds, "the "+what+" of "+quote(v.Name)+" is empty: "+b.A.String()+" is not below "+b.B.String()+r.valuesText(b.A, b.B)).Expected =
			"an interval [A, B] with A < B"
		return lo, hi
	}
	return x.expr, y.expr
}

// valuesText lists the values of the parameters in some expressions, to make an
// error about their values understood.
func (r *reader) valuesText(list ...syntax.Expr) string {
	text := ""
	seen := map[string]bool{}
	for _, e := range list {
		syntax.Walk(e, func(n syntax.Expr) bool {
			if name, ok := n.(*syntax.Name); ok && !seen[name.Name] {
				seen[name.Name] = true
				if en := r.entities[name.Name]; en != nil && en.kind == entityParam && en.value != nil {
					text += ", " + name.Name + " = " + en.value.String()
				}
			}
			return true
		})
	}
	if text == "" {
		return ""
	}
	return " for" + text[1:]
}

// formulas works out abbreviations and the formulas of functions.
func (r *reader) formulas() {
	r.each(entityLet, func(e *entity) {
		v, ok := r.abbreviation(e)
		if ok {
			r.system.Lets = append(r.system.Lets, &Let{Name: e.name, Value: v.expr, Latex: e.latex, Position: e.at})
		}
	})
	for _, f := range r.system.Functions {
		e := r.entities[f.Name]
		if e.value == nil || e.state == 2 {
			continue
		}
		only := map[string]bool{}
		for _, a := range e.args {
			only[a] = true
		}
		p := place{what: "the formula of " + quote(f.Name), code: diagnostic.WrongArgument, slow: true, only: only,
			expected: "an expression in the arguments of " + syntaxOf(f.Name, e.args) + " and parameters"}
		if !r.admitted(e.src, e.value, p) {
			continue
		}
		l := &lowering{r: r, src: e.src}
		if v, ok := l.lower(e.value); ok {
			f.Body = v.expr
		}
	}
}

// claims works out the hand calculations.
func (r *reader) claims() {
	for _, st := range r.claimed {
		if st.Bad() {
			continue
		}
		c := &Claim{Kind: st.Kind, Index: st.Index, Text: st.Source(), Position: st.Where()}
		p := place{what: "the claim", code: diagnostic.BadClaim, slow: true, expected: "an expression in slow variables and parameters: the limit is free of the rest"}
		ok := true
		for _, n := range st.Names {
			e, declared := r.entities[n.Name]
			switch {
			case !declared:
				r.undeclaredName(r.file.Source, n)
				ok = false
			case e.kind != entitySlow:
				r.fail(n.Where(), diagnostic.WrongVariable, quote(n.Name)+" is "+article(e.kind)+" "+e.kind.String()+"; the limit has equations for slow variables").Expected =
					"the name of a slow variable"
				ok = false
			}
			c.Names = append(c.Names, n.Name)
		}
		left := place{what: "the averaged expression", code: diagnostic.BadClaim, slow: true, fast: true, expected: "an expression in slow and fast variables and parameters"}
		switch st.Kind {
		case ClaimInvariant, ClaimCorrector:
			p.fast = true
			p.expected = left.expected
		case ClaimMean:
			var okLeft bool
			c.Left, okLeft = r.expression(st.Left, left)
			ok = ok && okLeft
		}
		var okRight bool
		c.Right, okRight = r.expression(st.Right, p)
		if ok && okRight {
			r.system.Claims = append(r.system.Claims, c)
		}
	}
}

// expression checks and lowers an expression of the file.
func (r *reader) expression(e syntax.Expr, p place) (algebra.Expr, bool) {
	if !r.admitted(r.file.Source, e, p) {
		return algebra.Expr{}, false
	}
	l := &lowering{r: r, src: r.file.Source}
	v, ok := l.lower(e)
	return v.expr, ok
}

// assigns works out initial values and observables.
func (r *reader) assigns() {
	starts, observables := map[string]Position{}, map[string]Position{}
	for _, st := range r.assigned {
		if st.Bad() {
			continue
		}
		if st.Observe {
			r.observable(st, observables)
		} else {
			r.start(st, starts)
		}
	}
}

func (r *reader) start(st *syntax.Assign, first map[string]Position) {
	v := r.system.Variable(st.Name.Name)
	if v == nil {
		if e, ok := r.entities[st.Name.Name]; ok && e.kind != entitySlow && e.kind != entityFast {
			r.fail(st.Name.Where(), diagnostic.WrongVariable, quote(e.name)+" is "+article(e.kind)+" "+e.kind.String()+"; initial values are for variables").Expected = "the name of a variable"
		} else if !ok {
			r.undeclaredName(r.file.Source, st.Name)
		}
		return
	}
	if at, ok := first[v.Name]; ok {
		r.duplicate(st.Where(), "the initial value of "+quote(v.Name), at)
		return
	}
	first[v.Name] = st.Where()
	x, ok := r.expression(st.Value, place{what: "the initial value of " + quote(v.Name), code: diagnostic.NotConstant, expected: "numbers and parameters"})
	if !ok {
		return
	}
	if f, known := r.number(st.Value, nil); known {
		if why := r.outside(v, f); why != "" {
			r.fail(st.Value.Where(), diagnostic.DomainBounds, "the initial value "+v.Name+" = "+st.Value.String()+" "+why)
			return
		}
	}
	r.system.Starts = append(r.system.Starts, &Start{Variable: v.Name, Value: x, Position: st.Where()})
}

func (r *reader) observable(st *syntax.Assign, first map[string]Position) {
	name := st.Name.Name
	if at, ok := first[name]; ok {
		r.duplicate(st.Where(), "the observable "+quote(name), at)
		return
	}
	first[name] = st.Where()
	x, ok := r.expression(st.Value, place{what: "the observable " + quote(name), code: diagnostic.WrongVariable, slow: true, expected: "an expression in slow variables and parameters"})
	if e, clash := r.entities[name]; clash {
		// A variable may be observed under its own name, but a name has one meaning.
		if symbol, found := r.ring.Symbol(name); !found || e.kind != entitySlow || ok && !x.Equal(symbol) {
			r.fail(st.Name.Where(), diagnostic.Duplicate, "the observable "+quote(name)+" has the name of "+article(e.kind)+" "+e.kind.String()).Expected = "another name"
			return
		}
	}
	if ok {
		r.system.Observables = append(r.system.Observables, &Observable{Name: name, Value: x, Position: st.Where()})
	}
}
