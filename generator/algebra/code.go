package algebra

import (
	"fmt"
	"math/big"
	"strconv"
	"strings"
)

// Language is a programming language that forms can be written in.
type Language uint8

// The languages, with the names that the text relies on.
const (
	Go     Language = iota // package math, cmp for sign
	C                      // math.h
	Python                 // numpy as np, scipy.special as special
	Julia                  // SpecialFunctions
)

func (l Language) String() string {
	return [...]string{"Go", "C", "Python", "Julia"}[l]
}

// language describes how one language writes what they write differently.
type language struct {
	call     func(name string) string // "" where there is none
	pow      string                   // the operator, "" for a call
	powCall  string
	reserved string // words that names must avoid
	pi       string
	sign     string // format with the argument twice at most
}

var codeNames = map[Language]map[string]string{
	Go: {"exp": "math.Exp", "log": "math.Log", "sin": "math.Sin", "cos": "math.Cos", "tan": "math.Tan", "sinh": "math.Sinh",
		"cosh": "math.Cosh", "tanh": "math.Tanh", "abs": "math.Abs", "sqrt": "math.Sqrt", "erf": "math.Erf", "gamma": "math.Gamma", "cbrt": "math.Cbrt"},
	C: {"exp": "exp", "log": "log", "sin": "sin", "cos": "cos", "tan": "tan", "sinh": "sinh", "cosh": "cosh", "tanh": "tanh",
		"abs": "fabs", "sqrt": "sqrt", "erf": "erf", "gamma": "tgamma", "cbrt": "cbrt"},
	Python: {"exp": "np.exp", "log": "np.log", "sin": "np.sin", "cos": "np.cos", "tan": "np.tan", "sinh": "np.sinh", "cosh": "np.cosh",
		"tanh": "np.tanh", "abs": "np.abs", "sign": "np.sign", "sqrt": "np.sqrt", "erf": "special.erf", "gamma": "special.gamma",
		"besseli": "special.iv", "polygamma": "special.polygamma", "cbrt": "np.cbrt"},
	Julia: {"exp": "exp", "log": "log", "sin": "sin", "cos": "cos", "tan": "tan", "sinh": "sinh", "cosh": "cosh", "tanh": "tanh",
		"abs": "abs", "sign": "sign", "sqrt": "sqrt", "erf": "erf", "gamma": "gamma", "besseli": "besseli", "polygamma": "polygamma", "cbrt": "cbrt"},
}

func (l Language) table() language {
	t := language{call: func(n string) string { return codeNames[l][n] }}
	switch l {
	case Go:
		t.powCall, t.pi, t.sign = "math.Pow", "math.Pi", "float64(cmp.Compare(%s, 0))"
		t.reserved = "break case chan const continue default defer else fallthrough for func go goto if import interface map package range return select struct switch type var math cmp"
	case C:
		t.powCall, t.pi, t.sign = "pow", "3.14159265358979323846", "(double)((%[1]s > 0) - (%[1]s < 0))"
		t.reserved = "auto break case char const continue default do double else enum extern float for goto if inline int long register restrict return short signed sizeof static struct switch typedef union unsigned void volatile while exp log sin cos tan sinh cosh tanh fabs sqrt erf tgamma cbrt pow gamma y0 y1 yn j0 j1 jn"
	case Python:
		t.pow, t.pi = "**", "np.pi"
		t.reserved = "False None True and as assert async await break class continue def del elif else except finally for from global if import in is lambda nonlocal not or pass raise return try while with yield np special"
	case Julia:
		t.pow, t.pi = "^", "pi"
		t.reserved = "baremodule begin break catch const continue do else elseif end export false finally for function global if import let local macro module quote return struct true try using while exp log sin cos tan sinh cosh tanh abs sign sqrt erf gamma besseli polygamma cbrt im"
	}
	return t
}

// Code writes the form as an expression of a programming language in double
// precision. Names keep their spelling, with an underscore added where the
// language reserves them. ErrNotLowered reports what the language's standard
// library does not have, derivatives of named functions, integrals and
// complex values.
func (f *Form) Code(l Language) (string, error) {
	c := &coder{l: l, t: l.table()}
	s := c.form(f, bindSum)
	return s, c.err
}

type coder struct {
	l   Language
	t   language
	err error
}

func (c *coder) fail(what string) string {
	if c.err == nil {
		c.err = fmt.Errorf("%w for %s in %s", ErrNotLowered, what, c.l)
	}
	return "0"
}

func (c *coder) name(s string) string {
	for _, w := range strings.Fields(c.t.reserved) {
		if w == s {
			return s + "_"
		}
	}
	return s
}

// number writes an integer as a floating-point literal.
func codeNumber(n *big.Int) string {
	if n.IsInt64() && n.BitLen() <= 53 {
		return n.String() + ".0"
	}
	f, _ := new(big.Float).SetInt(n).Float64()
	return strconv.FormatFloat(f, 'e', -1, 64)
}

func (c *coder) binding(f *Form) int {
	switch f.Op {
	case FormPower:
		if e := f.Args[1]; smallPower(e) && simpleBase(f.Args[0]) && c.t.pow == "" {
			return bindProduct
		}
		if q := oddRoot(f.Args[1]); q != nil {
			if q.Cmp(big.NewRat(1, 3)) == 0 {
				return bindAtom
			}
			return bindProduct
		}
		if c.t.pow == "" {
			return bindAtom
		}
	}
	return f.Binding()
}

