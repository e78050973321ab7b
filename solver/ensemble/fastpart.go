package ensemble

import (
	"errors"
	"fmt"
	"math"

	"epslim/solver/kernel"

	"gonum.org/v1/gonum/mat"
)

// fastIndices returns the indices of the fast variables.
func (m *Model) fastIndices() []int {
	var list []int
	for i, v := range m.Variables {
		if v.Fast {
			list = append(list, i)
		}
	}
	return list
}

// fastPart is a system dy = (a + B y) dt + G dW of the fast variables y, where
// a, B and G depend on slow variables only. With those held fixed, y after a
// step is Gaussian with known mean and covariance.
type fastPart struct {
	index   []int
	a       []kernel.Node
	slope   [][]kernel.Node
	columns []int           // Wiener processes of the fast variables
	noise   [][]kernel.Node // rows for index, entries for columns
	coupled bool            // B is not diagonal, or one Wiener process feeds variables of different slopes
}

// newFastPart finds the linear structure or says what is in its way.
func newFastPart(m *Model, b *bound, index []int) (*fastPart, error) {
	if len(index) == 0 {
		return nil, errors.New("the model has no fast variables")
	}
	f := &fastPart{index: index}
	var names []string
	isFast := map[int]bool{}
	for _, i := range index {
		names = append(names, m.Variables[i].Name)
		isFast[i] = true
	}
	for j := range m.wiener() {
		inFast, inSlow := false, false
		for i := range b.noise {
			if b.noise[i][j] != 0 {
				inFast, inSlow = inFast || isFast[i], inSlow || !isFast[i]
			}
		}
		if inFast && inSlow {
			return nil, fmt.Errorf("Wiener process %s moves slow and fast variables", m.wienerName(j))
		}
		if inFast {
			f.columns = append(f.columns, j)
		}
	}
	for k, i := range index {
		v := m.Variables[i]
		a, slope, ok := b.graph.Affine(b.drift[i], names...)
		if !ok {
			return nil, fmt.Errorf("the drift of %q is not linear in the fast variables", v.Name)
		}
		if b.graph.DependsOn(b.drift[i], TimeInput) {
			return nil, fmt.Errorf("the drift of %q depends on time", v.Name)
		}
		row := make([]kernel.Node, len(f.columns))
		for n, j := range f.columns {
			if row[n] = b.noise[i][j]; b.graph.DependsOn(row[n], names...) {
				return nil, fmt.Errorf("the noise of %q depends on fast variables", v.Name)
			}
		}
		for n := range slope {
			f.coupled = f.coupled || n != k && slope[n] != 0
			if slope[n] != 0 && v.Domain.Kind != Line {
				return nil, fmt.Errorf("the drift of %q on its domain (%s) depends on a fast variable", v.Name, v.Domain.Kind)
			}
		}
		switch v.Domain.Kind {
		case Line, Circle, Periodic:
		default:
			return nil, fmt.Errorf("%q lives on a domain of kind %s", v.Name, v.Domain.Kind)
		}
		f.a, f.slope, f.noise = append(f.a, a), append(f.slope, slope), append(f.noise, row)
	}
	f.coupled = f.coupled || f.mixed()
	if f.coupled {
		if _, _, ok := f.numbers(b.graph); !ok {
			return nil, errors.New("the fast variables are coupled, or share noise, with coefficients that depend on slow variables")
		}
	}
	return f, nil
}

// mixed reports whether one Wiener process feeds two variables of different
// slopes: their increments are then correlated, but not fully.
func (f *fastPart) mixed() bool {
	for n := range f.columns {
		first := -1
		for k := range f.index {
			switch {
			case f.noise[k][n] == 0:
			case first < 0:
				first = k
			case f.slope[k][k] != f.slope[first][first]:
				return true
			}
		}
	}
	return false
}

func (m *Model) wienerName(j int) string {
	if j < len(m.Wiener) {
		return m.Wiener[j]
	}
	return fmt.Sprintf("number %d", j+1)
}

// step advances the fast variables of x by the time c.h.
func (f *fastPart) step(c *construction, x []kernel.Node) ([]kernel.Node, error) {
	if f.coupled {
		return f.stepCoupled(c, x)
	}
	next := append([]kernel.Node(nil), x...)
	g := c.b.graph
	z := make([]kernel.Node, len(f.columns))
	for n, j := range f.columns {
		z[n] = c.normal(j)
	}
	for k, i := range f.index {
		a := c.at([]kernel.Node{f.a[k], f.slope[k][k]}, x)
		row := c.at(f.noise[k], x)
		mean := g.Add(x[i], g.Scale(c.h, a[0]))
		spread := g.Const(math.Sqrt(c.h))
		if f.slope[k][k] != 0 {
			u := g.Scale(c.h, a[1])
			mean = g.FMA(x[i], g.Exp(u), g.Mul(g.Scale(c.h, a[0]), growth(g, u)))
			spread = g.Scale(math.Sqrt(c.h), g.Sqrt(growth(g, g.Scale(2, u))))
		}
		next[i] = mean
		for n := range row {
			next[i] = g.Add(next[i], g.Mul(g.Mul(spread, row[n]), z[n]))
		}
	}
	return next, nil
}

