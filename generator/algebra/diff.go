package algebra

import "fmt"

// FuncDef is a formula that replaces a named function: body in terms of the
// named arguments.
type FuncDef struct {
	Args []string
	Body Expr
}

// Diff is the partial derivative in the symbol.
func (e Expr) Diff(name string) Expr {
	r := e.n.r
	num := r.diffPoly(e.n.num, name)
	if len(e.n.den) == 0 {
		return num
	}
	den := r.unit
	out := num
	// (n / prod f^k)' = (n' - n sum k f'/f) / prod f^k
	for _, f := range e.n.den {
		d := r.diffPoly(f.f.p, name)
		if !d.IsZero() {
			out = out.Sub(r.fromPoly(e.n.num).Mul(d).Mul(r.Int(int64(f.e))).over(r.fromPoly(f.f.p)))
		}
		den = den.Mul(r.fromPoly(f.f.p).powNat(f.e))
	}
	return out.over(den)
}

// DiffN is the n-th partial derivative.
func (e Expr) DiffN(name string, n int) Expr {
	for ; n > 0; n-- {
		e = e.Diff(name)
	}
	return e
}

func (r *Ring) diffPoly(p poly, name string) Expr {
	byKernel := map[*kernel]*accumulator{}
	var order []*kernel
	for _, t := range p {
		for _, q := range t.m.p {
			if !q.k.dependsOn(name) {
				continue
			}
			acc, ok := byKernel[q.k]
			if !ok {
				acc = r.accumulate(8)
				byKernel[q.k] = acc
				order = append(order, q.k)
			}
			// group-like kernels are differentiated logarithmically, all
			// others by the power rule
			m := t.m
			if !logarithmic(q.k) {
				m = r.monoMul(t.m, r.internMono([]power{{q.k, expo{-1, 1}}}))
				if m.needs && q.k.kind == kindCall {
					// abs: k^-1 is k/base; keep it logarithmic instead
					m = t.m
				}
			}
			acc.add(m, t.c.mul(coefRat(q.e.rat())))
		}
	}
	out := r.zero
	for _, k := range order {
		out = out.Add(r.fromPoly(byKernel[k].poly()).Mul(r.diffKernel(k, name)))
	}
	return out
}

// logarithmic kernels have k'/k as their stored derivative.
func logarithmic(k *kernel) bool {
	switch k.kind {
	case kindExp, kindCis, kindPow, kindRoot, kindPrime:
		return true
	}
	return k.algebraic
}

// diffKernel is dk/ds, or k'/k for the logarithmic kernels.
func (r *Ring) diffKernel(k *kernel, name string) Expr {
	if d, ok := k.diff[name]; ok {
		return d
	}
	d := r.diffKernelRaw(k, name)
	if k.diff == nil {
		k.diff = map[string]Expr{}
	}
	k.diff[name] = d
	return d
}

func (r *Ring) diffKernelRaw(k *kernel, name string) Expr {
	switch k.kind {
	case kindSymbol:
		return r.unit
	case kindExp:
		return k.args[0].Diff(name)
	case kindCis:
		return k.args[0].Diff(name).Mul(r.coefExpr(coefI))
	case kindPow:
		b, m := k.args[0], k.args[1]
		out := m.Mul(b.Diff(name)).over(b)
		if dm := m.Diff(name); !dm.IsZero() {
			l, err := r.log(b)
			if err != nil {
				l = r.call("log", AnyReal, b)
			}
			out = out.Add(dm.Mul(l))
		}
		return out
	case kindRoot:
		return k.base.Diff(name).over(k.base)
	case kindFunc:
		out := r.zero
		f := r.funcs[k.name]
		for i, a := range k.args {
			da := a.Diff(name)
			if da.IsZero() {
				continue
			}
			d := append([]int(nil), k.deriv...)
			d[i]++
			out = out.Add(r.kernelExpr(r.funcKernel(f, d, k.args)).Mul(da))
		}
		return out
	case kindIntegral:
		f, lo, hi := k.args[0], k.args[1], k.args[2]
		out := r.zero
		if name != k.name {
			out = r.Integral(f.Diff(name), k.name, lo, hi)
		}
		for i, b := range []Expr{hi, lo} {
			db := b.Diff(name)
			if db.IsZero() {
				continue
			}
			v, err := f.Subs(map[string]Expr{k.name: b})
			if err != nil {
				panic(err)
			}
			if i == 1 {
				v = v.Neg()
			}
			out = out.Add(v.Mul(db))
		}
		return out
	}
	return r.diffCall(k, name)
}

