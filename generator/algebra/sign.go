package algebra

// Sign is the set of signs a real value may have. AnyReal says nothing;
// a single bit is certain knowledge.
type Sign uint8

// The elementary signs and the sets that can be declared.
const (
	Negative    Sign = 1
	Zero        Sign = 2
	Positive    Sign = 4
	NonNegative      = Zero | Positive
	NonPositive      = Negative | Zero
	NonZero          = Negative | Positive
	AnyReal     Sign = 7
)

func (s Sign) String() string {
	switch s {
	case Negative:
		return "negative"
	case Zero:
		return "zero"
	case Positive:
		return "positive"
	case NonNegative:
		return "nonnegative"
	case NonPositive:
		return "nonpositive"
	case NonZero:
		return "nonzero"
	}
	return "real"
}

// Is reports whether every possible sign lies in t.
func (s Sign) Is(t Sign) bool { return s&^t == 0 }

func (s Sign) neg() Sign {
	out := s & Zero
	if s&Negative != 0 {
		out |= Positive
	}
	if s&Positive != 0 {
		out |= Negative
	}
	return out
}

func (s Sign) mul(t Sign) Sign {
	var out Sign
	if (s|t)&Zero != 0 && (s&Zero != 0 || t&Zero != 0) {
		out |= Zero
	}
	if s&Positive != 0 && t&Positive != 0 || s&Negative != 0 && t&Negative != 0 {
		out |= Positive
	}
	if s&Positive != 0 && t&Negative != 0 || s&Negative != 0 && t&Positive != 0 {
		out |= Negative
	}
	return out
}

func (s Sign) add(t Sign) Sign {
	if s == Zero {
		return t
	}
	if t == Zero {
		return s
	}
	switch {
	case s.Is(NonNegative) && t.Is(NonNegative):
		if s == Positive || t == Positive {
			return Positive
		}
		return NonNegative
	case s.Is(NonPositive) && t.Is(NonPositive):
		if s == Negative || t == Negative {
			return Negative
		}
		return NonPositive
	}
	return AnyReal
}

func ratSign(q rat) Sign {
	switch q.sign() {
	case 1:
		return Positive
	case -1:
		return Negative
	}
	return Zero
}

// Sign tells what is known of the sign of e under the declared assumptions,
// wherever e is defined.
func (e Expr) Sign() Sign {
	r := e.n.r
	s := r.signPoly(e.n.num, 2)
	for _, f := range e.n.den {
		fs := r.signPoly(f.f.p, 2) &^ Zero
		if f.e%2 == 0 {
			fs = Positive
		}
		s = s.mul(fs)
	}
	return s
}

func powerSign(q power) Sign {
	s := baseSign(q)
	if q.e.n < 0 {
		s &^= Zero
	}
	if !q.e.oddPower() {
		if s&Zero == 0 {
			return Positive
		}
		return NonNegative
	}
	return s
}

func monoSign(m *mono) Sign {
	s := Positive
	for _, q := range m.p {
		s = s.mul(powerSign(q))
	}
	return s
}

// signPoly bounds the sign of a real polynomial; depth limits how often it
// looks at factors and discriminants.
func (r *Ring) signPoly(p poly, depth int) Sign {
	if len(p) == 0 {
		return Zero
	}
	for _, t := range p {
		for _, q := range t.m.p {
			if q.k.kind == kindCis {
				return r.signTrig(p)
			}
		}
		if !t.c.isReal() {
			return AnyReal
		}
	}
	sum := Zero
	for _, t := range p {
		sum = sum.add(ratSign(t.c.re).mul(monoSign(t.m)))
	}
	if sum != AnyReal || len(p) == 1 || depth == 0 || len(p) > 60 {
		return sum
	}
	c, m, q := r.primitive(p)
	outer := ratSign(c.re).mul(monoSign(m))
	fs := r.splitPoly(q)
	if len(fs) > 1 || len(fs) == 1 && fs[0].e > 1 {
		s := outer
		lead := q[0].c
		prod := coefOne
		for _, f := range fs {
			t := r.signPoly(f.p, depth-1)
			if f.e%2 == 0 {
				if t&Zero == 0 {
					t = Positive
				} else {
					t = NonNegative
				}
			}
			for i := 0; i < f.e; i++ {
				prod = prod.mul(f.p[0].c)
			}
			s = s.mul(t)
		}
		if lead.re.sign()*prod.re.sign() < 0 {
			s = s.neg()
		}
		return s
	}
	if s := r.signQuadratic(q, depth); s != AnyReal {
		return outer.mul(s)
	}
	return AnyReal
}

// signQuadratic uses the discriminant of a quadratic in one symbol.
func (r *Ring) signQuadratic(p poly, depth int) Sign {
	for _, k := range p.kernels() {
		if k.algebraic || p.degree(k) != (expo{2, 1}) {
			continue
		}
		integral := true
		for _, t := range p {
			if d := t.m.degree(k); d.d != 1 || d.n < 0 {
				integral = false
			}
		}
		if !integral {
			continue
		}
		v := r.dense(p, k, 1)
		disc := subPoly(r.mulPoly(v[1], v[1]), r.mulPoly(v[2], v[0]).scale(coefInt(4)))
		d := r.signPoly(disc, depth-1)
		a := r.signPoly(v[2], depth-1)
		switch {
		case d == Negative && (a == Positive || a == Negative):
			return a
		case d.Is(NonPositive) && a == Positive:
			return NonNegative
		case d.Is(NonPositive) && a == Negative:
			return NonPositive
		}
	}
	return AnyReal
}

// signTrig bounds a trigonometric polynomial with numerical coefficients by
// its mean and the sum of the other coefficients.
func (r *Ring) signTrig(p poly) Sign {
	mean, rest := ratZero, ratZero
	for _, t := range p {
		trig := false
		for _, q := range t.m.p {
			if q.k.kind != kindCis {
				return AnyReal
			}
			trig = true
		}
		switch {
		case !trig && t.c.isReal():
			mean = t.c.re
		case !trig:
			return AnyReal
		default:
			rest = rest.add(t.c.re.abs()).add(t.c.im.abs())
		}
	}
	switch {
	case mean.cmp(rest) > 0:
		return Positive
	case mean.neg().cmp(rest) > 0:
		return Negative
	case mean.equal(rest):
		return NonNegative
	case mean.neg().equal(rest):
		return NonPositive
	}
	return AnyReal
}

// isInteger reports whether e is known to take integer values.
func (e Expr) isInteger() bool {
	if len(e.n.den) > 0 {
		return false
	}
	for _, t := range e.n.num {
		if !t.c.isReal() || !t.c.re.isInt() {
			return false
		}
		for _, q := range t.m.p {
			if !q.k.attr.Integer || q.e.d != 1 || q.e.n < 0 {
				return false
			}
		}
	}
	return true
}
