package present

import (
	"math/big"
	"regexp"
	"strings"
	"sync"

	"epslim/cmd/epslim/derivation"
)

// The sentences of the derivation hold small pieces of mathematics in plain
// characters; rich finds them, so that each output sets them in its own way.

func transposed(m Math) Math {
	return Math{m.Text + "ᵀ", m.TeX + `^{\mathsf{T}}`, "<msup><mrow>" + m.MathML + "</mrow><mi>T</mi></msup>"}
}

// fragments are the pieces with a fixed spelling, longest first.
func (n *notation) fragments() []struct {
	plain string
	m     Math
} {
	l0 := sub(scriptL, integer(0))
	f, h, a, phi := n.own("f"), n.own("h"), n.own("A"), n.own("Φ")
	zero := join(equals, integer(0))
	s := n.own("σ")
	ss := join(s, transposed(s))
	inverse := power(a, big.NewRat(-1, 1))
	nabla := Math{"∇·", `\nabla\cdot `, mi("∇") + mo("·")}
	divA, divJ := join(nabla, a), join(nabla, n.own("J"))
	two := join(integer(2), f)
	return []struct {
		plain string
		m     Math
	}{
		{"h = A^-1 (2 f - div A)", join(h, equals, inverse, paren(join(two, op("−", "-"), divA)))},
		{"L0 Phi + f - <f> = 0", join(l0, phi, op("+", "+"), f, op("−", "-"), mean(f), zero)},
		{"L0 Phi + f - <f>", join(l0, phi, op("+", "+"), f, op("−", "-"), mean(f))},
		{"sigma sigma^T - A = 0", join(ss, op("−", "-"), a, zero)},
		{"A = sigma sigma^T", join(a, equals, ss)},
		{"sigma sigma^T = A", join(ss, equals, a)},
		{"sigma sigma^T", ss},
		{"div J / p", join(divJ, bare("/", "/"), n.own("p"))},
		{"div J = 0", join(divJ, zero)},
		{"div J", divJ},
	}
}

// The patterns are compiled on first use: most runs of the program need none.
var (
	powerText = sync.OnceValue(func() *regexp.Regexp { return regexp.MustCompile(`([\pL_][\pL\pN_]*)\^\((-?[0-9/.e+-]+)\)`) })
	arrowText = sync.OnceValue(func() *regexp.Regexp { return regexp.MustCompile(`([\pL_][\pL\pN_]*) -> 0`) })
	loneField = sync.OnceValue(func() *regexp.Regexp { return regexp.MustCompile(`\bh\b`) })
)

// rich is a sentence with its formulas set as such.
func (n *notation) rich(s string) []Span {
	for _, f := range n.fragments() {
		if before, after, ok := strings.Cut(s, f.plain); ok {
			return append(append(n.rich(before), inline(f.m)), n.rich(after)...)
		}
	}
	if i := find(powerText, s, "^("); i != nil {
		if q, ok := new(big.Rat).SetString(s[i[4]:i[5]]); ok {
			m := power(n.symbol(s[i[2]:i[3]]), q)
			if !q.IsInt() {
				b := n.symbol(s[i[2]:i[3]])
				e := minus(s[i[4]:i[5]])
				m = Math{b.Text + "^(" + e + ")", b.TeX + "^{" + s[i[4]:i[5]] + "}", "<msup><mrow>" + b.MathML + "</mrow><mn>" + e + "</mn></msup>"}
			}
			return append(append(n.rich(s[:i[0]]), inline(m)), n.rich(s[i[1]:])...)
		}
	}
	if i := find(arrowText, s, "-> 0"); i != nil {
		m := join(n.symbol(s[i[2]:i[3]]), op("→", `\to`), integer(0))
		return append(append(n.rich(s[:i[0]]), inline(m)), n.rich(s[i[1]:])...)
	}
	if i := find(loneField, s, "h"); i != nil {
		return append(append(n.rich(s[:i[0]]), inline(n.own("h"))), n.rich(s[i[1]:])...)
	}
	if s == "" {
		return nil
	}
	return []Span{text(s)}
}

// find runs a pattern on a text that holds what every match holds.
func find(pattern func() *regexp.Regexp, s, part string) []int {
	if !strings.Contains(s, part) {
		return nil
	}
	return pattern().FindStringSubmatchIndex(s)
}

// Rich is a sentence about a derivation with its formulas set as such.
func Rich(res *derivation.Result, s string) []Span { return newTeller(res).rich(s) }

// WitnessSpans shows why a claim was refuted: the point, both values and the
// difference, one line each.
func WitnessSpans(res *derivation.Result, v derivation.Verdict) [][]Span {
	if v.Witness == nil {
		return nil
	}
	w := *v.Witness
	w.Slip = ""
	return newTeller(res).witness(&w)
}
