package ito

import "math/big"

// grade tells how an expression depends on the small parameter: as a single
// power times something free of it, or as a sum of several powers. That it is one
// of these is what lets the generator be sorted by powers; anything else is an
// error where it stands.
type grade struct {
	halves int  // the power, in halves
	single bool // one power only
}

var gradeNone = grade{single: true}

func (g grade) none() bool { return g.single && g.halves == 0 }

func (g grade) add(h grade) grade {
	if g.single && h.single && g.halves == h.halves {
		return g
	}
	return grade{}
}

func (g grade) mul(h grade) (grade, bool) {
	if g.single && h.single {
		return grade{g.halves + h.halves, true}, abs(g.halves+h.halves) <= gradeMax
	}
	return grade{}, true
}

func (g grade) div(h grade) (grade, bool) {
	if !h.single {
		return grade{}, false
	}
	return g.mul(grade{-h.halves, true})
}

// pow returns the grade of a power; it fails when that is no half-integer power
// of the small parameter, or of a sum of powers.
func (g grade) pow(q *big.Rat) (grade, bool) {
	if g.none() {
		return g, true
	}
	if !g.single {
		return grade{}, q.IsInt() && q.Sign() >= 0
	}
	p := new(big.Rat).Mul(q, big.NewRat(int64(g.halves), 1))
	if !p.IsInt() || !p.Num().IsInt64() || p.Num().Int64() > gradeMax || p.Num().Int64() < -gradeMax {
		return grade{}, false
	}
	return grade{int(p.Num().Int64()), true}, true
}

// gradeMax bounds the powers of the small parameter, in halves.
const gradeMax = 400

func abs(n int) int {
	if n < 0 {
		return -n
	}
	return n
}