// growth returns (e^u - 1)/u, for a number u without cancellation.
func growth(g *kernel.Builder, u kernel.Node) kernel.Node {
	if v, ok := g.Value(u); ok {
		if v == 0 {
			return g.Const(1)
		}
		return g.Const(math.Expm1(v) / v)
	}
	return g.Div(g.Sub(g.Exp(u), g.Const(1)), u)
}

// numbers returns B and G when all their entries are numbers.
func (f *fastPart) numbers(g *kernel.Builder) (b, noise *mat.Dense, ok bool) {
	n := len(f.index)
	b = mat.NewDense(n, n, nil)
	noise = mat.NewDense(n, max(1, len(f.columns)), nil)
	for i := range n {
		for k := range n {
			v, ok := g.Value(f.slope[i][k])
			if !ok {
				return nil, nil, false
			}
			b.Set(i, k, v)
		}
		for k := range f.columns {
			v, ok := g.Value(f.noise[i][k])
			if !ok {
				return nil, nil, false
			}
			noise.Set(i, k, v)
		}
	}
	return b, noise, true
}

// stepCoupled is the exact step for constant matrices: y -> e^{Bh} y +
// int_0^h e^{Bs} ds a + L z with L L^T = int_0^h e^{Bs} G G^T e^{B^T s} ds, the
// integrals from exponentials of block matrices (Van Loan 1978).
func (f *fastPart) stepCoupled(c *construction, x []kernel.Node) ([]kernel.Node, error) {
	g := c.b.graph
	b, noise, _ := f.numbers(g)
	n := len(f.index)
	propagator, integral, cov := gaussianStep(b, noise, c.h)
	factor, err := lowerFactor(cov)
	if err != nil {
		return nil, err
	}
	z := make([]kernel.Node, n)
	for k := range z {
		column := -1
		if k < len(f.columns) {
			column = f.columns[k]
		}
		z[k] = c.normal(column)
	}
	a := c.at(f.a, x)
	next := append([]kernel.Node(nil), x...)
	for i, target := range f.index {
		sum := g.Const(0)
		for k, source := range f.index {
			sum = g.Add(sum, g.Scale(propagator.At(i, k), x[source]))
			sum = g.Add(sum, g.Scale(integral.At(i, k), a[k]))
			sum = g.Add(sum, g.Scale(factor.At(i, k), z[k]))
		}
		next[target] = sum
	}
	return next, nil
}

// gaussianStep returns e^{Bh}, its integral over [0, h] and the covariance.
func gaussianStep(b, noise *mat.Dense, h float64) (propagator, integral, cov *mat.Dense) {
	n, _ := b.Dims()
	var gg mat.Dense
	gg.Mul(noise, noise.T())
	block := mat.NewDense(2*n, 2*n, nil)
	ones := mat.NewDense(2*n, 2*n, nil)
	for i := range n {
		for k := range n {
			block.Set(i, k, -b.At(i, k)*h)
			block.Set(i, n+k, gg.At(i, k)*h)
			block.Set(n+i, n+k, b.At(k, i)*h)
			ones.Set(i, k, b.At(i, k)*h)
		}
		ones.Set(i, n+i, h)
	}
	var e, o mat.Dense
	e.Exp(block)
	o.Exp(ones)
	propagator = mat.DenseCopyOf(e.Slice(n, 2*n, n, 2*n).T())
	integral = mat.DenseCopyOf(o.Slice(0, n, n, 2*n))
	cov = new(mat.Dense)
	cov.Mul(propagator, e.Slice(0, n, n, 2*n))
	return propagator, integral, cov
}

// lowerFactor returns L with L L^T equal to the symmetric non-negative matrix a,
// which may be singular.
func lowerFactor(a *mat.Dense) (*mat.Dense, error) {
	n, _ := a.Dims()
	l := mat.NewDense(n, n, nil)
	for j := range n {
		d := a.At(j, j)
		for k := range j {
			d -= l.At(j, k) * l.At(j, k)
		}
		tiny := 1e-13 * math.Abs(a.At(j, j))
		if math.IsNaN(d) || d < -1e3*tiny {
			return nil, fmt.Errorf("ensemble: the covariance of a fast step is not positive (pivot %g)", d)
		}
		if d <= tiny {
			continue
		}
		l.Set(j, j, math.Sqrt(d))
		for i := j + 1; i < n; i++ {
			s := (a.At(i, j) + a.At(j, i)) / 2
			for k := range j {
				s -= l.At(i, k) * l.At(j, k)
			}
			l.Set(i, j, s/l.At(j, j))
		}
	}
	return l, nil
}