// smallPower: 2, 3 and 4 are written out where there is no operator.
func smallPower(e *Form) bool {
	return e.Op == FormNumber && e.Num.IsInt() && e.Num.Cmp(big.NewRat(4, 1)) <= 0 && e.Num.Cmp(big.NewRat(2, 1)) >= 0
}

func simpleBase(f *Form) bool { return f.Op == FormSymbol }

// oddRoot returns the exponent where it is a fraction with odd denominator,
// which is real also for a negative base.
func oddRoot(e *Form) *big.Rat {
	neg := e.Op == FormNeg
	if neg {
		e = e.Args[0]
	}
	if e.Op != FormNumber || e.Num.IsInt() || e.Num.Denom().Bit(0) == 0 {
		return nil
	}
	if neg {
		return new(big.Rat).Neg(e.Num)
	}
	return e.Num
}

func (c *coder) form(f *Form, need int) string {
	s := c.bare(f)
	if c.binding(f) < need {
		return "(" + s + ")"
	}
	return s
}

func (c *coder) bare(f *Form) string {
	switch f.Op {
	case FormNumber:
		if f.Num.IsInt() {
			return codeNumber(f.Num.Num())
		}
		return codeNumber(f.Num.Num()) + "/" + codeNumber(f.Num.Denom())
	case FormSymbol:
		if f.Name == "pi" {
			return c.t.pi
		}
		return c.name(f.Name)
	case FormSum:
		var b strings.Builder
		for i, t := range f.Args {
			switch {
			case t.Op == FormNeg && i == 0:
				b.WriteString(c.form(t, bindNeg))
			case t.Op == FormNeg:
				b.WriteString(" - " + c.form(t.Args[0], bindProduct))
			case i == 0:
				b.WriteString(c.form(t, bindNeg))
			default:
				b.WriteString(" + " + c.form(t, bindProduct))
			}
		}
		return b.String()
	case FormNeg:
		return "-" + c.form(f.Args[0], bindProduct)
	case FormProduct:
		parts := make([]string, len(f.Args))
		for i, t := range f.Args {
			need := bindPower
			if i == 0 {
				need = bindProduct
			}
			parts[i] = c.form(t, need)
		}
		return strings.Join(parts, "*")
	case FormQuotient:
		return c.form(f.Args[0], bindProduct) + "/" + c.form(f.Args[1], bindPower)
	case FormPower:
		return c.power(f)
	case FormRoot:
		return c.t.call("sqrt") + "(" + c.form(f.Args[0], bindSum) + ")"
	case FormCall:
		return c.call(f)
	case FormImag:
		return c.fail("a complex value")
	case FormDiff:
		return c.fail("a derivative of " + f.Name)
	}
	return c.fail("an integral")
}

func (c *coder) power(f *Form) string {
	b, e := f.Args[0], f.Args[1]
	if q := oddRoot(e); q != nil {
		return c.oddRoot(b, q)
	}
	switch {
	case smallPower(e) && simpleBase(b) && c.t.pow == "":
		n := int(e.Num.Num().Int64())
		return strings.TrimSuffix(strings.Repeat(c.bare(b)+"*", n), "*")
	case c.t.pow == "":
		return c.t.powCall + "(" + c.form(b, bindSum) + ", " + c.form(e, bindSum) + ")"
	case e.Op == FormNumber && e.Num.IsInt():
		return c.form(b, bindAtom) + c.t.pow + e.Num.Num().String()
	}
	return c.form(b, bindAtom) + c.t.pow + c.form(e, bindAtom)
}

// oddRoot is the real root: sign(b) |b|^q for odd numerators.
func (c *coder) oddRoot(b *Form, q *big.Rat) string {
	x := c.form(b, bindSum)
	if q.Cmp(big.NewRat(1, 3)) == 0 {
		return c.t.call("cbrt") + "(" + x + ")"
	}
	e := codeNumber(q.Num()) + "/" + codeNumber(q.Denom())
	abs := c.t.call("abs") + "(" + x + ")"
	p := c.t.powCall + "(" + abs + ", " + e + ")"
	if c.t.pow != "" {
		p = abs + c.t.pow + "(" + e + ")"
	}
	if q.Num().Bit(0) == 0 {
		return p
	}
	return c.sign(x) + "*" + p
}

func (c *coder) sign(x string) string {
	if c.t.sign == "" {
		return c.t.call("sign") + "(" + x + ")"
	}
	if c.l == C && strings.ContainsAny(x, " +-*/") {
		x = "(" + x + ")"
	}
	return fmt.Sprintf(c.t.sign, x)
}

func (c *coder) call(f *Form) string {
	args := make([]string, len(f.Args))
	for i, a := range f.Args {
		args[i] = c.form(a, bindSum)
		if i == 0 && (f.Name == "besseli" || f.Name == "polygamma") && a.Op == FormNumber && a.Num.IsInt() {
			args[i] = a.Num.Num().String() // orders are integers
		}
	}
	if f.Name == "sign" {
		return c.sign(args[0])
	}
	if _, ok := builtins[f.Name]; ok || f.Name == "cis" {
		n := c.t.call(f.Name)
		if n == "" {
			return c.fail(f.Name)
		}
		return n + "(" + strings.Join(args, ", ") + ")"
	}
	return c.name(f.Name) + "(" + strings.Join(args, ", ") + ")"
}
