package algebra

import (
	"math/big"
	"sort"
)

// prod gathers the factors of a product by base before they are laid out.
type prod struct {
	b     *former
	c     rat
	depth int
	fs    []prodFactor
}

type prodFactor struct {
	class int // constants, parameters, variables, functions, derivatives, others
	k     *kernel
	form  *Form
	e     rat
	sym   Expr // symbolic part of the exponent, if valid
	nonng bool // known non-negative
}

func (p *prod) mono(m *mono) {
	r := p.b.r
	exponent := r.zero // of exp
	symbolic := map[string]Expr{}
	base := map[string]Expr{}
	var order []string
	for _, q := range m.p {
		switch q.k.kind {
		case kindExp:
			exponent = exponent.Add(q.k.args[0].Mul(r.ratExpr(q.e.rat())))
		case kindPow:
			key := q.k.args[0].key()
			if _, ok := symbolic[key]; !ok {
				symbolic[key] = r.zero
				base[key] = q.k.args[0]
				order = append(order, key)
			}
			symbolic[key] = symbolic[key].Add(q.k.args[1].Mul(r.ratExpr(q.e.rat())))
		}
	}
	for _, q := range m.p {
		if q.k.kind == kindExp || q.k.kind == kindPow {
			continue
		}
		e := q.e.rat()
		if q.k.kind != kindPrime {
			key := r.kernelExpr1(q.k).key()
			if s, ok := symbolic[key]; ok {
				// v^a v^(m) is v^(a + m)
				symbolic[key] = s.Add(r.ratExpr(e))
				continue
			}
		}
		p.fs = append(p.fs, prodFactor{class: displayClass(q.k), k: q.k, form: p.b.kernel(q.k, p.depth), e: e, nonng: q.k.signAlone().Is(NonNegative)})
	}
	for _, key := range order {
		p.fs = append(p.fs, prodFactor{class: 7, form: p.b.expr(base[key], p.depth+1), e: ratOne, sym: symbolic[key]})
	}
	if !exponent.IsZero() {
		f := &Form{Op: FormCall, Name: "exp", Args: []*Form{p.b.expr(exponent, p.depth+1)}}
		p.fs = append(p.fs, prodFactor{class: 8, form: f, e: ratOne})
	}
}

func (p *prod) form(f *Form, e int) {
	if f.isOne() {
		return
	}
	if f.Op == FormNumber {
		q := fromBig(f.Num)
		if e < 0 {
			q, e = q.inv(), -e
		}
		for ; e > 0; e-- {
			p.c = p.c.mul(q)
		}
		return
	}
	if f.Op == FormProduct {
		for _, g := range f.Args {
			p.form(g, e)
		}
		return
	}
	p.fs = append(p.fs, prodFactor{class: formClass(f), form: f, e: ratInt(int64(e))})
}

// formClass is displayClass for what is arranged already.
func formClass(f *Form) int {
	switch f.Op {
	case FormSymbol:
		return 3
	case FormPower:
		return formClass(f.Args[0])
	case FormDiff:
		return 5
	case FormSum:
		return 6
	}
	return 7
}

func displayClass(k *kernel) int {
	switch k.kind {
	case kindPrime:
		return 0
	case kindSymbol:
		switch {
		case k.rank < 0:
			return 1
		case k.attr.Parameter:
			return 2
		}
		return 3
	case kindFunc:
		for _, d := range k.deriv {
			if d > 0 {
				return 5
			}
		}
		return 4
	}
	return 7
}

