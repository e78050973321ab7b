package algebra

import (
	"math/big"
	"strings"
)

// FormOp tells what a Form is.
type FormOp uint8

// The kinds of printed nodes.
const (
	FormNumber   FormOp = iota // Num, a non-negative rational
	FormSymbol                 // Name
	FormSum                    // Args; a negative summand is a FormNeg
	FormProduct                // Args
	FormQuotient               // Args[0] / Args[1]
	FormPower                  // Args[0] ^ Args[1]
	FormRoot                   // square root of Args[0]
	FormNeg                    // -Args[0]
	FormCall                   // Name(Args...)
	FormDiff                   // derivative of function Name in Vars, at Args if not nil
	FormIntegral               // integral of Args[0] over Name from Args[1] to Args[2]
	FormImag                   // the imaginary unit
)

// Form is an expression arranged for reading: a tree that any printer
// (source text, Unicode, TeX, MathML, program code) renders without further
// algebra.
type Form struct {
	Op    FormOp
	Num   *big.Rat
	Name  string
	Latex string // the user's own TeX for a symbol or function
	Args  []*Form
	Vars  []string // FormDiff: variable names with repetition
	text  string
}

func (f *Form) isOne() bool { return f.Op == FormNumber && f.Num.Cmp(big.NewRat(1, 1)) == 0 }

func (f *Form) isZero() bool { return f.Op == FormNumber && f.Num.Sign() == 0 }

func numForm(q rat) *Form {
	if q.sign() < 0 {
		return &Form{Op: FormNeg, Args: []*Form{numForm(q.neg())}}
	}
	return &Form{Op: FormNumber, Num: q.rational()}
}

func negForm(f *Form) *Form {
	if f.Op == FormNeg {
		return f.Args[0]
	}
	if f.isZero() {
		return f
	}
	return &Form{Op: FormNeg, Args: []*Form{f}}
}

func sumForm(fs []*Form) *Form {
	switch len(fs) {
	case 0:
		return numForm(ratZero)
	case 1:
		return fs[0]
	}
	return &Form{Op: FormSum, Args: fs}
}

func productForm(fs []*Form) *Form {
	switch len(fs) {
	case 0:
		return numForm(ratOne)
	case 1:
		return fs[0]
	}
	return &Form{Op: FormProduct, Args: fs}
}

func quotientForm(n, d []*Form) *Form {
	if len(d) == 0 {
		return productForm(n)
	}
	return &Form{Op: FormQuotient, Args: []*Form{productForm(n), productForm(d)}}
}

// Form arranges e for reading: the shortest of several arrangements
// (factored, expanded, collected by derivatives or by a common kernel).
func (e Expr) Form() *Form {
	b := &former{r: e.n.r, memo: map[string]*Form{}}
	return b.expr(e, 0)
}

// former builds forms; memo avoids arranging the same expression twice.
type former struct {
	r    *Ring
	memo map[string]*Form
}

const maxFormDepth = 6

func (b *former) expr(e Expr, depth int) *Form {
	if e.IsZero() {
		return numForm(ratZero)
	}
	key := e.key()
	if f, ok := b.memo[key]; ok {
		return f
	}
	f := b.arrange(e, depth)
	b.memo[key] = f
	return f
}

// arrange tries the arrangements and keeps the shortest.
func (b *former) arrange(e Expr, depth int) *Form {
	num, den, ok := b.realParts(e)
	if !ok {
		return b.complex(e, depth)
	}
	best := b.factored(num, den, depth)
	if depth < maxFormDepth && len(num) > 1 {
		if len(den) == 0 {
			x := b.expanded(num)
			if best.Op == FormQuotient && best.Args[0].Op == FormSum && len(num) <= 4 && !hasAlgebraic(num) && 4*x.cost() <= 5*best.cost() {
				best = x // a sum of quotients reads better than one long quotient
			}
			best = shorter(best, x)
			best = shorter(best, b.commonFactor(num, depth))
		}
		if len(num) <= 400 {
			best = shorter(best, b.byFunctions(e, depth))
			best = shorter(best, b.quotientRule(e, depth))
			best = shorter(best, b.byKernel(e, depth))
			best = shorter(best, b.byDerivatives(e, num, depth))
		}
		if len(num) <= 40 {
			best = shorter(best, b.unrationalised(e, num, depth))
			best = shorter(best, b.divided(e, depth))
		}
	}
	return best
}

func shorter(a, b *Form) *Form {
	if b == nil || b.cost() >= a.cost() {
		return a
	}
	return b
}

// cost measures how hard a form is to read: its length, more for sums nested
// in sums, less for the square of a sum.
func (f *Form) cost() int {
	n := len(f.String())
	var walk func(g *Form, depth int)
	walk = func(g *Form, depth int) {
		switch g.Op {
		case FormSum:
			if depth > 0 {
				n += 3 * depth
			}
			depth++
		case FormPower:
			if g.Args[0].Op == FormSum && g.Args[1].String() == "2" {
				n -= 7
			}
		case FormCall, FormRoot, FormIntegral:
			return
		}
		for _, a := range g.Args {
			walk(a, depth)
		}
	}
	walk(f, 0)
	return n
}

// DiffVars returns the variables of differentiation of a FormDiff and, when
// it is taken at other than the declared arguments, the declared names that
// Args replace.
func (f *Form) DiffVars() (vars, at []string) {
	for i, v := range f.Vars {
		if v == "" {
			return f.Vars[:i], f.Vars[i+1:]
		}
	}
	return f.Vars, nil
}

// String is the source text of the form, readable by the model reader.
func (f *Form) String() string {
	if f.text == "" {
		var b strings.Builder
		f.source(&b, 0)
		f.text = b.String()
	}
	return f.text
}
