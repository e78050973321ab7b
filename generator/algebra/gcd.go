package algebra

import (
	"hash/fnv"
	"math/big"
	"math/bits"
	"sort"
)

// Modular images decide quickly, and rigorously in one direction, that two
// polynomials are coprime: for a prime p and values that keep the leading
// coefficients, the degree of the gcd of the images bounds the degree of the
// gcd from above (Brown 1971; Geddes, Czapor, Labahn, Algorithms for Computer
// Algebra, ch. 7).
const modPrime = 2305843009213693921 // 2^61 - 31, = 1 mod 4

func mulMod(a, b uint64) uint64 {
	hi, lo := bits.Mul64(a, b)
	_, rem := bits.Div64(hi%modPrime, lo, modPrime)
	return rem
}

func addMod(a, b uint64) uint64 {
	s := a + b
	if s >= modPrime {
		s -= modPrime
	}
	return s
}

func subMod(a, b uint64) uint64 {
	if a >= b {
		return a - b
	}
	return a + modPrime - b
}

func powMod(a, n uint64) uint64 {
	out := uint64(1)
	for ; n > 0; n >>= 1 {
		if n&1 == 1 {
			out = mulMod(out, a)
		}
		a = mulMod(a, a)
	}
	return out
}

// invMod is the inverse of a non-zero residue by Euclid's algorithm.
func invMod(a uint64) uint64 {
	if a == 1 {
		return 1
	}
	r0, r1 := int64(modPrime), int64(a)
	t0, t1 := int64(0), int64(1) // both stay below modPrime in size
	for r1 != 0 {
		q := r0 / r1
		r0, r1 = r1, r0-q*r1
		t0, t1 = t1, t0-q*t1
	}
	if t0 < 0 {
		t0 += modPrime
	}
	return uint64(t0)
}

// sqrtMinusOne is a square root of -1 modulo modPrime.
var sqrtMinusOne = func() uint64 {
	for g := uint64(2); ; g++ {
		if s := powMod(g, (modPrime-1)/4); mulMod(s, s) == modPrime-1 {
			return s
		}
	}
}()

func residueOf(key string) uint64 {
	h := fnv.New64a()
	h.Write([]byte(key))
	return h.Sum64()%(modPrime-2) + 1
}

func ratMod(q rat) uint64 {
	if q.big == nil {
		n := uint64(abs64(q.n)) % modPrime
		if q.n < 0 && n != 0 {
			n = modPrime - n
		}
		if q.d == 1 {
			return n
		}
		return mulMod(n, invMod(uint64(q.d)%modPrime))
	}
	p := new(big.Int).SetUint64(modPrime)
	n := new(big.Int).Mod(q.big.Num(), p).Uint64()
	d := new(big.Int).Mod(q.big.Denom(), p).Uint64()
	return mulMod(n, invMod(d))
}

func coefMod(c coef) uint64 {
	if c.isReal() {
		return ratMod(c.re)
	}
	return addMod(ratMod(c.re), mulMod(ratMod(c.im), sqrtMinusOne))
}

// imageDeg holds, per kernel, the least common denominator of its exponents,
// so that kernel^(1/den) is the variable whose residue is known.
func exponentDens(ps ...poly) map[*kernel]int32 {
	den := map[*kernel]int32{}
	for _, p := range ps {
		for _, t := range p {
			for _, q := range t.m.p {
				d, ok := den[q.k]
				if !ok {
					d = 1
				}
				den[q.k] = int32(lcm64(int64(d), int64(q.e.d)))
			}
		}
	}
	return den
}

// image evaluates p modulo modPrime at the kernels' residues (shifted by
// salt) for all kernels but k; the result is dense in k^(1/den).
func image(p poly, k *kernel, den map[*kernel]int32, salt uint64) []uint64 {
	var out []uint64
	for _, t := range p {
		c := coefMod(t.c)
		deg := 0
		for _, q := range t.m.p {
			e := int64(q.e.n) * int64(den[q.k]) / int64(q.e.d)
			if q.k == k {
				deg = int(e)
				continue
			}
			x := (q.k.res+salt*0x9E3779B97F4A7C15%modPrime)%modPrime | 1
			c = mulMod(c, powMod(x%modPrime, uint64(e)))
		}
		for len(out) <= deg {
			out = append(out, 0)
		}
		out[deg] = addMod(out[deg], c)
	}
	return trimMod(out)
}

func trimMod(a []uint64) []uint64 {
	for len(a) > 0 && a[len(a)-1] == 0 {
		a = a[:len(a)-1]
	}
	return a
}

