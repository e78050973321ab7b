package algebra

import (
	"fmt"
	"strings"
)

// Binding strengths of the expression language, from loose to tight; the one
// table that all printers of this package use.
const (
	bindSum = iota + 1
	bindNeg
	bindProduct
	bindPower
	bindAtom
)

// Binding returns how tightly the form's outermost operation binds, on the
// scale sum < negation < product < power < atom.
func (f *Form) Binding() int {
	switch f.Op {
	case FormSum:
		return bindSum
	case FormNeg:
		return bindNeg
	case FormProduct, FormQuotient:
		return bindProduct
	case FormPower:
		return bindPower
	case FormNumber:
		if !f.Num.IsInt() {
			return bindProduct
		}
	}
	return bindAtom
}

// String is the shortest arrangement as re-readable source text.
func (e Expr) String() string {
	if e.n == nil {
		return "<invalid>"
	}
	return e.Form().String()
}

func (f *Form) source(b *strings.Builder, need int) {
	if f.Binding() < need {
		b.WriteByte('(')
		defer b.WriteByte(')')
	}
	switch f.Op {
	case FormNumber:
		if f.Num.IsInt() {
			b.WriteString(f.Num.Num().String())
		} else {
			b.WriteString(f.Num.String())
		}
	case FormSymbol:
		b.WriteString(f.Name)
	case FormImag:
		b.WriteString("1i")
	case FormSum:
		for i, t := range f.Args {
			switch {
			case i == 0 && t.Op == FormNeg:
				t.source(b, bindNeg)
			case i == 0:
				t.source(b, bindNeg)
			case t.Op == FormNeg:
				b.WriteString(" - ")
				t.Args[0].source(b, bindProduct)
			default:
				b.WriteString(" + ")
				t.source(b, bindNeg)
			}
		}
	case FormNeg:
		b.WriteByte('-')
		f.Args[0].source(b, bindProduct)
	case FormProduct:
		for i, t := range f.Args {
			if i > 0 {
				b.WriteByte('*')
				t.source(b, bindPower)
				continue
			}
			t.source(b, bindProduct)
		}
	case FormQuotient:
		f.Args[0].source(b, bindProduct)
		b.WriteByte('/')
		f.Args[1].source(b, bindPower)
	case FormPower:
		f.Args[0].source(b, bindAtom)
		b.WriteByte('^')
		f.Args[1].source(b, bindAtom)
	case FormRoot:
		writeCall(b, "sqrt", f.Args)
	case FormCall:
		writeCall(b, f.Name, f.Args)
	case FormDiff:
		f.sourceDiff(b)
	case FormIntegral:
		b.WriteString("integral(")
		f.Args[0].source(b, 0)
		fmt.Fprintf(b, ", %s, ", f.Name)
		f.Args[1].source(b, 0)
		b.WriteString(", ")
		f.Args[2].source(b, 0)
		b.WriteByte(')')
	}
}

func writeCall(b *strings.Builder, name string, args []*Form) {
	b.WriteString(name)
	b.WriteByte('(')
	for i, a := range args {
		if i > 0 {
			b.WriteString(", ")
		}
		a.source(b, 0)
	}
	b.WriteByte(')')
}

// sourceDiff writes diff(v, x), diff(v, x, 2), diff(v, x, y), diff(v, x, 2, y)
// and, at other than the declared arguments, at(diff(v, x), x, ARG, ...).
func (f *Form) sourceDiff(b *strings.Builder) {
	vars, at := f.DiffVars()
	if len(at) > 0 {
		b.WriteString("at(")
		defer func() {
			for i, n := range at {
				fmt.Fprintf(b, ", %s, ", n)
				f.Args[i].source(b, 0)
			}
			b.WriteByte(')')
		}()
	}
	b.WriteString("diff(")
	if f.Name == "" {
		f.Args[0].source(b, 0) // the derivative of an expression
	} else {
		b.WriteString(f.Name)
	}
	for i := 0; i < len(vars); {
		n := 1
		for i+n < len(vars) && vars[i+n] == vars[i] {
			n++
		}
		b.WriteString(", " + vars[i])
		if n > 1 {
			fmt.Fprintf(b, ", %d", n)
		}
		i += n
	}
	b.WriteByte(')')
}
