package algebra

import (
	"math/big"
	"slices"
	"sort"
	"strings"
)

// term is coefficient times monomial.
type term struct {
	m *mono
	c coef
}

// poly is a Laurent polynomial in the kernels: terms in descending order of
// compareMono, no zero coefficient, every algebraic kernel in range.
type poly []term

func (p poly) isZero() bool { return len(p) == 0 }

func (p poly) isConst() bool { return len(p) == 0 || len(p) == 1 && p[0].m.isOne() }

func (p poly) isOne() bool { return len(p) == 1 && p[0].m.isOne() && p[0].c.isOne() }

func (p poly) equal(q poly) bool {
	if len(p) != len(q) {
		return false
	}
	for i := range p {
		if p[i].m != q[i].m || !p[i].c.equal(q[i].c) {
			return false
		}
	}
	return true
}

func (p poly) neg() poly {
	out := make(poly, len(p))
	for i, t := range p {
		out[i] = term{t.m, t.c.neg()}
	}
	return out
}

func (p poly) scale(c coef) poly {
	if c.isOne() {
		return p
	}
	if c.isZero() {
		return nil
	}
	out := make(poly, len(p))
	for i, t := range p {
		out[i] = term{t.m, t.c.mul(c)}
	}
	return out
}

func addPoly(a, b poly) poly {
	if len(a) == 0 {
		return b
	}
	if len(b) == 0 {
		return a
	}
	out := make(poly, 0, len(a)+len(b))
	i, j := 0, 0
	for i < len(a) && j < len(b) {
		switch c := compareMono(a[i].m, b[j].m); {
		case c > 0:
			out = append(out, a[i])
			i++
		case c < 0:
			out = append(out, b[j])
			j++
		default:
			if s := a[i].c.add(b[j].c); !s.isZero() {
				out = append(out, term{a[i].m, s})
			}
			i, j = i+1, j+1
		}
	}
	out = append(out, a[i:]...)
	return append(out, b[j:]...)
}

func subPoly(a, b poly) poly { return addPoly(a, b.neg()) }

// accumulator gathers terms by monomial.
type accumulator struct {
	r *Ring
	m map[*mono]coef
}

func (r *Ring) accumulate(n int) *accumulator {
	return &accumulator{r, make(map[*mono]coef, n)}
}

func (a *accumulator) add(m *mono, c coef) {
	if m.needs {
		for _, t := range a.r.reduceMono(m) {
			a.add(t.m, t.c.mul(c))
		}
		return
	}
	if old, ok := a.m[m]; ok {
		a.m[m] = old.add(c)
		return
	}
	a.m[m] = c
}

func (a *accumulator) addPoly(p poly, c coef) {
	for _, t := range p {
		a.add(t.m, t.c.mul(c))
	}
}

func (a *accumulator) poly() poly {
	out := make(poly, 0, len(a.m))
	for m, c := range a.m {
		if !c.isZero() {
			out = append(out, term{m, c})
		}
	}
	slices.SortFunc(out, func(s, t term) int { return compareMono(t.m, s.m) })
	return out
}

// reduceMono rewrites a monomial some of whose algebraic kernels are out of
// range: k^(period+e) becomes base * k^e. Negative exponents of roots are
// raised by the same relation only where the base is a number; the caller
// clears the others by putting the base into the denominator.
func (r *Ring) reduceMono(m *mono) poly {
	if m.reduced != nil {
		return m.reduced
	}
	out := poly{{r.one, coefOne}}
	var rest []power
	for _, q := range m.p {
		if !q.k.algebraic {
			rest = append(rest, q)
			continue
		}
		n := floorDiv(int64(q.e.n), int64(q.e.d)*int64(q.k.period))
		e := q.e.sub(mkExpo(n*int64(q.k.period), 1))
		if !e.isZero() {
			rest = append(rest, power{q.k, e})
		}
		if n == 0 {
			continue
		}
		switch {
		case q.k.kind == kindPrime:
			b := new(big.Rat).SetInt(new(big.Int).Exp(big.NewInt(q.k.prime), big.NewInt(abs64(n)), nil))
			if n < 0 {
				b.Inv(b)
			}
			out = out.scale(coefRat(fromBig(b)))
		case n > 0:
			b := q.k.base.n.num
			for ; n > 0; n-- {
				out = r.mulPoly(out, b)
			}
		default:
			panic(errNegativeRoot)
		}
	}
	mm := r.internMono(rest)
	if mm.needs {
		panic("algebra: monomial still out of range")
	}
	out = r.mulTerm(out, term{mm, coefOne})
	m.reduced = out
	return out
}

