package algebra

// realParts multiplies numerator and denominator by units so that both are
// real when they contain exp(i m).
func (b *former) realParts(e Expr) (poly, []polyFactor, bool) {
	r := b.r
	den := make([]polyFactor, len(e.n.den))
	trig := hasCis(e.n.num)
	for i, f := range e.n.den {
		den[i] = polyFactor{f.f.p, f.e}
		trig = trig || hasCis(f.f.p) || !isRealPoly(f.f.p)
	}
	if !trig {
		for _, t := range e.n.num {
			if !t.c.isReal() {
				return nil, nil, false
			}
		}
		return e.n.num, den, true
	}
	x := e
	var out []polyFactor
	done := map[string]bool{}
	for _, f := range den {
		if isRealPoly(f.p) && !hasCis(f.p) {
			out = append(out, f)
			x = x.Mul(r.fromPoly(f.p).powNat(f.e))
			continue
		}
		if s, ok := r.symmetrise(f.p); ok {
			out = append(out, polyFactor{s, f.e})
			x = x.Mul(r.fromPoly(s).powNat(f.e))
			continue
		}
		// A factor and its conjugate, such as D + i omega and D - i omega,
		// make a real one together.
		if done[f.p.key()] {
			continue
		}
		conj := r.prim(r.conjPoly(f.p))
		for _, g := range den {
			if g.p.equal(conj) {
				done[conj.key()] = true
				f.e = max(f.e, g.e)
			}
		}
		s, ok := r.symmetrise(r.mulPoly(f.p, conj))
		if !ok {
			return nil, nil, false
		}
		out = append(out, polyFactor{s, f.e})
		x = x.Mul(r.fromPoly(s).powNat(f.e))
	}
	if len(x.n.den) > 0 || !r.conjPoly(x.n.num).equal(x.n.num) {
		return nil, nil, false
	}
	return x.n.num, out, true
}

func isRealPoly(p poly) bool {
	for _, t := range p {
		if !t.c.isReal() {
			return false
		}
	}
	return true
}

// complex prints real and imaginary parts; no result of a real model is
// complex, so it serves intermediate steps only.
func (b *former) complex(e Expr, depth int) *Form {
	r := b.r
	var den []*Form
	for _, f := range e.n.den {
		den = append(den, b.power(b.sum(f.f.p, depth+1, true), r.Int(int64(f.e)), depth))
	}
	var ts []*Form
	for _, t := range e.n.num {
		m := b.product(t.m, ratOne, depth)
		if !t.c.re.isZero() {
			ts = append(ts, b.scaled(t.c.re, m))
		}
		if !t.c.im.isZero() {
			ts = append(ts, b.scaled(t.c.im, productForm([]*Form{{Op: FormImag}, m})))
		}
	}
	return quotientForm([]*Form{sumForm(ts)}, den)
}

func (b *former) scaled(c rat, f *Form) *Form {
	g := f
	if !c.abs().isOne() {
		g = productForm([]*Form{numForm(c.abs()), f})
	}
	if c.sign() < 0 {
		return negForm(g)
	}
	return g
}

// hyperbolic turns exponentials of both signs into hyperbolic sines and
// cosines.
func (b *former) hyperbolic(p poly) (poly, bool) {
	r := b.r
	found := false
	for k, mixed := range bothSigns(p, func(*kernel) bool { return true }) {
		if !mixed {
			continue
		}
		found = true
		acc := r.accumulate(len(p))
		for _, t := range p {
			e := t.m.degree(k)
			if e.isZero() {
				acc.add(t.m, t.c)
				continue
			}
			m := r.monoWithout(t.m, k)
			s := t.c
			if e.n < 0 {
				e, s = e.neg(), s.neg()
			}
			angle := k.args[0].Mul(r.ratExpr(e.rat()))
			if angle.leadsNegative() {
				angle, s = angle.Neg(), s.neg()
			}
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cosh", angle), expo{1, 1})), t.c)
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sinh", angle), expo{1, 1})), s)
		}
		p = acc.poly()
	}
	return p, found
}

// trigSum turns conjugate pairs of exp(i m) back into sines and cosines: of
// sums of angles, or products over the separate angles, whichever is shorter.
func (b *former) trigSum(p poly) *Form {
	x := b.expanded(b.trigAngles(p))
	if y, ok := b.trigProducts(p); ok {
		x = shorter(x, b.expanded(y))
	}
	return x
}

func (r *Ring) trigKernel(name string, angle Expr) *kernel {
	return r.intern(&kernel{kind: kindTrig, name: name, args: []Expr{angle}})
}

// trigAngles writes a real Laurent polynomial in exp(i m) with sines and
// cosines of combined angles.
func (b *former) trigAngles(p poly) poly {
	r := b.r
	acc := r.accumulate(len(p))
	for _, t := range p {
		var rest []power
		angle := r.zero
		for _, q := range t.m.p {
			if q.k.kind == kindCis {
				angle = angle.Add(q.k.args[0].Mul(r.ratExpr(q.e.rat())))
			} else {
				rest = append(rest, q)
			}
		}
		m := r.internMono(rest)
		if angle.IsZero() {
			acc.add(m, t.c)
			continue
		}
		// c e^{ia} + conj(c) e^{-ia}: each of the two gives half.
		re, im := t.c.re, t.c.im
		if angle.leadsNegative() {
			angle, im = angle.Neg(), im.neg()
		}
		if !re.isZero() {
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cos", angle), expo{1, 1})), coefRat(re))
		}
		if !im.isZero() {
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sin", angle), expo{1, 1})), coefRat(im.neg()))
		}
	}
	return acc.poly()
}

// trigProducts does the same one angle at a time, which keeps products such
// as sin(a)*cos(b).
func (b *former) trigProducts(p poly) (poly, bool) {
	r := b.r
	var cis []*kernel
	for _, k := range p.kernels() {
		if k.kind == kindCis {
			cis = append(cis, k)
		}
	}
	if len(cis) < 2 || len(cis) > 4 {
		return nil, false
	}
	for _, k := range cis {
		acc := r.accumulate(len(p))
		for _, t := range p {
			e := t.m.degree(k)
			m := r.monoWithout(t.m, k)
			if e.isZero() {
				acc.add(m, t.c)
				continue
			}
			angle := k.args[0].Mul(r.ratExpr(e.rat()))
			s := coefOne
			if angle.leadsNegative() {
				angle, s = angle.Neg(), s.neg()
			}
			// e^{ia} = cos a + i sin a
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("cos", angle), expo{1, 1})), t.c)
			acc.add(r.monoMul(m, r.kernelMono(r.trigKernel("sin", angle), expo{1, 1})), t.c.mul(coefI).mul(s))
		}
		p = acc.poly()
	}
	for _, t := range p {
		if !t.c.isReal() {
			return nil, false
		}
	}
	return p, true
}