// build lays the factors out as one quotient with one square root above and
// one below.
func (p *prod) build() *Form {
	sort.SliceStable(p.fs, func(i, j int) bool {
		a, b := p.fs[i], p.fs[j]
		if a.class != b.class {
			return a.class < b.class
		}
		if a.k != nil && b.k != nil {
			if a.k.kind == kindTrig && b.k.kind == kindTrig {
				// by angle, the first declared variable first
				if c := compareMono(a.k.args[0].n.num[0].m, b.k.args[0].n.num[0].m); c != 0 {
					return c > 0
				}
			}
			return compareKernels(a.k, b.k) < 0
		}
		return false
	})
	p.merge()
	p.flip()
	c := p.c
	var num, den, rootNum, rootDen []*Form
	for _, f := range p.fs {
		if f.sym.Valid() {
			num = append(num, p.b.power(f.form, f.sym, p.depth))
			continue
		}
		if f.k != nil && f.k.kind == kindPrime && f.e.equal(rat{n: 1, d: 2}) {
			pr := ratInt(f.k.prime)
			if q := c.mul(pr); f.k.prime > 1 && divisible(c, f.k.prime) {
				c = q
				rootDen = append(rootDen, numForm(pr))
			} else {
				rootNum = append(rootNum, numForm(pr))
			}
			continue
		}
		e := f.e
		if f.nonng && e.abs().equal(rat{n: 1, d: 2}) {
			if e.sign() > 0 {
				rootNum = append(rootNum, f.form)
			} else {
				rootDen = append(rootDen, f.form)
			}
			continue
		}
		if e.sign() > 0 {
			num = append(num, p.b.ratPower(f.form, e))
		} else {
			den = append(den, p.b.ratPower(f.form, e.neg()))
		}
	}
	switch {
	case len(rootNum) > 0 && len(rootDen) > 0:
		num = append(num, rootForm(quotientForm(mergeNumbers(rootNum), mergeNumbers(rootDen))))
	case len(rootNum) > 0:
		num = append(num, rootForm(productForm(mergeNumbers(rootNum))))
	case len(rootDen) > 0:
		den = append(den, rootForm(productForm(mergeNumbers(rootDen))))
	}
	a := c.abs()
	if n := fromBig(new(big.Rat).SetInt(a.num())); !n.isOne() || len(num) == 0 {
		num = append([]*Form{numForm(n)}, num...)
	}
	if d := fromBig(new(big.Rat).SetInt(a.den())); !d.isOne() {
		den = append([]*Form{numForm(d)}, den...)
	}
	if len(num) > 1 && num[0].isOne() {
		num = num[1:]
	}
	f := quotientForm(num, den)
	if c.sign() < 0 {
		f = negForm(f)
	}
	return f
}

// merge adds the exponents of factors with the same base, as a root of a
// polynomial and that polynomial in the denominator.
func (p *prod) merge() {
	at := map[string]int{}
	out := p.fs[:0]
	for _, f := range p.fs {
		if f.k != nil && f.k.kind == kindPrime {
			out = append(out, f)
			continue
		}
		key := f.form.String()
		i, ok := at[key]
		if !ok && !f.sym.Valid() && f.e.isInt() && f.form.Op == FormSum {
			// 1 - y and y - 1 are one base up to a sign
			if g := flipSum(f.form); g != nil {
				if i, ok = at[g.String()]; ok && f.e.n%2 != 0 {
					p.c = p.c.neg()
				}
			}
		}
		if !ok {
			at[key] = len(out)
			out = append(out, f)
			continue
		}
		g := &out[i]
		r := p.b.r
		switch {
		case f.sym.Valid() && g.sym.Valid():
			g.sym = g.sym.Add(f.sym)
		case f.sym.Valid():
			g.sym = f.sym.Add(r.ratExpr(g.e))
		case g.sym.Valid():
			g.sym = g.sym.Add(r.ratExpr(f.e))
		default:
			g.e = g.e.add(f.e)
		}
		g.nonng = g.nonng || f.nonng
	}
	p.fs = out[:0]
	for _, f := range out {
		if f.sym.Valid() {
			if q, ok := f.sym.rational(); ok {
				f.sym, f.e = Expr{}, q
			}
		}
		if f.sym.Valid() || !f.e.isZero() {
			p.fs = append(p.fs, f)
		}
	}
}