func gcdDegMod(a, b []uint64) int {
	a = append([]uint64(nil), a...)
	b = append([]uint64(nil), b...)
	for len(b) > 0 {
		inv := invMod(b[len(b)-1])
		for len(a) >= len(b) {
			f := mulMod(a[len(a)-1], inv)
			s := len(a) - len(b)
			for i := range b {
				a[s+i] = subMod(a[s+i], mulMod(f, b[i]))
			}
			a = trimMod(a[:len(a)-1])
		}
		a, b = b, a
	}
	return len(a) - 1
}

// gcdDegreeBound bounds the degree of gcd(a, b) in kernel k, in units of
// 1/den[k]; ok is false when the image lost a leading coefficient.
func gcdDegreeBound(a, b poly, k *kernel, den map[*kernel]int32) int {
	da, db := a.degree(k), b.degree(k)
	na := int(int64(da.n) * int64(den[k]) / int64(da.d))
	nb := int(int64(db.n) * int64(den[k]) / int64(db.d))
	if na == 0 || nb == 0 {
		return 0
	}
	for salt := uint64(0); salt < 4; salt++ {
		ia, ib := image(a, k, den, salt), image(b, k, den, salt)
		if len(ia) != na+1 || len(ib) != nb+1 {
			continue
		}
		return gcdDegMod(ia, ib)
	}
	return min(na, nb)
}

// divExact returns a/b where b divides a in the polynomial ring (nonnegative
// exponents; algebraic kernels count as independent, so a product that needs
// their relation is reported as not divisible).
func (r *Ring) divExact(a, b poly) (poly, bool) {
	if len(a) == 0 {
		return nil, true
	}
	if len(b) == 1 {
		inv := r.monoInvRaw(b[0].m)
		ci := b[0].c.inv()
		out := make(poly, len(a))
		for i, t := range a {
			m := r.monoMul(t.m, inv)
			for _, q := range m.p {
				if q.e.n < 0 {
					return nil, false
				}
			}
			out[i] = term{m, t.c.mul(ci)}
		}
		return out, true
	}
	if !monoDivides(b[0].m, a[0].m) || !monoDivides(b[len(b)-1].m, a[len(a)-1].m) {
		return nil, false
	}
	lead := b[0]
	lci := lead.c.inv()
	linv := r.monoInvRaw(lead.m)
	low := b[len(b)-1].m
	tail := a[len(a)-1].m
	var quo poly
	// Products b[j]*quo[i] come from a heap in descending order, one for each
	// j, so that no remainder is ever copied (Johnson 1974; Monagan, Pearce,
	// J. Symb. Comp. 46 (2011) 807). wait holds the j whose next quotient
	// term is not known yet.
	var heap productHeap
	wait := make([]int, 0, len(b)-1)
	for j := 1; j < len(b); j++ {
		wait = append(wait, j)
	}
	for next := 0; next < len(a) || len(heap) > 0; {
		var m *mono
		c := coefZero
		if next < len(a) && (len(heap) == 0 || compareMono(a[next].m, heap[0].m) >= 0) {
			m, c = a[next].m, a[next].c
			next++
		} else {
			m = heap[0].m
		}
		for len(heap) > 0 && heap[0].m == m {
			p := heap[0]
			c = c.sub(quo[p.i].c.mul(b[p.j].c))
			if p.i++; p.i < len(quo) {
				p.m = r.monoMul(quo[p.i].m, b[p.j].m)
				heap.replaceTop(p)
			} else {
				heap.pop()
				wait = append(wait, p.j)
			}
		}
		if c.isZero() {
			continue
		}
		if !monoDivides(lead.m, m) {
			return nil, false
		}
		t := term{r.monoMul(m, linv), c.mul(lci)}
		if compareMono(r.monoMul(t.m, low), tail) < 0 {
			return nil, false
		}
		quo = append(quo, t)
		if len(quo)*len(b) > maxProduct {
			panic(errTooLarge)
		}
		r.spend(len(b))
		for _, j := range wait {
			heap.push(productItem{r.monoMul(t.m, b[j].m), len(quo) - 1, j})
		}
		wait = wait[:0]
	}
	return quo, true
}

// productItem is the product of quotient term i and divisor term j.
type productItem struct {
	m    *mono
	i, j int
}

// productHeap has the largest monomial on top.
type productHeap []productItem

func (h *productHeap) push(p productItem) {
	*h = append(*h, p)
	s := *h
	for i := len(s) - 1; i > 0; {
		up := (i - 1) / 2
		if compareMono(s[i].m, s[up].m) <= 0 {
			return
		}
		s[i], s[up] = s[up], s[i]
		i = up
	}
}

func (h *productHeap) pop() {
	s := *h
	last := s[len(s)-1]
	*h = s[:len(s)-1]
	if len(*h) > 0 {
		h.replaceTop(last)
	}
}

