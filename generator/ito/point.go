package ito

import (
	"math"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// Number is an exact constant with its floating-point value.
type Number struct {
	Expr  algebra.Expr
	Float float64
	Text  string // as typed
}

// Point is a place at which numbers are asked for: a value for each slow
// variable, and values for parameters that replace those of the model.
type Point struct {
	Text       string
	Slow       []Number // one for each of System.Slow
	Parameters map[string]Number
}

const atOption = "--at"

// At reads the text of an --at option such as "x=0.3,y=0.2,D=1". Values are made
// of numbers and pi. Every slow variable needs a value in its domain; parameters
// may be given, with values that agree with their assumptions. The error is an
// [ErrorList]. At must not be called concurrently for one System.
func (s *System) At(text string) (*Point, error) {
	r := *s.scope
	r.errs, r.undeclared, r.missing = nil, map[string]*Diagnostic{}, map[string]int{}
	r.work, r.evaluated = 0, 0
	list, src, errs := syntax.ParseAssignments(atOption, text, Limits{})
	if len(errs) > 0 {
		return nil, errs
	}
	p := &Point{Text: text, Slow: make([]Number, len(s.Slow)), Parameters: map[string]Number{}}
	given := map[string]bool{}
	for _, a := range list {
		name := a.Name.Name
		if given[name] {
			r.failIn(src, a.Name.Where(), diagnostic.BadPoint, quote(name)+" is given twice")
			continue
		}
		given[name] = true
		r.pointValue(s, src, a, p)
	}
	missing := ""
	for _, v := range s.Slow {
		if !given[v.Name] {
			if missing != "" {
				missing += ", "
			}
			missing += v.Name
		}
	}
	if missing != "" && len(r.errs) == 0 {
		end := Position{Line: 1, Column: len([]rune(src.Line(1))) + 1}
		r.failIn(src, end, diagnostic.BadPoint, "the point lacks a value for "+missing).Expected = "a value for each slow variable: " + s.pointForm()
	}
	if len(r.errs) == 0 {
		r.pointDomains(s, src, list, p)
	}
	if len(r.errs) > 0 {
		r.errs.Sort()
		return nil, r.errs
	}
	return p, nil
}

func (s *System) pointForm() string {
	form := ""
	for i, v := range s.Slow {
		if i > 0 {
			form += ","
		}
		form += v.Name + "=..."
	}
	return form
}

func (r *reader) pointValue(s *System, src *syntax.Source, a syntax.Assignment, p *Point) {
	name := a.Name.Name
	e, ok := r.entities[name]
	if !ok || e.kind != entitySlow && e.kind != entityParam || a.Args != nil {
		message := "the name " + quote(name) + " is not declared"
		if ok {
			message = quote(name) + " is " + article(e.kind) + " " + e.kind.String() + "; a point has values for slow variables and parameters"
		}
		d := r.failIn(src, a.Name.Where(), diagnostic.BadPoint, message)
		if !ok {
			d.Nearest = diagnostic.Nearest(name, r.names(entitySlow, entityParam))
		}
		if d.Nearest == "" {
			d.Expected = s.pointForm()
		}
		return
	}
	l := &lowering{r: r, src: src, closed: true}
	v, ok := l.lower(a.Value)
	if !ok {
		return
	}
	n := Number{Expr: v.expr, Text: a.Text}
	if n.Float, ok = r.number(a.Value, nil); !ok || math.IsInf(n.Float, 0) {
		r.failIn(src, a.Value.Where(), diagnostic.BadPoint, "the value of "+quote(name)+" is not a finite number")
		return
	}
	if e.kind == entitySlow {
		p.Slow[s.Variable(name).Index] = n
		return
	}
	q, rational := v.expr.IsConstant()
	sign := algebra.Sign(algebra.Zero)
	switch {
	case rational:
		sign = algebra.Sign(1 << (q.Sign() + 1))
	case n.Float > 0:
		sign = algebra.Positive
	case n.Float < 0:
		sign = algebra.Negative
	}
	if problem := e.sign.broken(sign, rational && q.IsInt()); problem != "" {
		r.failIn(src, a.Value.Where(), diagnostic.BrokenSign, "the parameter "+quote(name)+" is declared "+e.sign.word+", and its value "+a.Text+" is "+problem)
		return
	}
	p.Parameters[name] = n
}

// pointDomains checks that the values lie in the domains, whose bounds may hang
// on parameters that the point sets.
func (r *reader) pointDomains(s *System, src *syntax.Source, list []syntax.Assignment, p *Point) {
	set := map[string]float64{}
	for name, n := range p.Parameters {
		set[name] = n.Float
	}
	for _, a := range list {
		v := s.Variable(a.Name.Name)
		if v == nil {
			continue
		}
		x := p.Slow[v.Index].Float
		why := ""
		switch d := v.Domain; {
		case d.Kind == HalfLine && x <= 0:
			why = "lies outside the half-line (0, inf)"
		case d.Kind.Interval():
			lo, okA := r.number(d.interval.A, set)
			hi, okB := r.number(d.interval.B, set)
			slack := 1e-12 * math.Max(1, hi-lo)
			if !okA || !okB || x >= lo-slack && x <= hi+slack {
				break
			}
			why = "lies outside the interval [" + short(lo) + ", " + short(hi) + "]"
			if d.Kind == Periodic && hi > lo {
				same := x - (hi-lo)*math.Floor((x-lo)/(hi-lo))
				why += "; " + short(same) + " is the same place"
			}
		}
		if why != "" {
			r.failIn(src, a.Value.Where(), diagnostic.BadPoint, "the value "+v.Name+" = "+a.Text+" "+why)
		}
	}
}

// NeedNumbers reports the parameters without a value and the functions without
// a formula that stand in the way of a number for some expressions; p, which may
// be nil, gives further values of parameters. The error is an [ErrorList] that
// points at the declarations.
func (s *System) NeedNumbers(p *Point, exprs ...algebra.Expr) error {
	r := *s.scope
	r.errs = nil
	defs := s.Definitions()
	needed := map[string]bool{}
	open := map[string]bool{}
	for _, e := range exprs {
		for _, name := range s.openFunctions(e) {
			open[name] = true
		}
		numbers, err := e.SubsFunc(defs)
		if err != nil {
			return err
		}
		for _, name := range numbers.Symbols() {
			needed[name] = true
		}
	}
	for _, q := range s.Parameters {
		given := q.Value != nil
		if p != nil && !given {
			_, given = p.Parameters[q.Name]
		}
		if needed[q.Name] && !given {
			r.fail(q.Position, diagnostic.MissingValue, "the parameter "+quote(q.Name)+" has no value, and numbers are asked for").Expected =
				"\"param " + q.Name + " = ...\" in the model, or --set " + q.Name + "=..."
		}
	}
	for _, f := range s.Functions {
		if open[f.Name] {
			head := syntaxOf(f.Name, f.Args)
			r.fail(f.Position, diagnostic.MissingValue, "the function "+quote(f.Name)+" has no formula, and numbers are asked for").Expected =
				"\"function " + head + " = ...\" in the model, or --set \"" + head + "=...\""
		}
	}
	r.errs.Sort()
	return r.errs.Err()
}

// openFunctions returns the functions without a formula that an expression
// contains, also through the formulas of others.
func (s *System) openFunctions(e algebra.Expr) (list []string) {
	defs := s.Definitions()
	marks := map[string]string{}
	for _, f := range s.Functions {
		if f.Body.Valid() {
			continue
		}
		// A symbol that no model can have marks where the function stood; the
		// arguments keep its derivatives from vanishing.
		mark := "?" + f.Name
		body := s.Ring.Declare(mark, algebra.Attr{})
		for _, a := range f.Args {
			x, _ := s.Ring.Symbol(a)
			grown, err := s.Ring.Call("exp", x)
			if err != nil {
				return nil
			}
			body = body.Mul(grown)
		}
		defs[f.Name] = algebra.FuncDef{Args: f.Args, Body: body}
		marks[mark] = f.Name
	}
	if len(marks) == 0 {
		return nil
	}
	out, err := e.SubsFunc(defs)
	if err != nil {
		return nil
	}
	for _, name := range out.Symbols() {
		if f, ok := marks[name]; ok {
			list = append(list, f)
		}
	}
	return list
}
