package algebra

import (
	"errors"
	"fmt"
	"math/big"
	"sort"
)

// Target receives the operations of a lowered expression: a builder of flat
// programs, a symbolic recorder, or plain arithmetic. T is its handle of a
// value. Equal subexpressions are lowered once; a target that itself merges
// equal operations gains further.
type Target[T any] interface {
	Const(c float64) T
	// Input is the value of a symbol; an error when the target has none of
	// that name. pi is lowered as a constant.
	Input(name string) (T, error)
	Add(x, y T) T
	Sub(x, y T) T
	Mul(x, y T) T
	Div(x, y T) T
	Neg(x T) T
	PowInt(x T, n int) T // n >= 2
	Pow(x, y T) T        // x >= 0, or y an integer
	Sqrt(x T) T
	Exp(x T) T
	Log(x T) T
	Sin(x T) T
	Cos(x T) T
	Sinh(x T) T
	Cosh(x T) T
	Tanh(x T) T
	Abs(x T) T
	Sign(x T) T
	Erf(x T) T
	Gamma(x T) T
	BesselI(n int, x T) T // n >= 0
}

// ErrNotLowered reports an expression without a counterpart in double
// precision arithmetic: a named function without a formula, an integral, a
// complex value, or a special function that targets do not have.
var ErrNotLowered = errors.New("no numerical operation")

// LowerTo writes the expressions as operations of the target, in the order of
// the expressions, and returns their values. The code follows the printed
// arrangement (real sines and cosines, common factors and denominators
// collected); sums of powers are nested as by Horner, integer and half-integer
// powers become products and square roots. Subexpressions that occur more than
// once, in one expression or in several, are computed once.
//
// A value such as exp(x)/(1 + exp(x)) is computed as it stands and overflows
// where exp(x) does.
func LowerTo[T any](t Target[T], exprs ...Expr) ([]T, error) {
	l := &lowerer[T]{t: t, memo: map[string]T{}}
	out := make([]T, len(exprs))
	for i, e := range exprs {
		x, err := l.form(e.Form())
		if err != nil {
			return nil, fmt.Errorf("%w in %s", err, e)
		}
		out[i] = x
	}
	return out, nil
}

type lowerer[T any] struct {
	t    Target[T]
	memo map[string]T
}

func (l *lowerer[T]) form(f *Form) (T, error) {
	key := f.String()
	if x, ok := l.memo[key]; ok {
		return x, nil
	}
	x, err := l.raw(f)
	if err == nil {
		l.memo[key] = x
	}
	return x, err
}

func (l *lowerer[T]) num(q *big.Rat) T {
	v, _ := q.Float64()
	return l.t.Const(v)
}

func (l *lowerer[T]) raw(f *Form) (x T, err error) {
	switch f.Op {
	case FormNumber:
		return l.num(f.Num), nil
	case FormSymbol:
		if f.Name == "pi" {
			return l.t.Const(3.14159265358979323846), nil
		}
		return l.t.Input(f.Name)
	case FormSum:
		return l.sum(l.summands(f))
	case FormNeg, FormProduct, FormQuotient:
		return l.product(l.summand(f))
	case FormPower:
		return l.power(f.Args[0], f.Args[1])
	case FormRoot:
		if x, err = l.form(f.Args[0]); err != nil {
			return x, err
		}
		return l.t.Sqrt(x), nil
	case FormCall:
		return l.call(f)
	case FormDiff:
		return x, fmt.Errorf("%w for %s", ErrNotLowered, f.Name)
	case FormIntegral:
		return x, fmt.Errorf("%w for an integral", ErrNotLowered)
	}
	return x, fmt.Errorf("%w for a complex value", ErrNotLowered)
}

func (l *lowerer[T]) call(f *Form) (x T, err error) {
	unary := map[string]func(T) T{
		"exp": l.t.Exp, "log": l.t.Log, "sin": l.t.Sin, "cos": l.t.Cos, "sinh": l.t.Sinh, "cosh": l.t.Cosh,
		"tanh": l.t.Tanh, "abs": l.t.Abs, "sign": l.t.Sign, "erf": l.t.Erf, "gamma": l.t.Gamma, "sqrt": l.t.Sqrt,
	}
	if f.Name == "besseli" && f.Args[0].Op == FormNumber && f.Args[0].Num.IsInt() && f.Args[0].Num.Num().IsInt64() {
		if x, err = l.form(f.Args[1]); err != nil {
			return x, err
		}
		return l.t.BesselI(int(f.Args[0].Num.Num().Int64()), x), nil
	}
	op, ok := unary[f.Name]
	if !ok || len(f.Args) != 1 {
		return x, fmt.Errorf("%w for %s", ErrNotLowered, f)
	}
	if x, err = l.form(f.Args[0]); err != nil {
		return x, err
	}
	return op(x), nil
}