func (r *Ring) diffCall(k *kernel, name string) Expr {
	u := k.args[len(k.args)-1]
	du := u.Diff(name)
	switch k.name {
	case "log":
		return du.over(u)
	case "abs":
		return du.over(u) // k'/k
	case "sign":
		return r.zero
	case "erf":
		// 2/sqrt(pi) exp(-u^2)
		e, err := r.exp(u.Mul(u).Neg())
		if err != nil {
			panic(err)
		}
		return e.Mul(r.Int(2)).Mul(r.Pi().mustPow(expo{-1, 2})).Mul(du)
	case "gamma":
		return r.kernelExpr(k).Mul(r.call("polygamma", AnyReal, r.zero, u)).Mul(du)
	case "polygamma":
		return r.call("polygamma", AnyReal, k.args[0].Add(r.unit), u).Mul(du)
	case "besseli":
		n := k.args[0]
		if n.IsZero() {
			return r.call("besseli", u.Sign(), r.unit, u).Mul(du)
		}
		// I_n' = I_{n-1} - n/z I_n (Abramowitz and Stegun 9.6.26)
		lower, err := r.besselI(n.Sub(r.unit), u)
		if err != nil {
			panic(err)
		}
		return lower.Sub(n.over(u).Mul(r.kernelExpr(k))).Mul(du)
	}
	panic(fmt.Errorf("algebra: no derivative of %s", k.name))
}

// Subs replaces symbols by expressions, also inside the arguments of named
// functions.
func (e Expr) Subs(with map[string]Expr) (Expr, error) {
	return e.rebuild(func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error) {
		if k.kind == kindSymbol {
			v, ok := with[k.name]
			return v, ok, nil
		}
		touched := false
		for _, s := range k.syms {
			if _, ok := with[s]; ok {
				touched = true
			}
		}
		if !touched {
			return e.n.r.kernelExpr1(k), true, nil
		}
		return Expr{}, false, nil
	})
}

// SubsFunc replaces named functions and their derivatives by formulas.
func (e Expr) SubsFunc(defs map[string]FuncDef) (Expr, error) {
	r := e.n.r
	return e.rebuild(func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error) {
		if k.kind == kindSymbol {
			return r.kernelExpr(k), true, nil
		}
		if k.kind != kindFunc {
			return Expr{}, false, nil
		}
		d, ok := defs[k.name]
		if !ok {
			return Expr{}, false, nil
		}
		body := d.Body
		with := map[string]Expr{}
		for i, a := range d.Args {
			body = body.DiffN(a, k.deriv[i])
			v, err := sub(k.args[i])
			if err != nil {
				return Expr{}, false, err
			}
			with[a] = v
		}
		v, err := body.Subs(with)
		if err != nil {
			return Expr{}, false, err
		}
		// A formula may itself use named functions.
		v, err = v.SubsFunc(defs)
		return v, true, err
	})
}

type replaceFunc func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error)

// rebuild evaluates e anew with kernels replaced: f returns the new value of
// the kernel's first power (for roots: of the base), or false to have the
// arguments rebuilt.
func (e Expr) rebuild(f replaceFunc) (out Expr, err error) {
	defer func() {
		if x := recover(); x != nil {
			er, ok := x.(error)
			if !ok {
				panic(x)
			}
			err = er
		}
	}()
	memo := map[*kernel]Expr{}
	var sub func(e Expr) (Expr, error)
	value := func(k *kernel) (Expr, error) {
		if v, ok := memo[k]; ok {
			return v, nil
		}
		v, done, err := f(k, sub)
		if err != nil {
			return Expr{}, err
		}
		if !done {
			v, err = e.n.r.rebuildKernel(k, sub)
			if err != nil {
				return Expr{}, err
			}
		}
		memo[k] = v
		return v, nil
	}
	poly := func(p poly) (Expr, error) {
		r := e.n.r
		sum := r.zero
		for _, t := range p {
			prod := r.coefExpr(t.c)
			for _, q := range t.m.p {
				v, err := value(q.k)
				if err != nil {
					return Expr{}, err
				}
				var w Expr
				switch {
				case v.Equal(r.kernelExpr1(q.k)):
					w = r.kernelPower(q.k, q.e)
				case q.k.kind == kindCis && q.e.d != 1:
					w, err = sub(q.k.args[0])
					if err == nil {
						w, err = r.exp(w.Mul(r.coefExpr(coefI.mul(coefRat(q.e.rat())))))
					}
				default:
					w, err = v.powRational(q.e.rat())
				}
				if err != nil {
					return Expr{}, err
				}
				prod = prod.Mul(w)
			}
			sum = sum.Add(prod)
		}
		return sum, nil
	}
	sub = func(e Expr) (Expr, error) {
		num, err := poly(e.n.num)
		if err != nil {
			return Expr{}, err
		}
		for _, d := range e.n.den {
			g, err := poly(d.f.p)
			if err != nil {
				return Expr{}, err
			}
			if g.IsZero() {
				return Expr{}, ErrDivisionByZero
			}
			num = num.over(g.powNat(d.e))
		}
		return num, nil
	}
	return sub(e)
}

