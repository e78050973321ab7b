package ito

import (
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

const setOption = "--set"

// override puts the values of --set options in the place of those of the file.
// They are worked out and checked where the file's own would have been.
func (r *reader) override(opt Options) {
	for _, text := range opt.Set {
		list, src, errs := syntax.ParseAssignments(setOption, text, opt.Limits)
		if len(errs) > 0 {
			r.errs = append(r.errs, errs...)
			continue
		}
		for _, a := range list {
			r.set(src, a)
		}
	}
}

func (r *reader) set(src *syntax.Source, a syntax.Assignment) {
	name := a.Name.Name
	e, ok := r.entities[name]
	if !ok {
		d := r.failIn(src, a.Name.Where(), diagnostic.BadOverride, "the name "+quote(name)+" is not declared")
		d.Nearest = diagnostic.Nearest(name, r.names(entityParam, entityFunction))
		if d.Nearest == "" {
			d.Expected = "the name of a parameter or function"
		}
		return
	}
	switch e.kind {
	case entityParam:
		if a.Args != nil {
			r.failIn(src, a.Name.Where(), diagnostic.BadOverride, quote(name)+" is a parameter and has no arguments").Expected = name + "=NUMBER"
			return
		}
	case entityFunction:
		if a.Args != nil && !sameNames(a.Args, e.args) {
			r.failIn(src, a.Name.Where(), diagnostic.BadOverride, "the function "+quote(name)+" has other arguments").Expected = syntaxOf(name, e.args) + "=..."
			return
		}
	case entityLet:
		r.failIn(src, a.Name.Where(), diagnostic.BadOverride, quote(name)+" is an abbreviation made by \"let\" and cannot be set").Expected =
			"a parameter or function that it is made of"
		return
	default:
		r.failIn(src, a.Name.Where(), diagnostic.BadOverride, quote(name)+" is the "+e.kind.String()+" and cannot be set").Expected = "the name of a parameter or function"
		if e.kind != entitySmall {
			r.errs[len(r.errs)-1].Message = quote(name) + " is a " + e.kind.String() + " and cannot be set"
		}
		return
	}
	e.src, e.value = src, a.Value
}

func sameNames(list []*syntax.Name, names []string) bool {
	if len(list) != len(names) {
		return false
	}
	for i, n := range list {
		if n.Name != names[i] {
			return false
		}
	}
	return true
}