// flip turns -(a - b) into b - a.
func (p *prod) flip() {
	if p.c.sign() >= 0 {
		return
	}
	for i := range p.fs {
		f := &p.fs[i]
		if f.sym.Valid() || f.form.Op != FormSum || !f.e.isInt() || f.e.n%2 == 0 {
			continue
		}
		if g := flipSum(f.form); g != nil {
			f.form = g
			p.c = p.c.neg()
			return
		}
	}
}

// flipSum is minus a sum that has a negative summand, or nil.
func flipSum(f *Form) *Form {
	if f.Op != FormSum {
		return nil
	}
	ts := make([]*Form, len(f.Args))
	has := false
	for i, t := range f.Args {
		has = has || t.Op == FormNeg
		ts[i] = negForm(t)
	}
	if !has {
		return nil
	}
	return positiveFirst(ts)
}

// mergeNumbers multiplies the numbers under one root.
func mergeNumbers(fs []*Form) []*Form {
	c := ratOne
	var out []*Form
	for _, f := range fs {
		if f.Op == FormNumber {
			c = c.mul(fromBig(f.Num))
			continue
		}
		out = append(out, f)
	}
	if !c.isOne() || len(out) == 0 {
		out = append([]*Form{numForm(c)}, out...)
	}
	return out
}

func divisible(c rat, p int64) bool {
	return new(big.Int).Mod(c.den(), big.NewInt(p)).Sign() == 0
}

func rootForm(f *Form) *Form { return &Form{Op: FormRoot, Args: []*Form{f}} }

func (b *former) ratPower(f *Form, e rat) *Form {
	switch {
	case e.isOne():
		return f
	case e.equal(rat{n: 1, d: 2}):
		return rootForm(f)
	}
	return &Form{Op: FormPower, Args: []*Form{f, numForm(e)}}
}

func (b *former) power(f *Form, e Expr, depth int) *Form {
	if e.IsOne() {
		return f
	}
	return &Form{Op: FormPower, Args: []*Form{f, b.expr(e, depth+1)}}
}

// kernel prints the first power of a kernel (for roots, the base).
func (b *former) kernel(k *kernel, depth int) *Form {
	args := func() []*Form {
		out := make([]*Form, len(k.args))
		for i, a := range k.args {
			out[i] = b.expr(a, depth+1)
		}
		return out
	}
	switch k.kind {
	case kindPrime:
		return numForm(ratInt(k.prime))
	case kindSymbol:
		return &Form{Op: FormSymbol, Name: k.name, Latex: k.attr.Latex}
	case kindRoot:
		return b.expr(k.base, depth+1)
	case kindExp:
		return &Form{Op: FormCall, Name: "exp", Args: args()}
	case kindCis:
		return &Form{Op: FormCall, Name: "cis", Args: args()}
	case kindPow:
		return b.power(b.expr(k.args[0], depth+1), k.args[1], depth)
	case kindFunc:
		return b.function(k, args)
	case kindIntegral:
		return &Form{Op: FormIntegral, Name: k.name, Args: args()}
	}
	return &Form{Op: FormCall, Name: k.name, Args: args()}
}

func (b *former) function(k *kernel, args func() []*Form) *Form {
	f := b.r.funcs[k.name]
	standard := true
	for i, a := range k.args {
		s := b.r.kernelExpr(b.r.symbols[f.args[i]])
		standard = standard && a.Equal(s)
	}
	out := &Form{Op: FormDiff, Name: k.name, Latex: f.attr.Latex}
	for i, n := range k.deriv {
		for ; n > 0; n-- {
			out.Vars = append(out.Vars, f.args[i])
		}
	}
	if !standard {
		out.Args = args()
	}
	if len(out.Vars) == 0 {
		if standard {
			return &Form{Op: FormSymbol, Name: k.name, Latex: f.attr.Latex}
		}
		return &Form{Op: FormCall, Name: k.name, Latex: f.attr.Latex, Args: out.Args}
	}
	if !standard {
		// The declared names, in order, tell the printer what Args replace.
		out.Vars = append(out.Vars, "")
		out.Vars = append(out.Vars, f.args...)
	}
	return out
}
