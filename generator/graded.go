package generator

import (
	"fmt"
	"math/big"
	"sort"

	"epslim/generator/algebra"
)

// Equation is the Ito equation of one variable: its drift and the factors of
// the independent Wiener increments.
type Equation struct {
	Var   string
	Drift algebra.Expr
	Noise []algebra.Expr // one entry a Wiener process, the same order in all equations
}

// Graded is the generator sorted by powers of the small parameter:
// L = sum_k eps^Power L_k, lowest power first.
type Graded struct {
	Small string
	Parts []Part
}

// Part is the operator that multiplies one power of the small parameter.
type Part struct {
	Power *big.Rat
	Op    *Operator
}

// Build assembles the generator f.grad + 1/2 (sigma sigma^T):Hess of the
// system and sorts it by powers of the symbol small. Noise shared between
// equations gives the cross terms. The coefficients must be finite sums of
// rational powers of small.
func Build(r *algebra.Ring, small string, eqs []Equation) (*Graded, error) {
	vars := make([]string, len(eqs))
	for i, e := range eqs {
		vars[i] = e.Var
	}
	byPower := map[string]*Part{}
	add := func(index []int, coef algebra.Expr, what string) error {
		ts, err := coef.Laurent(small)
		if err != nil {
			return fmt.Errorf("%s is not a sum of powers of %s: %w", what, small, err)
		}
		for _, t := range ts {
			k := t.Power.RatString()
			p, ok := byPower[k]
			if !ok {
				p = &Part{Power: t.Power, Op: New(r, vars)}
				byPower[k] = p
			}
			p.Op.Add(index, t.Coef)
		}
		return nil
	}
	half := r.Frac(1, 2)
	for i, a := range eqs {
		idx := make([]int, len(vars))
		idx[i] = 1
		if err := add(idx, a.Drift, "the drift of "+a.Var); err != nil {
			return nil, err
		}
		for j := i; j < len(eqs); j++ {
			b := eqs[j]
			sum := r.Int(0)
			for k := range a.Noise {
				if !a.Noise[k].IsZero() && !b.Noise[k].IsZero() {
					sum = sum.Add(a.Noise[k].Mul(b.Noise[k]))
				}
			}
			idx := make([]int, len(vars))
			idx[i]++
			idx[j]++
			if i == j {
				sum = sum.Mul(half)
			}
			if err := add(idx, sum, "the diffusion of "+a.Var+", "+b.Var); err != nil {
				return nil, err
			}
		}
	}
	g := &Graded{Small: small}
	for _, p := range byPower {
		if !p.Op.IsZero() {
			g.Parts = append(g.Parts, *p)
		}
	}
	sort.Slice(g.Parts, func(i, j int) bool { return g.Parts[i].Power.Cmp(g.Parts[j].Power) < 0 })
	return g, nil
}

// At returns the operator that multiplies the given power, or nil.
func (g *Graded) At(power *big.Rat) *Operator {
	for _, p := range g.Parts {
		if p.Power.Cmp(power) == 0 {
			return p.Op
		}
	}
	return nil
}
