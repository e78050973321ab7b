package algebra

import (
	"context"
	"encoding/binary"
	"fmt"
	"sort"
	"strings"
)

// kind tells the kinds of kernels apart; its order is part of the structural
// order of kernels.
type kind uint8

const (
	kindPrime    kind = iota // a prime number under a fractional exponent
	kindSymbol               // a declared variable or parameter, or pi
	kindFunc                 // a derivative of a named function at its arguments
	kindExp                  // exp(m), m a primitive monomial
	kindCis                  // exp(i m), m a primitive monomial
	kindPow                  // b^m, m a primitive monomial that is not a number
	kindRoot                 // a polynomial under a fractional exponent
	kindCall                 // log, erf, abs, ... of canonical arguments
	kindIntegral             // a definite integral kept by name
	kindTrig                 // sin or cos, in printed forms only
)

// kernel is an indeterminate of the field: an immutable, interned value.
type kernel struct {
	id    uint32 // creation number: identity in maps, never used for order
	kind  kind
	rank  int    // declaration rank for symbols and functions
	name  string // symbol, function or builtin name
	deriv []int  // kindFunc: derivative multi-index, one entry an argument
	args  []Expr // arguments; kindExp, kindCis: {m}; kindPow: {b, m}; kindRoot: {b}
	prime int64  // kindPrime
	sign  Sign   // what is known of the kernel's value
	attr  Attr
	key   string

	// algebraic kernels satisfy kernel^period = base; period is 1 for roots
	// and primes (their exponents are fractions below 1), 2 for abs and sign.
	algebraic bool
	period    int
	base      Expr

	diff map[string]Expr // derivative by symbol name, filled on demand
	syms []string        // free symbols, sorted by name
	res  uint64          // residue used by modular images; never 0
}

// Attr is what is declared of a symbol or function: the set of signs its
// values may have (the zero value means any real), whether it is an integer,
// whether it is a parameter (parameters stand before variables in printed
// products), and the user's own TeX for it.
type Attr struct {
	Sign      Sign
	Integer   bool
	Parameter bool
	Latex     string
}

// Ring is the kernel table of one derivation. Expressions of different rings
// must not be mixed. A Ring is not safe for concurrent use.
type Ring struct {
	kernels   map[string]*kernel
	symbols   map[string]*kernel
	funcs     map[string]*function
	monos     map[string]*mono
	factors   map[string]*factorPoly
	gcds      map[[2]*factorPoly]poly
	prods     map[[2]*mono]*mono
	nextID    uint32
	rank      int
	ctx       context.Context // see Watch
	sinceLook int             // operations since the context was looked at
	budget    int64           // term operations left; 0 is no limit
	buf       []byte
	one       *mono
	zero      Expr
	unit      Expr
}

type function struct {
	name string
	args []string
	attr Attr
	rank int
}

// NewRing returns an empty ring that knows the constant pi.
func NewRing() *Ring {
	r := &Ring{
		kernels: map[string]*kernel{},
		symbols: map[string]*kernel{},
		funcs:   map[string]*function{},
		monos:   map[string]*mono{},
		factors: map[string]*factorPoly{},
		gcds:    map[[2]*factorPoly]poly{},
		prods:   map[[2]*mono]*mono{},
	}
	r.one = &mono{key: ""}
	r.monos[""] = r.one
	r.zero = Expr{&node{r: r}}
	r.unit = Expr{&node{r: r, num: poly{{r.one, coefOne}}}}
	r.symbols["pi"] = r.intern(&kernel{kind: kindSymbol, rank: -1, name: "pi", sign: Positive})
	return r
}

// Declare introduces a symbol. Its place in printed sums and products is the
// order of declaration. Declaring a name again returns the first symbol.
func (r *Ring) Declare(name string, a Attr) Expr {
	if k, ok := r.symbols[name]; ok {
		return r.kernelExpr(k)
	}
	if a.Sign == 0 {
		a.Sign = AnyReal
	}
	r.rank++
	k := r.intern(&kernel{kind: kindSymbol, rank: r.rank, name: name, sign: a.Sign, attr: a})
	r.symbols[name] = k
	return r.kernelExpr(k)
}

// DeclareFunction introduces a named function of declared symbols.
func (r *Ring) DeclareFunction(name string, args []string, a Attr) error {
	if _, ok := r.funcs[name]; ok {
		return fmt.Errorf("function %s is declared twice", name)
	}
	for _, s := range args {
		if _, ok := r.symbols[s]; !ok {
			return fmt.Errorf("function %s: argument %s is not declared", name, s)
		}
	}
	if a.Sign == 0 {
		a.Sign = AnyReal
	}
	r.rank++
	r.funcs[name] = &function{name: name, args: append([]string(nil), args...), attr: a, rank: r.rank}
	return nil
}

