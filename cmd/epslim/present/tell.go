package present

import (
	"math/big"

	"epslim/cmd/epslim/derivation"
	"epslim/generator/ito"
)

// Tell arranges a derivation for reading, in the order in which a person
// would write it down.
func Tell(res *derivation.Result) *Story {
	t := newTeller(res)
	s := &Story{Title: res.System.Title}
	add := func(sec Section) {
		if len(sec.Blocks) > 0 {
			s.Sections = append(s.Sections, sec)
		}
	}
	add(t.model())
	if len(res.Generator.Parts) > 0 {
		add(t.generator())
	}
	if res.Refused != nil {
		add(t.refusal())
		return s
	}
	add(t.fast())
	add(t.expansion())
	add(t.correctors())
	add(t.frame())
	add(t.limit())
	add(t.next())
	add(t.origins())
	add(t.fokkerPlanck())
	add(t.stationary())
	add(t.conditions())
	add(t.checks())
	add(t.claims())
	add(t.values())
	return s
}

// teller holds what the sections share.
type teller struct {
	*notation
	res   *derivation.Result
	eps   Math
	step  *big.Rat // spacing of the powers of the small parameter
	lead  *big.Rat
	names []string // slow
}

func newTeller(res *derivation.Result) *teller {
	n := &notation{latex: map[string]string{}}
	sys := res.System
	set := func(name, tex string) {
		if tex != "" {
			n.latex[name] = tex
		}
	}
	for _, vs := range [][]*ito.Variable{sys.Slow, sys.Fast} {
		for _, v := range vs {
			set(v.Name, v.Latex)
		}
	}
	for _, p := range sys.Parameters {
		set(p.Name, p.Latex)
	}
	for _, f := range sys.Functions {
		set(f.Name, f.Latex)
	}
	set(sys.Small, sys.Latex)
	n.taken = map[string]bool{}
	for _, vs := range [][]*ito.Variable{sys.Slow, sys.Fast} {
		for _, v := range vs {
			n.taken[n.symbol(v.Name).Text] = true
		}
	}
	for _, p := range sys.Parameters {
		n.taken[n.symbol(p.Name).Text] = true
	}
	for _, f := range sys.Functions {
		n.taken[n.symbol(f.Name).Text] = true
	}
	t := &teller{notation: n, res: res, names: slowNames(res), step: big.NewRat(1, 1), lead: new(big.Rat)}
	t.eps = n.symbol(sys.Small)
	t.spacing()
	return t
}

// spacing is the common step of the powers in the generator.
func (t *teller) spacing() {
	ps := t.res.Generator.Parts
	if len(ps) == 0 {
		return
	}
	t.lead = ps[0].Power
	if len(ps) == 1 {
		return
	}
	g := new(big.Rat)
	for _, p := range ps[1:] {
		g = gcdRat(g, new(big.Rat).Sub(p.Power, t.lead))
	}
	t.step = g
}

func gcdRat(a, b *big.Rat) *big.Rat {
	if a.Sign() == 0 {
		return b
	}
	num := new(big.Int).GCD(nil, nil, new(big.Int).Mul(a.Num(), b.Denom()), new(big.Int).Mul(b.Num(), a.Denom()))
	return new(big.Rat).SetFrac(num, new(big.Int).Mul(a.Denom(), b.Denom()))
}

// index counts orders from the lowest power.
func (t *teller) index(power *big.Rat) int {
	q := new(big.Rat).Quo(new(big.Rat).Sub(power, t.lead), t.step)
	return int(q.Num().Int64())
}

func (t *teller) opName(power *big.Rat) Math { return sub(scriptL, integer(t.index(power))) }

func (t *teller) u(j int) Math { return sub(t.own("u"), integer(j)) }

func (t *teller) epsTo(q *big.Rat) Math {
	switch {
	case q.Sign() == 0:
		return Math{}
	case q.Cmp(big.NewRat(1, 1)) == 0:
		return t.eps
	}
	return power(t.eps, q)
}

func (t *teller) withBlocks(s Section, bs ...Block) Section {
	s.Blocks = append(s.Blocks, bs...)
	return s
}
