package algebra

import (
	"errors"
	"fmt"
	"hash/fnv"
	"math/big"
)

// Verdict is the outcome of a test whether an expression is zero.
type Verdict uint8

// The outcomes.
const (
	// VerdictUndecided: not canonically zero, and zero to working precision
	// wherever it was evaluated, or evaluated nowhere.
	VerdictUndecided Verdict = iota
	// VerdictZero: the canonical form is zero.
	VerdictZero
	// VerdictNonZero: the value at some admissible point is not zero.
	VerdictNonZero
)

func (v Verdict) String() string {
	switch v {
	case VerdictZero:
		return "zero"
	case VerdictNonZero:
		return "non-zero"
	}
	return "undecided"
}

const (
	zeroTestPoints   = 4  // admissible points where a value must vanish
	zeroTestAttempts = 48 // points tried in all
	zeroTestBits     = 192
)

// ZeroTest tells whether e is identically zero. A canonical zero is zero;
// otherwise e is evaluated at deterministic pseudo-random points that respect
// the declared signs, named functions standing for arbitrary ones. A value
// counts as non-zero only when two evaluations in different precisions (192
// and 256 bits, 57 and 77 digits) agree on it, which rounding noise does not;
// an expression that vanishes at all points but not canonically is undecided.
func (e Expr) ZeroTest() Verdict {
	v, _ := e.ZeroWitness()
	return v
}

// ZeroWitness is ZeroTest together with the point where e was found not to
// vanish.
func (e Expr) ZeroWitness() (Verdict, map[string]*big.Float) {
	if e.IsZero() {
		return VerdictZero, nil
	}
	good := 0
	for i := 0; i < zeroTestAttempts && good < zeroTestPoints; i++ {
		at := e.n.r.samplePoint(e.Symbols(), uint64(i))
		nz, err := e.nonZeroAt(at)
		switch {
		case errors.Is(err, errArbitraryIntegral), errors.Is(err, ErrTooLarge):
			return VerdictUndecided, nil
		case err != nil:
			continue
		case nz:
			return VerdictNonZero, at.Values
		}
		good++
	}
	return VerdictUndecided, nil
}

// nonZeroAt evaluates in two precisions and compares.
func (e Expr) nonZeroAt(at Binding) (bool, error) {
	var v [2]cplx
	for i := range v {
		err := protect(func() error {
			v[i], _ = newEvaluator(e.n.r, at, zeroTestBits+uint(64*i)).expr(e)
			return nil
		})
		if err != nil {
			return false, err
		}
	}
	a := &arith{prec: zeroTestBits}
	x, y := a.size(v[0]), a.size(v[1])
	if x.Sign() == 0 || y.Sign() == 0 {
		return false, nil
	}
	minus := cplx{a.neg(v[1].re), nil}
	if v[1].im != nil {
		minus.im = a.neg(v[1].im)
	}
	d := a.size(a.cadd(v[0], minus))
	return d.Sign() == 0 || d.MantExp(nil) < y.MantExp(nil)-32, nil
}

// samplePoint is the i-th pseudo-random point: values of moderate size with
// the declared signs, on scales that change from point to point so that
// bounded domains are met.
func (r *Ring) samplePoint(names []string, i uint64) Binding {
	at := Binding{Values: map[string]*big.Float{}, Arbitrary: true, Seed: i}
	scales := []int{0, -1, 1, -3}
	for _, n := range names {
		k, ok := r.symbols[n]
		if !ok || n == "pi" {
			continue
		}
		h := fnv.New64a()
		fmt.Fprint(h, n, "@", i)
		at.Values[n] = sampleValue(k, mix(h.Sum64()), scales[i/4%4])
	}
	return at
}

func sampleValue(k *kernel, u uint64, scale int) *big.Float {
	s := k.sign
	if s == Zero {
		return new(big.Float)
	}
	x := new(big.Float).SetPrec(64).SetUint64(u>>1 | 1)
	x.SetMantExp(x, -62) // (0, 2)
	x.Add(x, big.NewFloat(0.25))
	x.SetMantExp(x, scale)
	if k.attr.Integer {
		x.SetInt64(int64(1 + u>>1%5))
	}
	if s&Positive == 0 || s&Negative != 0 && u&1 == 1 {
		x.Neg(x)
	}
	return x
}