// Symbol returns a declared symbol (or pi).
func (r *Ring) Symbol(name string) (Expr, bool) {
	k, ok := r.symbols[name]
	if !ok {
		return Expr{}, false
	}
	return r.kernelExpr(k), true
}

// intern gives the one kernel of the ring that equals k.
func (r *Ring) intern(k *kernel) *kernel {
	k.key = kernelKey(k)
	if old, ok := r.kernels[k.key]; ok {
		return old
	}
	r.nextID++
	k.id = r.nextID
	if k.sign == 0 {
		k.sign = AnyReal
	}
	k.syms = kernelSymbols(k)
	k.res = residueOf(k.key)
	r.kernels[k.key] = k
	return k
}

func kernelKey(k *kernel) string {
	var b strings.Builder
	fmt.Fprintf(&b, "%c", 'a'+rune(k.kind))
	switch k.kind {
	case kindPrime:
		fmt.Fprintf(&b, "%020d", k.prime)
	default:
		b.WriteString(k.name)
		for _, d := range k.deriv {
			fmt.Fprintf(&b, "'%d", d)
		}
		if len(k.args) > 0 {
			b.WriteByte('(')
			for i, a := range k.args {
				if i > 0 {
					b.WriteByte(',')
				}
				b.WriteString(a.key())
			}
			b.WriteByte(')')
		}
	}
	return b.String()
}

func kernelSymbols(k *kernel) []string {
	set := map[string]bool{}
	if k.kind == kindSymbol {
		set[k.name] = true
	}
	for _, a := range k.args {
		for _, s := range a.Symbols() {
			set[s] = true
		}
	}
	if k.kind == kindIntegral {
		delete(set, k.name)
		// The bounds may mention the name of the dummy again.
		for _, a := range k.args[1:] {
			for _, s := range a.Symbols() {
				set[s] = true
			}
		}
	}
	out := make([]string, 0, len(set))
	for s := range set {
		out = append(out, s)
	}
	sort.Strings(out)
	return out
}

func (k *kernel) dependsOn(name string) bool {
	i := sort.SearchStrings(k.syms, name)
	return i < len(k.syms) && k.syms[i] == name
}

// compareKernels is the structural order: it depends on what kernels are,
// never on when they were made.
func compareKernels(a, b *kernel) int {
	if a == b {
		return 0
	}
	if a.kind != b.kind {
		if a.kind < b.kind {
			return -1
		}
		return 1
	}
	if a.rank != b.rank {
		if a.rank < b.rank {
			return -1
		}
		return 1
	}
	return strings.Compare(a.key, b.key)
}

// expo is a rational exponent in lowest terms, d >= 1.
type expo struct{ n, d int32 }

func mkExpo(n, d int64) expo {
	if d < 0 {
		n, d = -n, -d
	}
	if g := gcd64(n, d); g > 1 {
		n, d = n/g, d/g
	}
	if n > 1<<30 || n < -(1<<30) || d > 1<<30 {
		panic(errTooLarge)
	}
	return expo{int32(n), int32(d)}
}

func (e expo) add(f expo) expo {
	if e.d == 1 && f.d == 1 {
		return mkExpo(int64(e.n)+int64(f.n), 1)
	}
	return mkExpo(int64(e.n)*int64(f.d)+int64(f.n)*int64(e.d), int64(e.d)*int64(f.d))
}
func (e expo) neg() expo       { return expo{-e.n, e.d} }
func (e expo) sub(f expo) expo { return e.add(f.neg()) }
func (e expo) mul(f expo) expo { return mkExpo(int64(e.n)*int64(f.n), int64(e.d)*int64(f.d)) }
func (e expo) isZero() bool    { return e.n == 0 }
func (e expo) cmp(f expo) int  { return int64cmp(int64(e.n)*int64(f.d), int64(f.n)*int64(e.d)) }
func (e expo) rat() rat        { return normRat(int64(e.n), int64(e.d)) }
func (e expo) isInt() bool     { return e.d == 1 }
func (e expo) floor() int32    { return int32(floorDiv(int64(e.n), int64(e.d))) }
func expoFromRat(q rat) (expo, bool) {
	if q.big != nil || q.n > 1<<30 || q.n < -(1<<30) || q.d > 1<<30 {
		return expo{}, false
	}
	return expo{int32(q.n), int32(q.d)}, true
}

func floorDiv(a, b int64) int64 {
	q := a / b
	if a%b != 0 && (a < 0) != (b < 0) {
		q--
	}
	return q
}

func int64cmp(a, b int64) int {
	switch {
	case a < b:
		return -1
	case a > b:
		return 1
	}
	return 0
}

// power is kernel^e, e != 0.
type power struct {
	k *kernel
	e expo
}

// mono is an interned product of powers, sorted by compareKernels.
type mono struct {
	p       []power
	key     string
	reduced poly // for monomials out of the range of their algebraic kernels
	needs   bool // some algebraic kernel is out of range
}

