package volume

import (
	"context"
	"math"
	"math/big"
	"math/rand/v2"
	"testing"

	"epslim/solver/grid"
)

// Bernoulli's function against a 2000-bit Taylor series of exp.
func TestBernoulli(t *testing.T) {
	exact := func(z float64) float64 {
		const prec = 2000
		x := new(big.Float).SetPrec(prec).SetFloat64(z)
		term := new(big.Float).SetPrec(prec).SetFloat64(1)
		sum := new(big.Float).SetPrec(prec)
		for n := 1; n < 300+int(4*math.Abs(z)); n++ { // (exp(z)-1)/z
			sum.Add(sum, term)
			term.Mul(term, x)
			term.Quo(term, new(big.Float).SetPrec(prec).SetInt64(int64(n+1)))
		}
		v, _ := new(big.Float).SetPrec(prec).Quo(new(big.Float).SetPrec(prec).SetInt64(1), sum).Float64()
		return v
	}
	for _, z := range []float64{0, 1e-300, 1e-12, -1e-9, 1e-5, 0.01, -0.3, 0.4999, 0.5, -0.5, 0.51, 1, -1, 3, -7, 30, -30, 200, -600, 600} {
		want := exact(z)
		if got := Bernoulli(z); math.Abs(got-want) > 8e-16*want {
			t.Errorf("B(%g) = %.17g, want %.17g", z, got, want)
		}
		m, p := bernoulliPair(z)
		if wantM := exact(-z); math.Abs(m-wantM) > 8e-16*wantM || math.Abs(p-want) > 8e-16*want {
			t.Errorf("pair at %g: %.17g %.17g", z, m, p)
		}
	}
	if Bernoulli(1e6) != 0 || Bernoulli(-1e6) != 1e6 {
		t.Error("limits")
	}
}

func axes(t *testing.T, a ...grid.Axis) *grid.Grid {
	t.Helper()
	g, err := grid.New(a...)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func uniform(t *testing.T, name string, lo, hi float64, n int, side grid.Side) grid.Axis {
	t.Helper()
	a, err := grid.Uniform(name, lo, hi, n, side)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

func swirl(dim int) Coefficients {
	return Func(func(x, f, a []float64) {
		for d := range f {
			f[d] = math.Sin(3*x[d]) + x[(d+1)%dim]
			a[Entry(dim, d, d)] = 1 + 0.5*math.Cos(x[(d+1)%dim]+float64(d))
		}
	})
}

// Columns of M add up to zero without absorbing sides; the adjoint is the
// transpose; elimination inverts; the null vector is positive.
func TestOperatorIdentities(t *testing.T) {
	R, P, A := grid.Reflecting, grid.Periodic, grid.Absorbing
	for _, sides := range [][]grid.Side{{R}, {P}, {A}, {R, R}, {P, R}, {R, P}, {P, P}, {A, P}, {R, R, R}, {P, A, R}, {P, P, P}} {
		var ax []grid.Axis
		for d, s := range sides {
			ax = append(ax, uniform(t, string(rune('x'+d)), -1, 1+float64(d), 5+d, s))
		}
		g := axes(t, ax...)
		m, err := Assemble(context.Background(), g, swirl(g.Dim()), Settings{Workers: 2})
		if err != nil {
			t.Fatal(err)
		}
		l := &m.Layout
		rng := rand.New(rand.NewPCG(1, 2))
		random := func() []float64 {
			c := make([]float64, g.Cells())
			for i := range c {
				c[i] = rng.Float64() - 0.5
			}
			v := l.Vector()
			l.Pack(v, c)
			return v
		}
		dot := func(a, b []float64) (s float64) {
			for r := 0; r < l.Rows; r++ {
				for i := 0; i < l.Nx; i++ {
					s += a[l.Row(r)+i] * b[l.Row(r)+i]
				}
			}
			return
		}
		x, y, mx, my, ones := random(), random(), l.Vector(), l.Vector(), l.Vector()
		for i := range ones {
			ones[i] = 1
		}
		m.Apply(mx, x, 0.3)
		m.ApplyAdjoint(my, y, 0.3)
		if a, b := dot(y, mx), dot(my, x); math.Abs(a-b) > 1e-12 {
			t.Errorf("%v: y.Mx = %g, x.M^Ty = %g", sides, a, b)
		}
		m.Apply(mx, x, 0)
		if !g.HasAbsorbing() && math.Abs(dot(ones, mx)) > 1e-12 {
			t.Errorf("%v: outflows add up to %g", sides, dot(ones, mx))
		}
		e, err := Eliminate(m, 0.3, nil)
		if err != nil {
			t.Fatal(err)
		}
		sol := l.Vector()
		m.Apply(mx, x, 0.3)
		e.Solve(sol, mx)
		m.ApplyAdjoint(my, y, 0.3)
		back := l.Vector()
		e.SolveAdjoint(back, my)
		for r := 0; r < l.Rows; r++ {
			for i := 0; i < l.Nx; i++ {
				k := l.Row(r) + i
				if math.Abs(sol[k]-x[k]) > 1e-11 || math.Abs(back[k]-y[k]) > 1e-11 {
					t.Fatalf("%v: elimination is off by %g and %g", sides, sol[k]-x[k], back[k]-y[k])
				}
			}
		}
		e, err = Eliminate(m, 0, nil)
		if err != nil {
			t.Fatal(err)
		}
		if e.Singular() == g.HasAbsorbing() {
			t.Errorf("%v: singular %v", sides, e.Singular())
		}
		if e.Singular() {
			e.Stationary(sol)
			m.Apply(mx, sol, 0)
			for r := 0; r < l.Rows; r++ {
				for i := 0; i < l.Nx; i++ {
					k := l.Row(r) + i
					if sol[k] <= 0 || math.Abs(mx[k]) > 1e-13 {
						t.Fatalf("%v: null vector %g with residual %g", sides, sol[k], mx[k])
					}
				}
			}
		}
	}
}

// The vector kernel gives the bits of the portable loop.
func TestFluxKernelBits(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	random := func(n int) []float64 {
		v := make([]float64, n)
		for i := range v {
			v[i] = rng.Float64()*2 - 1
		}
		return v
	}
	for _, n := range []int{1, 8, 13, 64} {
		for links := 1; links <= maxLinks; links++ {
			x, y := random(n), random(n)
			var views []linkView
			var rows []linkRow
			for i := 0; i < links; i++ {
				v := linkView{random(n), random(n), random(n), random(n), random(n), random(n)}
				views = append(views, v)
				rows = append(rows, linkRow{&v.out[0], &v.back[0], &v.xu[0], &v.outd[0], &v.backd[0], &v.xd[0]})
			}
			fluxRow(y, x, views, rows)
			for i := range y {
				var want float64
				for _, v := range views {
					want += (float64(v.out[i]*x[i]) - float64(v.back[i]*v.xu[i])) - (float64(v.outd[i]*v.xd[i]) - float64(v.backd[i]*x[i]))
				}
				if y[i] != want {
					t.Fatalf("n=%d links=%d cell %d: %v, portable %v", n, links, i, y[i], want)
				}
			}
		}
	}
}
