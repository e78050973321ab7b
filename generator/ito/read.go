package ito

import (
	"crypto/sha256"
	"encoding/hex"
	"strconv"

	"epslim/generator/algebra"
	"epslim/generator/ito/diagnostic"
	"epslim/generator/ito/syntax"
)

// Options changes how a model is read. The zero value reads it as it stands.
type Options struct {
	// Set overrides values: "D=1.5" for a parameter, "v(x,y)=1+x^2" or "v=1+x^2"
	// for a function; several may stand in one text, separated by commas. The
	// last value of a name counts. A value must agree with the declared
	// assumption.
	Set []string
	// Limits bounds the size of what is read; zero fields mean the defaults.
	Limits Limits
}

// Parse reads a model file. The error is an [ErrorList] of everything that is
// wrong with the file and the options, in the order of places.
func Parse(name string, src []byte, opt Options) (*System, error) {
	file, errs := syntax.Parse(name, src, opt.Limits)
	if file == nil {
		return nil, errs
	}
	r := newReader(file, errs)
	r.system.Name, r.system.Source = name, string(src)
	sum := sha256.Sum256(src)
	r.system.SHA256 = hex.EncodeToString(sum[:])
	r.system.Set = append([]string(nil), opt.Set...)

	r.declare()
	r.override(opt)
	r.declareSymbols()
	r.parameters()
	r.domains()
	r.formulas()
	r.equations()
	r.claims()
	r.assigns()
	r.signs()
	if len(r.errs) == 0 {
		r.assemble()
	}
	if len(r.errs) == 0 {
		r.spheres()
	}
	if len(r.errs) > 0 {
		r.errs.Sort()
		return nil, r.errs
	}
	return r.system, nil
}

// Format returns the text of a model file in its canonical layout, which keeps
// comments; see [syntax.Format]. A file with errors of syntax is refused with
// an [ErrorList].
func Format(name string, src []byte) ([]byte, error) {
	return syntax.Format(name, src, Limits{})
}

// entityKind is what a name stands for.
type entityKind uint8

const (
	entitySmall entityKind = iota
	entitySlow
	entityFast
	entityParam
	entityFunction
	entityLet
)

func (k entityKind) String() string {
	return [...]string{"small parameter", "slow variable", "fast variable", "parameter", "function", "abbreviation"}[k]
}

// entity is a declared name.
type entity struct {
	kind entityKind
	name string
	at   Position
	stmt syntax.Statement

	src   *syntax.Source // where its value was typed
	value syntax.Expr    // of a parameter, function or abbreviation; nil when absent
	args  []string       // of a function

	state int8 // of the lowering: 0 not begun, 1 in progress, 2 done
	low   value
	ok    bool // low holds
	uses  map[string]bool

	latex string
	sign  assumption
}

// reader carries one reading through its passes.
type reader struct {
	file   *syntax.File
	errs   ErrorList
	system *System
	ring   *algebra.Ring

	entities map[string]*entity
	order    []*entity
	small    *entity
	noises   map[string]bool // Wiener processes that occur, such as W1

	undeclared map[string]*Diagnostic
	missing    map[string]int

	variables []*syntax.Variable
	claimed   []*syntax.Claim
	assigned  []*syntax.Assign
	typed     map[string]*syntax.Equation // by variable, the first of each
	sequence  []*syntax.Equation
	linear    map[string]*linear

	work      int // spent on arithmetic, against a budget
	evaluated int // steps of floating-point evaluation
}

func newReader(file *syntax.File, errs ErrorList) *reader {
	ring := algebra.NewRing()
	return &reader{
		file: file, errs: errs, ring: ring, system: &System{Ring: ring},
		entities: map[string]*entity{}, noises: map[string]bool{},
		undeclared: map[string]*Diagnostic{}, missing: map[string]int{},
		typed: map[string]*syntax.Equation{}, linear: map[string]*linear{},
	}
}

// fail reports an error in the model file and returns it for more detail.
func (r *reader) fail(at Position, code diagnostic.Code, message string) *Diagnostic {
	return r.failIn(r.file.Source, at, code, message)
}

func (r *reader) failIn(src *syntax.Source, at Position, code diagnostic.Code, message string) *Diagnostic {
	d := src.Diagnostic(at, code, message)
	r.errs = append(r.errs, d)
	return d
}

// names returns all declared names of the given kinds, in order.
func (r *reader) names(kinds ...entityKind) (list []string) {
	for _, e := range r.order {
		for _, k := range kinds {
			if e.kind == k {
				list = append(list, e.name)
			}
		}
	}
	return list
}

func itoa(n int) string { return strconv.Itoa(n) }

func quote(s string) string { return "\"" + s + "\"" }
