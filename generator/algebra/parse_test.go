package algebra

import (
	"fmt"
	"math/big"
	"strings"
	"testing"
	"unicode"
)

// read is a small reader of the expression language for the tests of this
// package; the one users meet is in generator/ito.
type reader struct {
	r   *Ring
	s   string
	pos int
}

func mustRead(t testing.TB, r *Ring, s string) Expr {
	t.Helper()
	e, err := readExpr(r, s)
	if err != nil {
		t.Fatalf("read %q: %v", s, err)
	}
	return e
}

func readExpr(r *Ring, s string) (e Expr, err error) {
	defer func() {
		if x := recover(); x != nil {
			if er, ok := x.(error); ok {
				err = er
				return
			}
			panic(x)
		}
	}()
	p := &reader{r: r, s: s}
	e = p.expr(0)
	p.space()
	if p.pos != len(p.s) {
		return e, fmt.Errorf("trailing %q", p.s[p.pos:])
	}
	return e, nil
}

func (p *reader) space() {
	for p.pos < len(p.s) && p.s[p.pos] == ' ' {
		p.pos++
	}
}

func (p *reader) peek() byte {
	p.space()
	if p.pos < len(p.s) {
		return p.s[p.pos]
	}
	return 0
}

func check(e Expr, err error) Expr {
	if err != nil {
		panic(err)
	}
	return e
}

func (p *reader) expr(min int) Expr {
	var left Expr
	switch c := p.peek(); {
	case c == '-':
		p.pos++
		left = p.expr(2).Neg()
	case c == '(':
		p.pos++
		left = p.expr(0)
		p.expect(')')
	case c >= '0' && c <= '9':
		start := p.pos
		for p.pos < len(p.s) && (p.s[p.pos] >= '0' && p.s[p.pos] <= '9' || p.s[p.pos] == '.') {
			p.pos++
		}
		q, _ := new(big.Rat).SetString(p.s[start:p.pos])
		left = p.r.Rat(q)
	default:
		left = p.name()
	}
	for {
		c := p.peek()
		switch {
		case (c == '+' || c == '-') && min <= 1:
			p.pos++
			right := p.expr(2)
			if c == '-' {
				right = right.Neg()
			}
			left = left.Add(right)
		case (c == '*' || c == '/') && min <= 2:
			p.pos++
			right := p.expr(3)
			if c == '/' {
				left = check(left.Div(right))
			} else {
				left = left.Mul(right)
			}
		case c == '^' && min <= 4:
			p.pos++
			left = check(left.Pow(p.expr(4)))
		default:
			return left
		}
	}
}

func (p *reader) expect(c byte) {
	if p.peek() != c {
		panic(fmt.Errorf("expected %c at %d in %q", c, p.pos, p.s))
	}
	p.pos++
}

func (p *reader) ident() string {
	start := p.pos
	for p.pos < len(p.s) && (p.s[p.pos] >= 128 || unicode.IsLetter(rune(p.s[p.pos])) || unicode.IsDigit(rune(p.s[p.pos])) || p.s[p.pos] == '_') {
		p.pos++
	}
	return p.s[start:p.pos]
}

func (p *reader) name() Expr {
	id := p.ident()
	if id == "" {
		panic(fmt.Errorf("unexpected %q", p.s[p.pos:]))
	}
	if p.peek() != '(' {
		if e, ok := p.r.Symbol(id); ok {
			return e
		}
		if f, ok := p.r.funcs[id]; ok {
			args := make([]Expr, len(f.args))
			for i, a := range f.args {
				args[i], _ = p.r.Symbol(a)
			}
			return check(p.r.Call(id, args...))
		}
		panic(fmt.Errorf("unknown %s", id))
	}
	p.pos++
	var args []Expr
	for p.peek() != ')' {
		args = append(args, p.expr(0))
		if p.peek() == ',' {
			p.pos++
		}
	}
	p.pos++
	switch id {
	case "diff":
		e := args[0]
		for i := 1; i < len(args); i++ {
			v := args[i].String()
			n := 1
			if i+1 < len(args) {
				if q, ok := args[i+1].IsConstant(); ok {
					n = int(q.Num().Int64())
					i++
				}
			}
			e = e.DiffN(v, n)
		}
		return e
	case "at":
		with := map[string]Expr{}
		for i := 1; i+1 < len(args); i += 2 {
			with[args[i].String()] = args[i+1]
		}
		return check(args[0].Subs(with))
	case "integral":
		return p.r.Integral(args[0], args[1].String(), args[2], args[3])
	}
	return check(p.r.Call(id, args...))
}

// testRing declares the names the tests use.
func testRing(t testing.TB) *Ring {
	t.Helper()
	r := NewRing()
	for _, n := range strings.Fields("x y z theta phi s_") {
		r.Declare(n, Attr{})
	}
	for _, n := range strings.Fields("D omega_ a b c tau k") {
		s := AnyReal
		if strings.Contains("D a tau k", n) {
			s = Positive
		}
		r.Declare(n, Attr{Sign: s, Parameter: true})
	}
	r.Declare("n", Attr{Integer: true, Parameter: true})
	r.Declare("p", Attr{Sign: NonNegative, Parameter: true})
	r.Declare("m", Attr{Sign: Negative, Parameter: true})
	for _, d := range []struct {
		name string
		args []string
		s    Sign
	}{{"v", []string{"x", "y"}, Positive}, {"U", []string{"x", "y"}, AnyReal}, {"g", []string{"x"}, Positive}, {"h", []string{"x"}, AnyReal}} {
		if err := r.DeclareFunction(d.name, d.args, Attr{Sign: d.s}); err != nil {
			t.Fatal(err)
		}
	}
	return r
}
