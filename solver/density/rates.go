package density

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"epslim/solver/grid"
	"epslim/solver/multigrid"
	"epslim/solver/volume"

	"gonum.org/v1/gonum/mat"
)

// Rate is an eigenvalue of the Fokker-Planck operator with its sign reversed: a
// perturbation along its mode decays as exp(-Value t).
type Rate struct {
	Value    complex128
	Residual float64 // estimated error relative to |Value + shift|
}

// krylovDimension bounds the Krylov space for the slowest modes.
const krylovDimension = 60

// DecayRates returns the count slowest decay rates in the order of their real
// parts. Without absorbing sides the stationary mode, rate zero, is left out, so
// that the first rate is the spectral gap. The method is Arnoldi's on the
// shifted inverse (Saad, Numerical Methods for Large Eigenvalue Problems, 2nd
// ed., SIAM 2011, chapters 6 and 8); an error estimate comes with each rate.
func DecayRates(ctx context.Context, g *grid.Grid, c volume.Coefficients, count int, s Settings) ([]Rate, error) {
	if count < 1 || count > krylovDimension/4 || count >= g.Cells() {
		return nil, fmt.Errorf("decay rates: %d asked for; between 1 and %d are computed", count, min(krylovDimension/4, g.Cells()-1))
	}
	m, err := assemble(ctx, g, c, s)
	if err != nil {
		return nil, err
	}
	shift := m.TypicalRate()
	sv, err := newLinear(ctx, m, c, shift, false, s)
	if err != nil {
		return nil, err
	}
	want := count
	if m.Kill == nil {
		want++
	}
	a := &arnoldi{m: m, sv: sv, volume: volumes(m), shift: shift}
	rates, err := a.run(ctx, want)
	if err != nil {
		return nil, err
	}
	if m.Kill == nil {
		zero := 0
		for i, r := range rates {
			if abs(r.Value) < abs(rates[zero].Value) {
				zero = i
			}
		}
		rates = slices.Delete(rates, zero, zero+1)
	}
	return rates[:min(count, len(rates))], nil
}

func abs(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

type arnoldi struct {
	m      *volume.Operator
	sv     *linear
	volume []float64
	shift  float64
	basis  [][]float64
	h      *mat.Dense
}

func (a *arnoldi) dot(x, y []float64) float64 {
	var t float64
	for i, v := range x {
		t += v * y[i]
	}
	return t
}

// run extends the Krylov space of (M + shift V)^-1 V until the wanted
// eigenvalues have settled.
func (a *arnoldi) run(ctx context.Context, want int) ([]Rate, error) {
	dim := min(krylovDimension, a.m.Grid.Cells())
	a.h = mat.NewDense(dim+1, dim, nil)
	a.basis = [][]float64{a.start()}
	rhs := a.m.Layout.Vector()
	var rates []Rate
	for j := 0; j < dim; j++ {
		x := a.m.Layout.Vector()
		for i, v := range a.volume {
			rhs[i] = v * a.basis[j][i]
		}
		o, _ := a.sv.solve(ctx, x, rhs)
		if o == multigrid.Cancelled {
			return nil, ctx.Err()
		}
		if o == multigrid.IterationLimit {
			return nil, fmt.Errorf("decay rates: %v", o)
		}
		for pass := 0; pass < 2; pass++ { // twice is enough (Kahan, Parlett)
			for i, b := range a.basis {
				d := a.dot(b, x)
				a.h.Set(i, j, a.h.At(i, j)+d)
				for k := range x {
					x[k] -= d * b[k]
				}
			}
		}
		norm := math.Sqrt(a.dot(x, x))
		a.h.Set(j+1, j, norm)
		done := norm < 1e-14
		if j+1 >= 2*want || done || j == dim-1 {
			rates = a.ritz(j+1, norm)
			if done || settled(rates, want) {
				break
			}
		}
		for k := range x {
			x[k] /= norm
		}
		a.basis = append(a.basis, x)
	}
	return rates, nil
}

func settled(rates []Rate, want int) bool {
	if len(rates) < want {
		return false
	}
	for _, r := range rates[:want] {
		if r.Residual > 1e-10 {
			return false
		}
	}
	return true
}

// start is a vector with components along all modes: pseudo-random, the same
// every time.
func (a *arnoldi) start() []float64 {
	l := &a.m.Layout
	v := l.Vector()
	seed := uint64(0x9e3779b97f4a7c15)
	for r := 0; r < l.Rows; r++ {
		for i := 0; i < l.Nx; i++ {
			seed ^= seed << 13
			seed ^= seed >> 7
			seed ^= seed << 17
			v[l.Row(r)+i] = 1 + float64(seed>>11)/(1<<53)
		}
	}
	n := math.Sqrt(a.dot(v, v))
	for i := range v {
		v[i] /= n
	}
	return v
}

// ritz returns the rates of the present space, slowest first.
func (a *arnoldi) ritz(n int, next float64) []Rate {
	var eig mat.Eigen
	if !eig.Factorize(a.h.Slice(0, n, 0, n), mat.EigenRight) {
		return nil
	}
	var vec mat.CDense
	eig.VectorsTo(&vec)
	var rates []Rate
	for i, mu := range eig.Values(nil) {
		if abs(mu) < 1e-14 {
			continue
		}
		norm := 0.0
		for k := 0; k < n; k++ {
			norm = math.Hypot(norm, abs(vec.At(k, i)))
		}
		rates = append(rates, Rate{1/mu - complex(a.shift, 0), next * abs(vec.At(n-1, i)) / norm / abs(mu)})
	}
	slices.SortFunc(rates, func(p, q Rate) int {
		if d := cmp.Compare(real(p.Value), real(q.Value)); d != 0 {
			return d
		}
		return cmp.Compare(imag(p.Value), imag(q.Value))
	})
	return rates
}