func (h productHeap) replaceTop(p productItem) {
	i := 0
	for {
		c := 2*i + 1
		if c >= len(h) {
			break
		}
		if c+1 < len(h) && compareMono(h[c+1].m, h[c].m) > 0 {
			c++
		}
		if compareMono(p.m, h[c].m) >= 0 {
			break
		}
		h[i] = h[c]
		i = c
	}
	h[i] = p
}

// subMulTerm is a - t*b without reducing algebraic kernels.
func (r *Ring) subMulTerm(a, b poly, t term) poly {
	out := make(poly, 0, len(a)+len(b))
	i, j := 0, 0
	for j < len(b) {
		m := r.monoMul(b[j].m, t.m)
		for i < len(a) && compareMono(a[i].m, m) > 0 {
			out = append(out, a[i])
			i++
		}
		c := b[j].c.mul(t.c).neg()
		if i < len(a) && a[i].m == m {
			c = c.add(a[i].c)
			i++
		}
		if !c.isZero() {
			out = append(out, term{m, c})
		}
		j++
	}
	out = append(out, a[i:]...)
	if len(out) == 0 {
		return nil
	}
	return out
}

func monoDivides(a, b *mono) bool {
	j := 0
	for _, q := range a.p {
		for j < len(b.p) && b.p[j].k != q.k {
			j++
		}
		if j == len(b.p) || b.p[j].e.cmp(q.e) < 0 {
			return false
		}
	}
	return true
}

// gcdPoly is the greatest common divisor of two polynomials without monomial
// content, primitive with normalised leading coefficient. Algebraic kernels
// count as independent variables.
func (r *Ring) gcdPoly(a, b poly) poly {
	one := poly{{r.one, coefOne}}
	if len(a) == 0 {
		return b
	}
	if len(b) == 0 {
		return a
	}
	if len(a) == 1 || len(b) == 1 {
		return one
	}
	if a.equal(b) {
		return a
	}
	den := exponentDens(a, b)
	ka := map[*kernel]bool{}
	for _, k := range a.kernels() {
		ka[k] = true
	}
	var shared, only []*kernel
	for _, k := range b.kernels() {
		if ka[k] {
			shared = append(shared, k)
		} else {
			only = append(only, k)
		}
		delete(ka, k)
	}
	for k := range ka {
		only = append(only, k)
	}
	deg := map[*kernel]int{}
	var active []*kernel
	for _, k := range shared {
		if d := gcdDegreeBound(a, b, k, den); d > 0 {
			deg[k] = d
			active = append(active, k)
		} else {
			only = append(only, k)
		}
	}
	if len(active) == 0 {
		return one
	}
	if len(only) > 0 {
		return r.gcdList(append(r.coefficients(a, only), r.coefficients(b, only)...))
	}
	if g, ok := r.tryDivide(a, b); ok {
		return g
	}
	if g, ok := r.gcdHeuristic(a, b); ok {
		return g
	}
	sort.Slice(active, func(i, j int) bool {
		if deg[active[i]] != deg[active[j]] {
			return deg[active[i]] < deg[active[j]]
		}
		return compareKernels(active[i], active[j]) < 0
	})
	return r.gcdIn(a, b, active[0])
}

func (r *Ring) tryDivide(a, b poly) (poly, bool) {
	if _, ok := r.divExact(a, b); ok {
		return r.prim(b), true
	}
	if _, ok := r.divExact(b, a); ok {
		return r.prim(a), true
	}
	return nil, false
}

// prim is the primitive part without monomial content.
func (r *Ring) prim(p poly) poly {
	_, _, q := r.primitive(p)
	return q
}

// coefficients views p as a polynomial in the given kernels and returns its
// coefficients, stripped of monomial content.
func (r *Ring) coefficients(p poly, ks []*kernel) []poly {
	in := make(map[*kernel]bool, len(ks))
	for _, k := range ks {
		in[k] = true
	}
	groups := map[*mono]poly{}
	var order []*mono
	for _, t := range p {
		var out, rest []power
		for _, q := range t.m.p {
			if in[q.k] {
				out = append(out, q)
			} else {
				rest = append(rest, q)
			}
		}
		o := r.internMono(out)
		if _, ok := groups[o]; !ok {
			order = append(order, o)
		}
		groups[o] = append(groups[o], term{r.internMono(rest), t.c})
	}
	res := make([]poly, 0, len(order))
	for _, o := range order {
		q := groups[o]
		sort.Slice(q, func(i, j int) bool { return compareMono(q[i].m, q[j].m) > 0 })
		res = append(res, r.prim(q))
	}
	return res
}

