package ito

import (
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// place tells what may be used in an expression, and how to say so.
type place struct {
	what     string // names the expression: "the formula of v"
	code     diagnostic.Code
	expected string
	slow     bool            // slow variables may be used
	only     map[string]bool // if not nil, these slow variables alone
	fast     bool
	small    bool
}

func (p *place) admits(e *entity) bool {
	switch e.kind {
	case entitySlow:
		return p.slow && (p.only == nil || p.only[e.name])
	case entityFast:
		return p.fast
	case entitySmall:
		return p.small
	}
	return true
}

// admitted checks that an expression uses only what its place allows, and
// reports the first name that it may not. Names without a meaning are left to
// the lowering.
func (r *reader) admitted(src *syntax.Source, e syntax.Expr, p place) bool {
	ok := true
	syntax.Walk(e, func(n syntax.Expr) bool {
		if !ok {
			return false
		}
		switch n := n.(type) {
		case *syntax.Call:
			for _, a := range n.Args {
				ok = ok && r.admitted(src, a, p)
			}
			return false
		case *syntax.Name:
			if en := r.entities[n.Name]; en != nil {
				if bad := r.refused(en, &p); bad != nil {
					r.reportRefused(src, n, en, bad, &p)
					ok = false
				}
			}
		}
		return true
	})
	return ok
}

// refused returns a name that e uses and p does not admit, or nil.
func (r *reader) refused(e *entity, p *place) *entity {
	if e.kind == entityLet || e.kind == entityFunction {
		// In the order of declaration, so that the same one is named every time.
		uses := r.usesOf(e)
		for _, o := range r.order {
			if uses[o.name] && !p.admits(o) {
				return o
			}
		}
		return nil
	}
	if p.admits(e) {
		return nil
	}
	return e
}

func (r *reader) reportRefused(src *syntax.Source, n *syntax.Name, e, bad *entity, p *place) {
	code := p.code
	if bad.kind == entitySmall && code != diagnostic.NotConstant {
		code = diagnostic.SmallParameter
	}
	message := p.what + " depends on the " + bad.kind.String() + " " + quote(bad.name)
	if e != bad {
		message += " through the " + e.kind.String() + " " + quote(n.Name)
	}
	r.failIn(src, n.Where(), code, message).Expected = p.expected
}

// usesOf returns the variables that the value of an abbreviation, or of a
// function at its own arguments, depends on. The small parameter counts.
func (r *reader) usesOf(e *entity) map[string]bool {
	if e.uses != nil {
		return e.uses
	}
	e.uses = map[string]bool{} // also ends the recursion in a cycle
	if e.kind == entityFunction {
		for _, a := range e.args {
			e.uses[a] = true
		}
		return e.uses
	}
	r.collectUses(e.value, e.uses)
	return e.uses
}

func (r *reader) collectUses(e syntax.Expr, into map[string]bool) {
	syntax.Walk(e, func(n syntax.Expr) bool {
		switch n := n.(type) {
		case *syntax.Call:
			for _, a := range n.Args {
				r.collectUses(a, into)
			}
			return false
		case *syntax.Name:
			en := r.entities[n.Name]
			switch {
			case en == nil:
			case en.kind == entityLet || en.kind == entityFunction:
				for u := range r.usesOf(en) {
					into[u] = true
				}
			case en.kind != entityParam:
				into[en.name] = true
			}
		}
		return true
	})
}

// cycles reports abbreviations and functions that are defined by themselves,
// each cycle once, and keeps their members from being used.
func (r *reader) cycles() {
	const (
		unseen = iota
		open
		closed
	)
	state := map[*entity]int{}
	var path []*entity
	var visit func(e *entity)
	visit = func(e *entity) {
		state[e] = open
		path = append(path, e)
		syntax.Walk(e.value, func(n syntax.Expr) bool {
			name, ok := n.(*syntax.Name)
			if !ok {
				return true
			}
			next := r.entities[name.Name]
			if next == nil || next.kind != entityLet && next.kind != entityFunction {
				return true
			}
			switch state[next] {
			case unseen:
				visit(next)
			case open:
				r.reportCycle(e, name, next, path)
			}
			return true
		})
		path = path[:len(path)-1]
		state[e] = closed
	}
	for _, e := range r.order {
		if (e.kind == entityLet || e.kind == entityFunction) && state[e] == unseen {
			visit(e)
		}
	}
}

func (r *reader) reportCycle(from *entity, at *syntax.Name, to *entity, path []*entity) {
	if to.state == 2 && !to.ok {
		return // part of a cycle that has been reported
	}
	i := len(path) - 1
	for path[i] != to {
		i--
	}
	message := "the " + to.kind.String() + " " + quote(to.name) + " is defined by itself"
	if len(path)-i > 1 {
		message += ":"
		for _, e := range path[i:] {
			message += " " + e.name + " ->"
		}
		message += " " + to.name
	}
	r.failIn(from.src, at.Where(), diagnostic.Cycle, message)
	for _, e := range path[i:] {
		e.state, e.ok = 2, false
	}
}
