package algebra

import "sort"

// polyFactor is a factor with its multiplicity.
type polyFactor struct {
	p poly
	e int
}

// splitPoly factors a primitive polynomial as far as contents, square-free
// parts and discriminants of quadratics go. That is not a full factorisation;
// it is a deterministic one, and the factors are pairwise coprime.
func (r *Ring) splitPoly(p poly) []polyFactor {
	var out []polyFactor
	for _, f := range r.splitOnce(p) {
		out = r.mergeFactor(out, f)
	}
	sort.SliceStable(out, func(i, j int) bool {
		if len(out[i].p) != len(out[j].p) {
			return len(out[i].p) < len(out[j].p)
		}
		return out[i].p.key() < out[j].p.key()
	})
	return out
}

func (r *Ring) mergeFactor(fs []polyFactor, f polyFactor) []polyFactor {
	for i := range fs {
		if fs[i].p.equal(f.p) {
			fs[i].e += f.e
			return fs
		}
	}
	return append(fs, f)
}

func (r *Ring) splitOnce(p poly) []polyFactor {
	if p.isConst() {
		return nil
	}
	if len(p) > 400 {
		return []polyFactor{{p, 1}}
	}
	ks := p.kernels()
	for _, k := range ks {
		c := r.gcdList(r.coefficients(p, []*kernel{k}))
		if len(c) > 1 {
			q, ok := r.divExact(p, c)
			if ok && !q.isConst() {
				return append(r.splitOnce(c), r.splitOnce(r.prim(q))...)
			}
		}
	}
	// Content-free in every kernel from here on; a kernel of degree one
	// makes p irreducible.
	var quad *kernel
	den := exponentDens(p)
	var main *kernel
	for _, k := range ks {
		if k.algebraic {
			continue
		}
		if main == nil {
			main = k
		}
		d := p.degree(k)
		n := int(d.n) * int(den[k]) / int(d.d)
		if n == 1 {
			return []polyFactor{{p, 1}}
		}
		if n == 2 && quad == nil {
			quad = k
		}
	}
	if quad != nil {
		return r.splitQuadratic(p, quad, den[quad])
	}
	if main == nil {
		return []polyFactor{{p, 1}}
	}
	return r.squareFree(p, main, den[main])
}

// splitQuadratic factors a t^2 + b t + c with t = k^(1/den) when its
// discriminant is a square.
func (r *Ring) splitQuadratic(p poly, k *kernel, den int32) []polyFactor {
	v := r.dense(p, k, den)
	a, b, c := v[2], v[1], v[0]
	disc := subPoly(r.mulPoly(b, b), r.mulPoly(a, c).scale(coefInt(4)))
	s, ok := r.sqrtPoly(disc)
	if !ok {
		return []polyFactor{{p, 1}}
	}
	two := a.scale(coefInt(2))
	f := r.prim(r.undense([]poly{addPoly(b, s), two}, k, den))
	g := r.prim(r.undense([]poly{subPoly(b, s), two}, k, den))
	// f and g carry contents that the product does not have.
	var out []polyFactor
	for _, q := range []poly{f, g} {
		if ct := r.gcdList(r.coefficients(q, []*kernel{k})); len(ct) > 1 {
			q, _ = r.divExact(q, ct)
			q = r.prim(q)
		}
		out = r.mergeFactor(out, polyFactor{q, 1})
	}
	prod := poly{{r.one, coefOne}}
	for _, q := range out {
		prod = r.mulPoly(prod, r.powPoly(q.p, q.e))
	}
	if !r.prim(prod).equal(p) {
		return []polyFactor{{p, 1}}
	}
	return out
}

// squareFree splits off repeated factors by gcd with the derivative in k.
func (r *Ring) squareFree(p poly, k *kernel, den int32) []polyFactor {
	v := r.dense(p, k, den)
	dv := make([]poly, 0, len(v))
	for i := 1; i < len(v); i++ {
		dv = append(dv, v[i].scale(coefInt(int64(i))))
	}
	d := r.undense(dv, k, den)
	if len(d) == 0 {
		return []polyFactor{{p, 1}}
	}
	g := r.gcdPoly(p, r.prim(d))
	if len(g) <= 1 {
		return []polyFactor{{p, 1}}
	}
	q, ok := r.divExact(p, g)
	if !ok {
		return []polyFactor{{p, 1}}
	}
	return r.coprimeFactors(append(r.splitOnce(r.prim(q)), r.splitOnce(g)...))
}

// coprimeFactors rewrites a product over pairwise coprime factors: of f^2 h
// the square-free part is f h, which shares f with the rest.
func (r *Ring) coprimeFactors(fs []polyFactor) []polyFactor {
	for i := 0; i < len(fs); i++ {
		for j := 0; j < i; j++ {
			if fs[i].p.equal(fs[j].p) {
				fs[j].e += fs[i].e
				return r.coprimeFactors(append(fs[:i:i], fs[i+1:]...))
			}
			g := r.gcdPoly(fs[i].p, fs[j].p)
			if len(g) <= 1 {
				continue
			}
			out := append(append(fs[:j:j], fs[j+1:i]...), fs[i+1:]...)
			out = append(out, polyFactor{g, fs[i].e + fs[j].e})
			for _, f := range []polyFactor{fs[i], fs[j]} {
				q, ok := r.divExact(f.p, g)
				if !ok {
					panic("algebra: a gcd does not divide")
				}
				if q = r.prim(q); len(q) > 1 {
					out = append(out, polyFactor{q, f.e})
				}
			}
			return r.coprimeFactors(out)
		}
	}
	return fs
}

// sqrtPoly returns s with s^2 = p, if p is a square of a polynomial with
// rational coefficients (or rational multiples of square roots of primes).
func (r *Ring) sqrtPoly(p poly) (poly, bool) {
	if len(p) == 0 {
		return nil, true
	}
	// Leading term by leading term, as in long-hand square roots.
	lead, ok := r.sqrtTerm(p[0])
	if !ok {
		return nil, false
	}
	s := poly{lead}
	linv := r.invPolyTerm(term{lead.m, lead.c.mul(coefInt(2))})
	for step := 0; step < 200; step++ {
		rem := subPoly(p, r.mulPoly(s, s))
		if len(rem) == 0 {
			return s, true
		}
		t := term{r.monoMul(rem[0].m, linv.m), rem[0].c.mul(linv.c)}
		for _, q := range t.m.p {
			if q.e.n < 0 {
				return nil, false
			}
		}
		if t.m.needs || compareMono(t.m, s[len(s)-1].m) >= 0 {
			return nil, false
		}
		s = append(s, t)
	}
	return nil, false
}

func (r *Ring) invPolyTerm(t term) term { return term{r.monoInvRaw(t.m), t.c.inv()} }

func (r *Ring) sqrtTerm(t term) (term, bool) {
	if !t.c.isReal() || t.c.re.sign() <= 0 {
		return term{}, false
	}
	c, ok := sqrtRat(t.c.re)
	if !ok {
		return term{}, false
	}
	p := make([]power, len(t.m.p))
	for i, q := range t.m.p {
		if q.k.algebraic {
			return term{}, false
		}
		e := q.e
		if e.n%2 != 0 {
			return term{}, false
		}
		p[i] = power{q.k, mkExpo(int64(e.n), 2*int64(e.d))}
	}
	return term{r.internMono(p), coefRat(c)}, true
}
