package algebra

import "testing"

// The expressions have the size that closures of a few moments produce: tens
// of terms, two or three denominators, derivatives of one function.
const (
	benchA = "v*(D*diff(v,x) - omega_*diff(v,y))/(2*(D^2+omega_^2)) + (a*x^2 + b*y)/(D + a) + v*cos(theta)*sin(2*theta)/(D+k)"
	benchB = "(D*omega_*diff(v,x,2) + v^2*diff(v,x,y))/((D^2+omega_^2)*(D+a)) - (x + y + b)^3/(4*D^2 + omega_^2) + sin(theta)/v"
)

func benchPair(b *testing.B) (Expr, Expr) {
	r := testRing(b)
	return mustRead(b, r, benchA), mustRead(b, r, benchB)
}

func BenchmarkMul(b *testing.B) {
	x, y := benchPair(b)
	b.ReportAllocs()
	for b.Loop() {
		x.Mul(y)
	}
}

func BenchmarkAdd(b *testing.B) {
	x, y := benchPair(b)
	b.ReportAllocs()
	for b.Loop() {
		x.Add(y)
	}
}

// BenchmarkMulPoly is the product of two polynomials of 84 and 56 terms.
func BenchmarkMulPoly(b *testing.B) {
	r := testRing(b)
	x, y := mustRead(b, r, "(x+y+z+1)^6").n.num, mustRead(b, r, "(x+a-z+2)^5").n.num
	b.ReportAllocs()
	for b.Loop() {
		r.mulPoly(x, y)
	}
}

// BenchmarkDivExact divides that product back.
func BenchmarkDivExact(b *testing.B) {
	r := testRing(b)
	x, y := mustRead(b, r, "(x+y+z+1)^6").n.num, mustRead(b, r, "(x+a-z+2)^5").n.num
	p := r.mulPoly(x, y)
	b.ReportAllocs()
	for b.Loop() {
		if _, ok := r.divExact(p, y); !ok {
			b.Fatal("does not divide")
		}
	}
}

func BenchmarkGCD(b *testing.B) {
	r := testRing(b)
	g := mustRead(b, r, "D^2*x + omega_*y + a*b*x*y + 1")
	x := mustRead(b, r, "(x^2 + a*y + D)*(x - y + b)").Mul(g).n.num
	y := mustRead(b, r, "(x*y + a + omega_)*(x + 2*y - D)").Mul(g).n.num
	b.ReportAllocs()
	for b.Loop() {
		if len(r.gcdPoly(x, y)) != len(g.n.num) {
			b.Fatal("wrong gcd")
		}
	}
}

func BenchmarkDiff(b *testing.B) {
	x, y := benchPair(b)
	z := x.Mul(y)
	b.ReportAllocs()
	for b.Loop() {
		z.Diff("x")
	}
}

func BenchmarkString(b *testing.B) {
	x, _ := benchPair(b)
	b.ReportAllocs()
	for b.Loop() {
		_ = x.Form().String()
	}
}

func BenchmarkLaTeX(b *testing.B) {
	x, _ := benchPair(b)
	f := x.Form()
	b.ReportAllocs()
	for b.Loop() {
		f.LaTeX(LatexOptions{})
	}
}

func BenchmarkSubs(b *testing.B) {
	x, y := benchPair(b)
	b.ReportAllocs()
	for b.Loop() {
		if _, err := x.Subs(map[string]Expr{"x": y.Ring().Int(3), "D": y.Ring().Frac(4, 5)}); err != nil {
			b.Fatal(err)
		}
	}
}