// rebuildKernel makes the kernel anew from rebuilt arguments.
func (r *Ring) rebuildKernel(k *kernel, sub func(Expr) (Expr, error)) (Expr, error) {
	args := make([]Expr, len(k.args))
	for i, a := range k.args {
		if k.kind == kindIntegral && i == 0 {
			continue
		}
		v, err := sub(a)
		if err != nil {
			return Expr{}, err
		}
		args[i] = v
	}
	switch k.kind {
	case kindPrime, kindSymbol:
		return r.kernelExpr1(k), nil
	case kindExp:
		return r.exp(args[0])
	case kindCis:
		return r.exp(args[0].Mul(r.coefExpr(coefI)))
	case kindPow:
		return args[0].Pow(args[1])
	case kindRoot:
		return args[0], nil
	case kindFunc:
		return r.kernelExpr(r.funcKernel(r.funcs[k.name], k.deriv, args)), nil
	case kindIntegral:
		// The dummy is bound: substitute in the integrand with it left alone.
		f, err := sub(k.args[0])
		if err != nil {
			return Expr{}, err
		}
		return r.Integral(f, k.name, args[1], args[2]), nil
	}
	return r.Call(k.name, args...)
}

// Factor is one summand of a decomposition: coef times fn, where fn is made
// of the selected kernels only.
type Factor struct {
	Coef Expr
	Fn   Expr
}

type splitTerm struct {
	coef Expr
	fn   Expr
}

// SplitBy writes e as a sum of coef*fn where fn depends on the given symbols
// and coef does not; the functions are products of kernels (and of
// denominator factors) and pairwise different, in structural order.
func (e Expr) SplitBy(names ...string) []Factor {
	in := func(k *kernel) bool {
		for _, n := range names {
			if k.dependsOn(n) {
				return true
			}
		}
		return false
	}
	ts := e.splitBy(in)
	out := make([]Factor, len(ts))
	for i, t := range ts {
		out[i] = Factor{t.coef, t.fn}
	}
	return out
}

func (e Expr) splitBy(in func(*kernel) bool) []splitTerm {
	r := e.n.r
	inner, outer := r.unit, r.unit
	for _, f := range e.n.den {
		g := Expr{&node{r: r, num: poly{{r.one, coefOne}}, den: []denFactor{f}}}
		hit := false
		for _, k := range f.f.p.kernels() {
			hit = hit || in(k)
		}
		if hit {
			inner = inner.Mul(g)
		} else {
			outer = outer.Mul(g)
		}
	}
	groups := map[*mono]*accumulator{}
	var order []*mono
	for _, t := range e.n.num {
		var a, b []power
		for _, q := range t.m.p {
			if in(q.k) {
				a = append(a, q)
			} else {
				b = append(b, q)
			}
		}
		m := r.internMono(a)
		acc, ok := groups[m]
		if !ok {
			acc = r.accumulate(4)
			groups[m] = acc
			order = append(order, m)
		}
		acc.add(r.internMono(b), t.c)
	}
	out := make([]splitTerm, 0, len(order))
	for _, m := range order {
		fn := r.fromPoly(poly{{m, coefOne}}).Mul(inner)
		out = append(out, splitTerm{r.fromPoly(groups[m].poly()).Mul(outer), fn})
	}
	return out
}

// ReduceSquare rewrites name^2 as value wherever name occurs polynomially;
// it serves relations such as c^2 = 1 - a^2 - b^2 on the unit sphere.
func (e Expr) ReduceSquare(name string, value Expr) Expr {
	r := e.n.r
	k, ok := r.symbols[name]
	if !ok {
		return e
	}
	reduce := func(p poly) Expr {
		exps, cs := r.split(p, k)
		out := r.zero
		for i, x := range exps {
			t := r.fromPoly(cs[i])
			n := int(x.floor())
			if n >= 2 {
				t = t.Mul(value.powNat(n / 2))
				x = x.sub(expo{int32(n / 2 * 2), 1})
			}
			out = out.Add(t.Mul(r.kernelPower(k, x)))
		}
		return out
	}
	if len(e.n.num) == 0 {
		return e
	}
	out := reduce(e.n.num)
	for _, f := range e.n.den {
		d := reduce(f.f.p)
		if d.IsZero() {
			return e
		}
		out = out.over(d.powNat(f.e))
	}
	return out
}

// DropAbs replaces absolute values by their arguments.
func (e Expr) DropAbs() (Expr, error) {
	return e.rebuild(func(k *kernel, sub func(Expr) (Expr, error)) (Expr, bool, error) {
		if k.kind == kindCall && k.name == "abs" {
			v, err := sub(k.args[0])
			return v, true, err
		}
		return Expr{}, false, nil
	})
}