// power lowers b^e: integers and half-integers by products and roots, other
// roots of odd order with the sign of the base.
func (l *lowerer[T]) power(b, e *Form) (x T, err error) {
	if x, err = l.form(b); err != nil {
		return x, err
	}
	neg := e.Op == FormNeg
	if neg {
		e = e.Args[0]
	}
	if e.Op == FormNumber {
		n, d := e.Num.Num(), e.Num.Denom()
		if n.IsInt64() && n.Int64() <= 1<<20 && d.IsInt64() && d.Int64() <= 1<<20 {
			y := l.ratPower(x, int(n.Int64()), int(d.Int64()))
			if neg {
				y = l.t.Div(l.t.Const(1), y)
			}
			return y, nil
		}
	}
	y, err := l.form(e)
	if err != nil {
		return x, err
	}
	if neg {
		y = l.t.Neg(y)
	}
	return l.t.Pow(x, y), nil
}

func (l *lowerer[T]) ratPower(x T, n, d int) T {
	natural := func(x T, n int) T {
		if n == 1 {
			return x
		}
		return l.t.PowInt(x, n)
	}
	switch {
	case d == 1:
		return natural(x, n)
	case d == 2:
		// n is odd
		y := l.t.Sqrt(x)
		if n == 1 {
			return y
		}
		return l.t.Mul(natural(x, n/2), y)
	case d%2 == 0:
		return l.t.Pow(x, l.t.Const(float64(n)/float64(d)))
	}
	y := l.t.Pow(l.t.Abs(x), l.t.Const(float64(n)/float64(d)))
	if n%2 != 0 {
		y = l.t.Mul(l.t.Sign(x), y)
	}
	return y
}

// summandForm is sign * coefficient * product of powers / den.
type summandForm struct {
	neg bool
	c   *big.Rat
	fs  []factorForm
	den []*Form
}

type factorForm struct {
	f *Form
	n int // natural power
}

func (l *lowerer[T]) summands(f *Form) []summandForm {
	out := make([]summandForm, len(f.Args))
	for i, a := range f.Args {
		out[i] = l.summand(a)
	}
	return out
}

func (l *lowerer[T]) summand(f *Form) summandForm {
	s := summandForm{c: big.NewRat(1, 1)}
	for f.Op == FormNeg {
		s.neg, f = !s.neg, f.Args[0]
	}
	s.multiply(f)
	return s
}

func (s *summandForm) multiply(f *Form) {
	switch f.Op {
	case FormProduct:
		for _, a := range f.Args {
			s.multiply(a)
		}
	case FormQuotient:
		s.multiply(f.Args[0])
		s.divide(f.Args[1])
	case FormNumber:
		s.c = new(big.Rat).Mul(s.c, f.Num)
	case FormPower:
		if e := f.Args[1]; e.Op == FormNumber && e.Num.IsInt() && e.Num.Num().IsInt64() && e.Num.Num().Int64() < 1<<20 {
			s.factor(f.Args[0], int(e.Num.Num().Int64()))
			return
		}
		s.factor(f, 1)
	default:
		s.factor(f, 1)
	}
}

func (s *summandForm) factor(f *Form, n int) {
	for i := range s.fs {
		if s.fs[i].f.String() == f.String() {
			s.fs[i].n += n
			return
		}
	}
	s.fs = append(s.fs, factorForm{f, n})
}

func (s *summandForm) divide(f *Form) {
	switch {
	case f.Op == FormProduct:
		for _, a := range f.Args {
			s.divide(a)
		}
	case f.Op == FormNumber && f.Num.Sign() != 0:
		s.c = new(big.Rat).Quo(s.c, f.Num)
	default:
		s.den = append(s.den, f)
	}
}

