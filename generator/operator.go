// Package generator builds the generator of an Ito system as data:
// differential operators with exact coefficients, graded by powers of the
// small parameter. It owns application, composition and the formal adjoint
// of such operators and their printing. It imports generator/algebra and
// generator/ito only.
package generator

import (
	"fmt"
	"sort"
	"strings"

	"epslim/generator/algebra"
)

// Operator is a linear differential operator: a sum of coefficients times
// partial derivatives. The zero value is not usable; see New.
type Operator struct {
	ring  *algebra.Ring
	vars  []string
	terms map[string]term
}

type term struct {
	index []int
	coef  algebra.Expr
}

// Term is one summand: Coef * d^|Index| / dVars^Index.
type Term struct {
	Index []int
	Coef  algebra.Expr
}

// New returns the zero operator in the given variables.
func New(r *algebra.Ring, vars []string) *Operator {
	return &Operator{ring: r, vars: append([]string(nil), vars...), terms: map[string]term{}}
}

func indexKey(index []int) string {
	b := make([]byte, len(index))
	for i, n := range index {
		b[i] = byte(n)
	}
	return string(b)
}

// Vars are the variables, in declared order.
func (o *Operator) Vars() []string { return o.vars }

// Ring is the ring of the coefficients.
func (o *Operator) Ring() *algebra.Ring { return o.ring }

// IsZero reports whether no term is left.
func (o *Operator) IsZero() bool { return len(o.terms) == 0 }

// Add adds coef * d^index to the operator in place.
func (o *Operator) Add(index []int, coef algebra.Expr) {
	if coef.IsZero() {
		return
	}
	k := indexKey(index)
	if t, ok := o.terms[k]; ok {
		s := t.coef.Add(coef)
		if s.IsZero() {
			delete(o.terms, k)
			return
		}
		o.terms[k] = term{t.index, s}
		return
	}
	o.terms[k] = term{append([]int(nil), index...), coef}
}

// Coef is the coefficient of the derivative with the given multi-index.
func (o *Operator) Coef(index ...int) algebra.Expr {
	if t, ok := o.terms[indexKey(index)]; ok {
		return t.coef
	}
	return o.ring.Int(0)
}

// Terms lists the summands: lower order first, then by variable order.
func (o *Operator) Terms() []Term {
	out := make([]Term, 0, len(o.terms))
	for _, t := range o.terms {
		out = append(out, Term{t.index, t.coef})
	}
	sort.Slice(out, func(i, j int) bool {
		a, b := out[i].Index, out[j].Index
		if x, y := order(a), order(b); x != y {
			return x < y
		}
		for k := range a {
			if a[k] != b[k] {
				return a[k] > b[k]
			}
		}
		return false
	})
	return out
}

func order(index []int) int {
	n := 0
	for _, k := range index {
		n += k
	}
	return n
}

// Order is the highest order of differentiation.
func (o *Operator) Order() int {
	n := 0
	for _, t := range o.terms {
		n = max(n, order(t.index))
	}
	return n
}

// Apply lets the operator act on an expression.
func (o *Operator) Apply(e algebra.Expr) algebra.Expr {
	out := o.ring.Int(0)
	memo := map[string]algebra.Expr{}
	for _, t := range o.Terms() {
		d := derivative(e, o.vars, t.Index, memo)
		if !d.IsZero() {
			out = out.Add(t.Coef.Mul(d))
		}
	}
	return out
}

func derivative(e algebra.Expr, vars []string, index []int, memo map[string]algebra.Expr) algebra.Expr {
	k := indexKey(index)
	if d, ok := memo[k]; ok {
		return d
	}
	d := e
	for i := len(index) - 1; i >= 0; i-- {
		if index[i] == 0 {
			continue
		}
		lower := append([]int(nil), index...)
		lower[i]--
		d = derivative(e, vars, lower, memo).Diff(vars[i])
		break
	}
	memo[k] = d
	return d
}