func abs64(n int64) int64 {
	if n < 0 {
		return -n
	}
	return n
}

// mulTerm multiplies by a single term.
func (r *Ring) mulTerm(p poly, t term) poly {
	if t.m.isOne() {
		return p.scale(t.c)
	}
	r.spend(len(p))
	out := make(poly, len(p))
	needs := false
	for i, s := range p {
		m := r.monoMul(s.m, t.m)
		needs = needs || m.needs
		out[i] = term{m, s.c.mul(t.c)}
	}
	if !needs {
		return out // the order is compatible with multiplication
	}
	acc := r.accumulate(len(out))
	acc.addPoly(out, coefOne)
	return acc.poly()
}

func (r *Ring) mulPoly(a, b poly) poly {
	if len(a) == 0 || len(b) == 0 {
		return nil
	}
	if len(a) == 1 {
		return r.mulTerm(b, a[0])
	}
	if len(b) == 1 {
		return r.mulTerm(a, b[0])
	}
	if len(a)*len(b) > maxProduct {
		panic(errTooLarge)
	}
	r.spend(len(a) * len(b))
	acc := r.accumulate(len(a) * len(b) / 2)
	for _, s := range a {
		for _, t := range b {
			acc.add(r.monoMul(s.m, t.m), s.c.mul(t.c))
		}
	}
	return acc.poly()
}

func (r *Ring) powPoly(a poly, n int) poly {
	out := poly{{r.one, coefOne}}
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			out = r.mulPoly(out, a)
		}
		if n > 1 {
			a = r.mulPoly(a, a)
		}
	}
	return out
}

// monoContent is the monomial gcd of all terms.
func (r *Ring) monoContent(p poly) *mono {
	if len(p) == 0 {
		return r.one
	}
	g := p[0].m
	for _, t := range p[1:] {
		g = r.monoGCD(g, t.m)
	}
	return g
}

// divMono divides every term by m. Algebraic kernels must not be in m with
// exponents above those of the terms.
func (r *Ring) divMono(p poly, m *mono) poly {
	if m.isOne() {
		return p
	}
	inv := r.monoInvRaw(m)
	out := make(poly, len(p))
	for i, t := range p {
		out[i] = term{r.monoMul(t.m, inv), t.c}
	}
	return out
}

func (r *Ring) monoInvRaw(m *mono) *mono {
	p := make([]power, len(m.p))
	for i, q := range m.p {
		p[i] = power{q.k, q.e.neg()}
	}
	return r.internMono(p)
}