// gcdList is the gcd of several polynomials without monomial content.
func (r *Ring) gcdList(ps []poly) poly {
	sort.SliceStable(ps, func(i, j int) bool { return len(ps[i]) < len(ps[j]) })
	g := ps[0]
	for _, p := range ps[1:] {
		if len(g) == 1 {
			break
		}
		g = r.gcdPoly(g, p)
	}
	if len(g) == 1 {
		return poly{{r.one, coefOne}}
	}
	return r.prim(g)
}

// gcdIn computes the gcd with main variable x by a subresultant remainder
// sequence over the primitive parts (Brown and Traub 1971; Knuth, TAOCP vol.
// 2, 4.6.1, algorithm C).
func (r *Ring) gcdIn(a, b poly, x *kernel) poly {
	ca := r.gcdList(r.coefficients(a, []*kernel{x}))
	cb := r.gcdList(r.coefficients(b, []*kernel{x}))
	content := r.gcdPoly(ca, cb)
	pa, _ := r.divExact(a, ca)
	pb, _ := r.divExact(b, cb)
	if pa.degree(x).cmp(pb.degree(x)) < 0 {
		pa, pb = pb, pa
	}
	den := exponentDens(pa, pb)[x]
	u, v := r.dense(pa, x, den), r.dense(pb, x, den)
	one := poly{{r.one, coefOne}}
	g, h := one, one
	for {
		d := len(u) - len(v)
		rem := r.pseudoRem(u, v)
		if len(rem) == 0 {
			break
		}
		if len(rem) == 1 {
			return content
		}
		u = v
		div := r.mulFree(g, r.powFree(h, d))
		v = make([]poly, len(rem))
		for i, c := range rem {
			q, ok := r.divExact(c, div)
			if !ok {
				panic("algebra: subresultant division failed")
			}
			v[i] = q
		}
		g = u[len(u)-1]
		if d > 0 {
			gd := r.powFree(g, d)
			if d > 1 {
				gd, _ = r.divExact(gd, r.powFree(h, d-1))
			}
			h = gd
		}
	}
	out := r.prim(r.undense(v, x, den))
	c := r.gcdList(r.coefficients(out, []*kernel{x}))
	out, _ = r.divExact(out, c)
	return r.prim(r.mulFree(out, content))
}

// dense lists the coefficients of p by ascending power of x^(1/den).
func (r *Ring) dense(p poly, x *kernel, den int32) []poly {
	exps, cs := r.split(p, x)
	n := int(int64(exps[0].n) * int64(den) / int64(exps[0].d))
	out := make([]poly, n+1)
	for i, e := range exps {
		out[int(int64(e.n)*int64(den)/int64(e.d))] = cs[i]
	}
	return out
}

func (r *Ring) undense(v []poly, x *kernel, den int32) poly {
	acc := r.accumulate(len(v))
	for i, c := range v {
		m := r.kernelMono(x, mkExpo(int64(i), int64(den)))
		for _, t := range c {
			acc.add(r.monoMul(t.m, m), t.c)
		}
	}
	return acc.poly()
}

// pseudoRem is the pseudo-remainder of u by v (both dense, deg u >= deg v).
func (r *Ring) pseudoRem(u, v []poly) []poly {
	u = append([]poly(nil), u...)
	lv := v[len(v)-1]
	for k := len(u) - len(v); k >= 0; k-- {
		top := u[len(v)-1+k]
		for i := range u[:len(v)-1+k] {
			u[i] = r.mulFree(u[i], lv)
		}
		if !top.isZero() {
			for i := 0; i < len(v)-1; i++ {
				u[i+k] = subPoly(u[i+k], r.mulFree(top, v[i]))
			}
		}
		u = u[:len(v)-1+k]
	}
	for len(u) > 0 && u[len(u)-1].isZero() {
		u = u[:len(u)-1]
	}
	return u
}

// mulFree multiplies with algebraic kernels taken as independent.
func (r *Ring) mulFree(a, b poly) poly {
	if len(a) == 0 || len(b) == 0 {
		return nil
	}
	if len(a)*len(b) > maxProduct {
		panic(errTooLarge)
	}
	r.spend(len(a) * len(b))
	acc := map[*mono]coef{}
	for _, s := range a {
		for _, t := range b {
			m := r.monoMul(s.m, t.m)
			c := s.c.mul(t.c)
			if old, ok := acc[m]; ok {
				c = old.add(c)
			}
			acc[m] = c
		}
	}
	ac := &accumulator{r, acc}
	return ac.poly()
}

func (r *Ring) powFree(a poly, n int) poly {
	out := poly{{r.one, coefOne}}
	for ; n > 0; n-- {
		out = r.mulFree(out, a)
	}
	return out
}