// Compose is the operator "o after p": (o p) u = o(p u). Both must be in the
// same variables.
func (o *Operator) Compose(p *Operator) *Operator {
	out := New(o.ring, o.vars)
	for _, a := range o.Terms() {
		for _, b := range p.Terms() {
			// Leibniz: d^a (c d^b u) = sum_k binom(a, k) (d^k c) d^(a-k+b) u
			eachBelow(a.Index, func(k []int) {
				c := b.Coef
				f := int64(1)
				idx := make([]int, len(k))
				for i := range k {
					c = c.DiffN(o.vars[i], k[i])
					f *= binomial(a.Index[i], k[i])
					idx[i] = a.Index[i] - k[i] + b.Index[i]
				}
				out.Add(idx, a.Coef.Mul(c).Mul(o.ring.Int(f)))
			})
		}
	}
	return out
}

// Adjoint is the formal adjoint in all variables: u -> sum (-1)^|a| d^a (c u).
func (o *Operator) Adjoint() *Operator {
	out := New(o.ring, o.vars)
	for _, t := range o.Terms() {
		eachBelow(t.Index, func(k []int) {
			c := t.Coef
			f := int64(1)
			if order(t.Index)%2 == 1 {
				f = -1
			}
			idx := make([]int, len(k))
			for i := range k {
				c = c.DiffN(o.vars[i], k[i])
				f *= binomial(t.Index[i], k[i])
				idx[i] = t.Index[i] - k[i]
			}
			out.Add(idx, c.Mul(o.ring.Int(f)))
		})
	}
	return out
}

func eachBelow(top []int, f func([]int)) {
	k := make([]int, len(top))
	var rec func(int)
	rec = func(i int) {
		if i == len(top) {
			f(k)
			return
		}
		for k[i] = 0; k[i] <= top[i]; k[i]++ {
			rec(i + 1)
		}
		k[i] = 0
	}
	rec(0)
}

func binomial(n, k int) int64 {
	out := int64(1)
	for i := 0; i < k; i++ {
		out = out * int64(n-i) / int64(i+1)
	}
	return out
}

// Equal reports whether two operators in the same variables are equal.
func (o *Operator) Equal(p *Operator) bool {
	if len(o.terms) != len(p.terms) {
		return false
	}
	for k, t := range o.terms {
		s, ok := p.terms[k]
		if !ok || !s.coef.Equal(t.coef) {
			return false
		}
	}
	return true
}

// DiffCoefficients is the operator whose coefficients are differentiated in
// the symbol.
func (o *Operator) DiffCoefficients(name string) *Operator {
	out := New(o.ring, o.vars)
	for _, t := range o.Terms() {
		out.Add(t.Index, t.Coef.Diff(name))
	}
	return out
}

// String writes the operator as it acts on a function u, in the expression
// language: "v*cos(theta)*diff(u, x) + D*diff(u, theta, 2)".
func (o *Operator) String() string {
	if o.IsZero() {
		return "0"
	}
	var b strings.Builder
	for i, t := range o.Terms() {
		f := t.Coef.Form()
		neg := f.Op == algebra.FormNeg
		if neg {
			f = f.Args[0]
		}
		switch {
		case i == 0 && neg:
			b.WriteByte('-')
		case neg:
			b.WriteString(" - ")
		case i > 0:
			b.WriteString(" + ")
		}
		s := f.String()
		if f.Op == algebra.FormSum {
			s = "(" + s + ")"
		}
		d := derivativeText(o.vars, t.Index)
		switch {
		case d == "":
			b.WriteString(s + "*u")
		case s == "1":
			b.WriteString(d)
		case f.Op == algebra.FormQuotient && f.Args[0].String() == "1":
			b.WriteString(d + s[1:])
		default:
			b.WriteString(s + "*" + d)
		}
	}
	return b.String()
}

func derivativeText(vars []string, index []int) string {
	var b strings.Builder
	for i, n := range index {
		switch {
		case n == 1:
			b.WriteString(", " + vars[i])
		case n > 1:
			fmt.Fprintf(&b, ", %s, %d", vars[i], n)
		}
	}
	if b.Len() == 0 {
		return ""
	}
	return "diff(u" + b.String() + ")"
}