// product lowers one summand. Factors are multiplied from the left with the
// number first; the denominator is one product and one division.
func (l *lowerer[T]) product(s summandForm) (x T, err error) {
	have := false
	mul := func(y T) {
		if !have {
			x, have = y, true
			return
		}
		x = l.t.Mul(x, y)
	}
	one := s.c.Cmp(big.NewRat(1, 1)) == 0
	if !one || len(s.fs) == 0 {
		c := s.c
		if s.neg {
			c, s.neg = new(big.Rat).Neg(c), false
		}
		mul(l.num(c))
	}
	for _, f := range s.fs {
		y, err := l.natural(f.f, f.n)
		if err != nil {
			return x, err
		}
		mul(y)
	}
	if len(s.den) > 0 {
		var d T
		for i, f := range s.den {
			y, err := l.form(f)
			if err != nil {
				return x, err
			}
			if i == 0 {
				d = y
			} else {
				d = l.t.Mul(d, y)
			}
		}
		x = l.t.Div(x, d)
	}
	if s.neg {
		x = l.t.Neg(x)
	}
	return x, nil
}

// natural is f^n for n >= 1, shared through the memo.
func (l *lowerer[T]) natural(f *Form, n int) (T, error) {
	if n == 1 {
		return l.form(f)
	}
	return l.form(&Form{Op: FormPower, Args: []*Form{f, numForm(ratInt(int64(n)))}})
}

// sum lowers a sum, nested over the factor that most summands share.
func (l *lowerer[T]) sum(ts []summandForm) (x T, err error) {
	if len(ts) == 1 {
		return l.product(ts[0])
	}
	if key, n := commonFactor(ts); key != "" {
		return l.horner(ts, key, n)
	}
	start := -1 // begin with a positive summand
	for i, s := range ts {
		if !s.neg {
			start = i
			break
		}
	}
	neg := start < 0
	if neg {
		start = 0
	}
	first := ts[start]
	first.neg = false
	if x, err = l.product(first); err != nil {
		return x, err
	}
	for i, s := range ts {
		if i == start {
			continue
		}
		minus := s.neg != neg
		s.neg = false
		y, err := l.product(s)
		if err != nil {
			return x, err
		}
		if minus {
			x = l.t.Sub(x, y)
		} else {
			x = l.t.Add(x, y)
		}
	}
	if neg {
		x = l.t.Neg(x)
	}
	return x, nil
}

// commonFactor finds the factor that most summands share (two at least) and
// the least power in which they do.
func commonFactor(ts []summandForm) (string, int) {
	count := map[string]int{}
	least := map[string]int{}
	var keys []string
	for _, s := range ts {
		for _, f := range s.fs {
			k := f.f.String()
			if count[k] == 0 {
				keys = append(keys, k)
				least[k] = f.n
			}
			count[k]++
			least[k] = min(least[k], f.n)
		}
	}
	sort.SliceStable(keys, func(i, j int) bool { return count[keys[i]] > count[keys[j]] })
	if len(keys) == 0 || count[keys[0]] < 2 {
		return "", 0
	}
	return keys[0], least[keys[0]]
}

// horner is factor^n * (summands that have it) + (the others).
func (l *lowerer[T]) horner(ts []summandForm, key string, n int) (x T, err error) {
	var in, out []summandForm
	var factor *Form
	for _, s := range ts {
		at := -1
		for i, f := range s.fs {
			if f.f.String() == key {
				at, factor = i, f.f
			}
		}
		if at < 0 {
			out = append(out, s)
			continue
		}
		fs := append([]factorForm(nil), s.fs...)
		if fs[at].n -= n; fs[at].n == 0 {
			fs = append(fs[:at], fs[at+1:]...)
		}
		s.fs = fs
		in = append(in, s)
	}
	y, err := l.sum(in)
	if err != nil {
		return x, err
	}
	p, err := l.natural(factor, n)
	if err != nil {
		return x, err
	}
	y = l.t.Mul(p, y)
	if len(out) == 0 {
		return y, nil
	}
	if len(out) == 1 && out[0].neg {
		out[0].neg = false
		z, err := l.product(out[0])
		return l.t.Sub(y, z), err
	}
	z, err := l.sum(out)
	return l.t.Add(y, z), err
}
