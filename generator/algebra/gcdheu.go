package algebra

import "math/big"

// maxHeuristicBits bounds the integers of the heuristic gcd.
const maxHeuristicBits = 1 << 17

// gcdHeuristic is the gcd by evaluation at large integers, one kernel after
// the other, and reconstruction in symmetric remainders; a candidate counts
// only when it divides both polynomials, which proves it to be the gcd (B.W.
// Char, K.O. Geddes, G.H. Gonnet, J. Symb. Comp. 7 (1989) 31). ok is false for
// complex coefficients, where the integers outgrow their bound, or where a few
// evaluation points do not suffice.
func (r *Ring) gcdHeuristic(a, b poly) (poly, bool) {
	if !isRealPoly(a) || !isRealPoly(b) {
		return nil, false
	}
	g, ok := r.gcdHeu(a, b, unionKernels(a, b), exponentDens(a, b))
	if !ok {
		return nil, false
	}
	return r.prim(g), true
}

func unionKernels(a, b poly) []*kernel {
	out := a.kernels()
	seen := map[*kernel]bool{}
	for _, k := range out {
		seen[k] = true
	}
	for _, k := range b.kernels() {
		if !seen[k] {
			out = append(out, k)
		}
	}
	return out
}

// gcdHeu works on polynomials with integer coefficients and returns their
// gcd over the integers, content included.
func (r *Ring) gcdHeu(a, b poly, vars []*kernel, den map[*kernel]int32) (poly, bool) {
	ca, cb := numContent(a).re.abs(), numContent(b).re.abs()
	c := ratGCD(ca, cb)
	if len(vars) == 0 {
		return poly{{r.one, coefRat(c)}}, true
	}
	x := vars[0]
	a, b = a.scale(coefRat(ca.inv())), b.scale(coefRat(cb.inv()))
	deg := max(a.intDegree(x, den[x]), b.intDegree(x, den[x]))
	if deg == 0 {
		g, ok := r.gcdHeu(a, b, vars[1:], den)
		return g.scale(coefRat(c)), ok
	}
	xi := a.maxCoef()
	if m := b.maxCoef(); m.Cmp(xi) < 0 {
		xi = m
	}
	xi = new(big.Int).Add(new(big.Int).Lsh(xi, 1), big.NewInt(29))
	for range 6 {
		if deg*xi.BitLen() > maxHeuristicBits {
			return nil, false
		}
		av, bv := r.evalInt(a, x, den[x], xi), r.evalInt(b, x, den[x], xi)
		if len(av) > 0 && len(bv) > 0 {
			gv, ok := r.gcdHeu(av, bv, vars[1:], den)
			if !ok {
				return nil, false
			}
			g := r.interpolateInt(gv, x, den[x], xi)
			g = g.scale(coefRat(numContent(g).re.inv()))
			if _, ok := r.divExact(a, g); ok {
				if _, ok := r.divExact(b, g); ok {
					return g.scale(coefRat(c)), true
				}
			}
		}
		xi.Mul(xi, big.NewInt(73794))
		xi.Quo(xi, big.NewInt(27011))
	}
	return nil, false
}

// intDegree is the degree in x^(1/den).
func (p poly) intDegree(x *kernel, den int32) int {
	d := p.degree(x)
	return int(int64(d.n) * int64(den) / int64(d.d))
}

func (p poly) maxCoef() *big.Int {
	m := new(big.Int)
	for _, t := range p {
		if n := t.c.re.num(); n.CmpAbs(m) > 0 {
			m = n
		}
	}
	return new(big.Int).Abs(m)
}

// evalInt puts the integer xi in place of x^(1/den).
func (r *Ring) evalInt(p poly, x *kernel, den int32, xi *big.Int) poly {
	pows := map[int]rat{}
	acc := map[*mono]coef{}
	for _, t := range p {
		e := t.m.degree(x)
		n := int(int64(e.n) * int64(den) / int64(e.d))
		v, ok := pows[n]
		if !ok {
			v = fromBig(new(big.Rat).SetInt(new(big.Int).Exp(xi, big.NewInt(int64(n)), nil)))
			pows[n] = v
		}
		m := t.m
		if n != 0 {
			m = r.monoWithout(m, x)
		}
		c := coefRat(t.c.re.mul(v))
		if old, ok := acc[m]; ok {
			c = old.add(c)
		}
		acc[m] = c
	}
	r.spend(len(p))
	return (&accumulator{r, acc}).poly()
}

// interpolateInt writes every coefficient in base xi with digits of least
// absolute value: digit i belongs to x^(i/den).
func (r *Ring) interpolateInt(p poly, x *kernel, den int32, xi *big.Int) poly {
	half := new(big.Int).Rsh(xi, 1)
	acc := map[*mono]coef{}
	for _, t := range p {
		n := new(big.Int).Set(t.c.re.num())
		for i := int64(0); n.Sign() != 0; i++ {
			d := new(big.Int)
			n.DivMod(n, xi, d)
			if d.Cmp(half) > 0 {
				d.Sub(d, xi)
				n.Add(n, big.NewInt(1))
			}
			if d.Sign() != 0 {
				m := r.monoMul(t.m, r.kernelMono(x, mkExpo(i, int64(den))))
				acc[m] = coefRat(fromBig(new(big.Rat).SetInt(d)))
			}
		}
	}
	return (&accumulator{r, acc}).poly()
}