func (m *mono) isOne() bool { return len(m.p) == 0 }

// internMono returns the ring's monomial with these powers; p must be sorted
// and free of zero exponents and is kept.
func (r *Ring) internMono(p []power) *mono {
	b := r.buf[:0]
	for _, q := range p {
		b = binary.LittleEndian.AppendUint32(b, q.k.id)
		b = binary.LittleEndian.AppendUint32(b, uint32(q.e.n))
		b = binary.LittleEndian.AppendUint32(b, uint32(q.e.d))
	}
	r.buf = b
	if m, ok := r.monos[string(b)]; ok {
		return m
	}
	m := &mono{p: append([]power(nil), p...), key: string(b)}
	for _, q := range p {
		if q.k.algebraic && (q.e.n < 0 || int(q.e.n) >= q.k.period*int(q.e.d)) {
			m.needs = true
		}
	}
	r.monos[m.key] = m
	return m
}

func (r *Ring) monoMul(a, b *mono) *mono {
	if len(a.p) == 0 {
		return b
	}
	if len(b.p) == 0 {
		return a
	}
	pair := [2]*mono{a, b}
	if m, ok := r.prods[pair]; ok {
		return m
	}
	p := make([]power, 0, len(a.p)+len(b.p))
	i, j := 0, 0
	for i < len(a.p) && j < len(b.p) {
		switch c := compareKernels(a.p[i].k, b.p[j].k); {
		case c < 0:
			p = append(p, a.p[i])
			i++
		case c > 0:
			p = append(p, b.p[j])
			j++
		default:
			if e := a.p[i].e.add(b.p[j].e); !e.isZero() {
				p = append(p, power{a.p[i].k, e})
			}
			i, j = i+1, j+1
		}
	}
	p = append(p, a.p[i:]...)
	p = append(p, b.p[j:]...)
	m := r.internMono(p)
	if len(r.prods) > 1<<18 {
		clear(r.prods)
	}
	r.prods[pair] = m
	return m
}

func (r *Ring) monoPow(a *mono, e expo) *mono {
	if e.isZero() {
		return r.one
	}
	p := make([]power, len(a.p))
	for i, q := range a.p {
		p[i] = power{q.k, q.e.mul(e)}
	}
	return r.internMono(p)
}

func (r *Ring) monoInv(a *mono) *mono { return r.monoPow(a, expo{-1, 1}) }

// degree of kernel k in the monomial.
func (m *mono) degree(k *kernel) expo {
	for _, q := range m.p {
		if q.k == k {
			return q.e
		}
	}
	return expo{0, 1}
}

// without drops kernel k from the monomial.
func (r *Ring) monoWithout(m *mono, k *kernel) *mono {
	p := make([]power, 0, len(m.p))
	for _, q := range m.p {
		if q.k != k {
			p = append(p, q)
		}
	}
	return r.internMono(p)
}

// compareMono is the lexicographic order with the first kernel most
// significant; it is compatible with multiplication.
func compareMono(a, b *mono) int {
	if a == b {
		return 0
	}
	i, j := 0, 0
	for i < len(a.p) && j < len(b.p) {
		c := compareKernels(a.p[i].k, b.p[j].k)
		switch {
		case c < 0:
			return signOf(a.p[i].e)
		case c > 0:
			return -signOf(b.p[j].e)
		}
		if d := a.p[i].e.cmp(b.p[j].e); d != 0 {
			return d
		}
		i, j = i+1, j+1
	}
	if i < len(a.p) {
		return signOf(a.p[i].e)
	}
	if j < len(b.p) {
		return -signOf(b.p[j].e)
	}
	return 0
}

func signOf(e expo) int {
	if e.n > 0 {
		return 1
	}
	return -1
}

// monoGCD takes the smaller exponent of each kernel (absent counts as 0), so
// that it also serves Laurent monomials.
func (r *Ring) monoGCD(a, b *mono) *mono {
	p := make([]power, 0, len(a.p))
	i, j := 0, 0
	for i < len(a.p) || j < len(b.p) {
		var c int
		switch {
		case i == len(a.p):
			c = 1
		case j == len(b.p):
			c = -1
		default:
			c = compareKernels(a.p[i].k, b.p[j].k)
		}
		switch {
		case c < 0:
			if a.p[i].e.n < 0 {
				p = append(p, a.p[i])
			}
			i++
		case c > 0:
			if b.p[j].e.n < 0 {
				p = append(p, b.p[j])
			}
			j++
		default:
			e := a.p[i].e
			if b.p[j].e.cmp(e) < 0 {
				e = b.p[j].e
			}
			p = append(p, power{a.p[i].k, e})
			i, j = i+1, j+1
		}
	}
	return r.internMono(p)
}