// numContent is the c in Q(i) for which p/c is primitive over Z[i] with its
// leading coefficient in the half-open first quadrant.
func numContent(p poly) coef {
	if len(p) == 0 {
		return coefOne
	}
	real := true
	small := true
	for _, t := range p {
		if !t.c.isReal() {
			real = false
		}
		if t.c.re.big != nil || t.c.im.big != nil {
			small = false
		}
	}
	if real {
		var q rat
		if small {
			g, l := int64(0), int64(1)
			for _, t := range p {
				g = gcd64(g, t.c.re.n)
				ll := l / gcd64(l, t.c.re.d)
				v, ok := mulFits(ll, t.c.re.d)
				if !ok {
					small = false
					break
				}
				l = v
			}
			if small {
				q = normRat(g, l)
			}
		}
		if !small {
			g, l := new(big.Int), big.NewInt(1)
			for _, t := range p {
				g.GCD(nil, nil, g, new(big.Int).Abs(t.c.re.num()))
				d := t.c.re.den()
				h := new(big.Int).GCD(nil, nil, l, d)
				l = new(big.Int).Mul(l, new(big.Int).Quo(d, h))
			}
			q = fromBig(new(big.Rat).SetFrac(g, l))
		}
		if p[0].c.re.sign() < 0 {
			q = q.neg()
		}
		return coefRat(q)
	}
	return gaussContent(p)
}

func gaussContent(p poly) coef {
	l := big.NewInt(1)
	for _, t := range p {
		for _, d := range []*big.Int{t.c.re.den(), t.c.im.den()} {
			h := new(big.Int).GCD(nil, nil, l, d)
			l = new(big.Int).Mul(l, new(big.Int).Quo(d, h))
		}
	}
	lr := coefRat(fromBig(new(big.Rat).SetInt(l)))
	g := coefZero
	for _, t := range p {
		g = gaussGCD(g, t.c.mul(lr))
	}
	c := g.mul(lr.inv())
	for k := 0; k < 4; k++ {
		q := p[0].c.mul(c.inv())
		if q.re.sign() > 0 && q.im.sign() >= 0 {
			break
		}
		c = c.mul(coefI)
	}
	return c
}

// primitive splits p into content, monomial content and primitive part.
func (r *Ring) primitive(p poly) (coef, *mono, poly) {
	m := r.monoContent(p)
	q := r.divMono(p, m)
	c := numContent(q)
	return c, m, q.scale(c.inv())
}

// kernels of p in structural order.
func (p poly) kernels() []*kernel {
	seen := map[*kernel]bool{}
	var out []*kernel
	for _, t := range p {
		for _, q := range t.m.p {
			if !seen[q.k] {
				seen[q.k] = true
				out = append(out, q.k)
			}
		}
	}
	sort.Slice(out, func(i, j int) bool { return compareKernels(out[i], out[j]) < 0 })
	return out
}

func (p poly) degree(k *kernel) expo {
	d := expo{0, 1}
	for i, t := range p {
		if e := t.m.degree(k); i == 0 || e.cmp(d) > 0 {
			d = e
		}
	}
	return d
}

// key is a canonical text of the polynomial.
func (p poly) key() string {
	var b strings.Builder
	for i, t := range p {
		if i > 0 {
			b.WriteByte('+')
		}
		b.WriteString(t.c.String())
		for _, q := range t.m.p {
			b.WriteByte('*')
			b.WriteString(q.k.key)
			b.WriteByte('^')
			b.WriteString(q.e.rat().String())
		}
	}
	return b.String()
}

// split writes p as a polynomial in kernel k: descending exponents and their
// coefficients (free of k).
func (r *Ring) split(p poly, k *kernel) ([]expo, []poly) {
	byExp := map[expo]poly{}
	var exps []expo
	for _, t := range p {
		e := t.m.degree(k)
		if _, ok := byExp[e]; !ok {
			exps = append(exps, e)
		}
		byExp[e] = append(byExp[e], term{r.monoWithout(t.m, k), t.c})
	}
	sort.Slice(exps, func(i, j int) bool { return exps[i].cmp(exps[j]) > 0 })
	out := make([]poly, len(exps))
	for i, e := range exps {
		q := byExp[e]
		sort.Slice(q, func(a, b int) bool { return compareMono(q[a].m, q[b].m) > 0 })
		out[i] = q
	}
	return exps, out
}

func (r *Ring) kernelMono(k *kernel, e expo) *mono {
	if e.isZero() {
		return r.one
	}
	return r.internMono([]power{{k, e}})
}
