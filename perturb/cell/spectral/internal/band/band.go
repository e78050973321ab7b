// Package band factorizes sparse matrices: banded LU with row interchanges after
// a narrowing reorder, or gonum's dense LU where the band would hold most of the
// matrix. It is shared by the spectral and the grid route.
package band

import (
	"context"
	"errors"
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"

	"epslim/perturb/cell/quadrature/fast"
)

// maxEntries bounds the memory of a factorization (in float64).
const maxEntries = 40_000_000

// Entry is one element of a row.
type Entry struct {
	Col int
	V   float64
}

// Matrix is a square matrix by rows.
type Matrix [][]Entry

func entries(a Matrix) int {
	n := 0
	for _, r := range a {
		n += len(r)
	}
	return n
}

// ErrSingular is a matrix without an inverse.
var ErrSingular = errors.New("band: singular matrix")

// banded is an LU factorization with row interchanges of a Matrix matrix after
// a symmetric reordering that makes its band narrow (reverse Cuthill-McKee).
type banded struct {
	n, lower, upper int // bandwidths; upper counts fill from interchanges
	order           []int
	scale           []float64 // row scaling, by original index
	lu              []float64 // row i holds columns i-lower .. i+upper
	pivot           []int
	smallest        float64 // smallest over largest pivot
}

func (b *banded) width() int { return b.lower + b.upper + 1 }

// Banded tries the reverse Cuthill-McKee order and the given ones and takes
// that with the narrowest band.
func Banded(ctx context.Context, a Matrix, orders [][]int) (*banded, error) {
	n := len(a)
	best := cuthillMcKee(a)
	cost := bandCost(a, best)
	for _, o := range orders {
		if c := bandCost(a, o); c < cost {
			best, cost = o, c
		}
	}
	b := &banded{n: n, order: best, scale: make([]float64, n), pivot: make([]int, n)}
	place := make([]int, n)
	for i, o := range b.order {
		place[o] = i
	}
	up := 0
	for i, row := range a {
		var largest float64
		for _, e := range row {
			largest = math.Max(largest, math.Abs(e.V))
			d := place[e.Col] - place[i]
			b.lower, up = max(b.lower, -d), max(up, d)
		}
		if largest == 0 {
			return nil, ErrSingular
		}
		b.scale[i] = 1 / largest
	}
	b.upper = up + b.lower
	w := b.width()
	if n*w > maxEntries {
		return nil, fast.ErrBudget
	}
	b.lu = make([]float64, n*w)
	for i, row := range a {
		r := place[i]
		for _, e := range row {
			b.lu[r*w+place[e.Col]-r+b.lower] += e.V * b.scale[i]
		}
	}
	return b, b.eliminate(ctx)
}

// Factors is a factorized matrix.
type Factors interface {
	Solve(rhs []float64) []float64
	SolveTransposed(rhs []float64) []float64
	// Condition is a lower bound on the condition number, from the pivots.
	Condition() float64
}

// Factorize takes a dense factorization where the band would hold most of the
// matrix anyway.
func Factorize(ctx context.Context, a Matrix, orders ...[]int) (Factors, error) {
	n := len(a)
	if entries(a) > n*n/3 && n > 50 {
		if n > 5000 {
			return nil, fast.ErrBudget
		}
		return newDense(a)
	}
	return Banded(ctx, a, orders)
}

// denseLU is gonum's factorization.
type denseLU struct {
	n  int
	lu mat.LU
}

func newDense(a Matrix) (*denseLU, error) {
	n := len(a)
	m := mat.NewDense(n, n, nil)
	for i, row := range a {
		for _, e := range row {
			m.Set(i, e.Col, e.V)
		}
	}
	d := &denseLU{n: n}
	d.lu.Factorize(m)
	if math.IsInf(d.lu.Cond(), 1) {
		return nil, ErrSingular
	}
	return d, nil
}

func (d *denseLU) Condition() float64 { return d.lu.Cond() }

func (d *denseLU) Solve(rhs []float64) []float64           { return d.run(rhs, false) }
func (d *denseLU) SolveTransposed(rhs []float64) []float64 { return d.run(rhs, true) }

func (d *denseLU) run(rhs []float64, trans bool) []float64 {
	var x mat.VecDense
	// A condition error comes with the solution; the caller judges it.
	_ = d.lu.SolveVecTo(&x, trans, mat.NewVecDense(d.n, rhs))
	return x.RawVector().Data
}

// bandCost is the product lower*(lower+upper) that the elimination costs per
// row.
func bandCost(a Matrix, order []int) float64 {
	place := make([]int, len(order))
	for i, o := range order {
		place[o] = i
	}
	lower, upper := 1, 1
	for i, row := range a {
		for _, e := range row {
			d := place[e.Col] - place[i]
			lower, upper = max(lower, -d), max(upper, d)
		}
	}
	return float64(lower) * float64(lower+upper)
}

func (b *banded) eliminate(ctx context.Context) error {
	n, w := b.n, b.width()
	small, large := math.Inf(1), 0.0
	for k := 0; k < n; k++ {
		if k%256 == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		last := min(n-1, k+b.lower)
		p, best := k, 0.0
		for i := k; i <= last; i++ {
			if v := math.Abs(b.lu[i*w+k-i+b.lower]); v > best {
				p, best = i, v
			}
		}
		if best == 0 {
			return ErrSingular
		}
		small, large = math.Min(small, best), math.Max(large, best)
		b.pivot[k] = p
		cols := min(n-1, k+b.upper) - k + 1
		top := b.lu[k*w+b.lower : k*w+b.lower+cols]
		if p != k {
			other := b.lu[p*w+k-p+b.lower : p*w+k-p+b.lower+cols]
			for j := range top {
				top[j], other[j] = other[j], top[j]
			}
		}
		inv := 1 / top[0]
		for i := k + 1; i <= last; i++ {
			row := b.lu[i*w+k-i+b.lower : i*w+k-i+b.lower+cols]
			f := row[0] * inv
			row[0] = f
			if f == 0 {
				continue
			}
			rest := row[1:]
			for j, t := range top[1:] {
				rest[j] -= f * t
			}
		}
	}
	b.smallest = small / large
	return nil
}

func (b *banded) Condition() float64 { return 1 / b.smallest }

// Solve returns x with A x = rhs.
func (b *banded) Solve(rhs []float64) []float64 {
	n, w := b.n, b.width()
	x := make([]float64, n)
	for i, o := range b.order {
		x[i] = rhs[o] * b.scale[o]
	}
	for k := 0; k < n; k++ {
		if p := b.pivot[k]; p != k {
			x[k], x[p] = x[p], x[k]
		}
		v := x[k]
		if v == 0 {
			continue
		}
		for i := k + 1; i <= min(n-1, k+b.lower); i++ {
			x[i] -= b.lu[i*w+k-i+b.lower] * v
		}
	}
	for k := n - 1; k >= 0; k-- {
		row := b.lu[k*w+b.lower : (k+1)*w]
		s := x[k]
		for j := 1; j <= min(n-1-k, b.upper); j++ {
			s -= row[j] * x[k+j]
		}
		x[k] = s / row[0]
	}
	out := make([]float64, n)
	for i, o := range b.order {
		out[o] = x[i]
	}
	return out
}

// SolveTransposed returns x with A' x = rhs.
func (b *banded) SolveTransposed(rhs []float64) []float64 {
	n, w := b.n, b.width()
	x := make([]float64, n)
	for i, o := range b.order {
		x[i] = rhs[o]
	}
	for k := 0; k < n; k++ {
		row := b.lu[k*w+b.lower : (k+1)*w]
		x[k] /= row[0]
		v := x[k]
		if v == 0 {
			continue
		}
		for j := 1; j <= min(n-1-k, b.upper); j++ {
			x[k+j] -= row[j] * v
		}
	}
	for k := n - 1; k >= 0; k-- {
		s := x[k]
		for i := k + 1; i <= min(n-1, k+b.lower); i++ {
			s -= b.lu[i*w+k-i+b.lower] * x[i]
		}
		x[k] = s
		if p := b.pivot[k]; p != k {
			x[k], x[p] = x[p], x[k]
		}
	}
	out := make([]float64, n)
	for i, o := range b.order {
		out[o] = x[i] * b.scale[o]
	}
	return out
}

// cuthillMcKee orders the symmetrized graph of a matrix breadth first from a
// vertex far out, reversed.
func cuthillMcKee(a Matrix) []int {
	n := len(a)
	near := make([][]int, n)
	for i, row := range a {
		for _, e := range row {
			if e.Col != i {
				near[i] = append(near[i], e.Col)
				near[e.Col] = append(near[e.Col], i)
			}
		}
	}
	for i := range near {
		sort.Ints(near[i])
		k := 0
		for j, v := range near[i] {
			if j == 0 || v != near[i][k-1] {
				near[i][k] = v
				k++
			}
		}
		near[i] = near[i][:k]
	}
	order := make([]int, 0, n)
	done := make([]bool, n)
	for i := 0; i < n; i++ {
		if done[i] {
			continue
		}
		start := i
		for k := 0; k < 4; k++ {
			level := breadthFirst(near, start, nil)
			far := level[len(level)-1]
			if far == start {
				break
			}
			start = far
		}
		order = append(order, breadthFirst(near, start, done)...)
	}
	for i, j := 0, n-1; i < j; i, j = i+1, j-1 {
		order[i], order[j] = order[j], order[i]
	}
	return order
}

func breadthFirst(near [][]int, start int, done []bool) []int {
	if done == nil {
		done = make([]bool, len(near))
	}
	queue := []int{start}
	done[start] = true
	for k := 0; k < len(queue); k++ {
		var next []int
		for _, v := range near[queue[k]] {
			if !done[v] {
				done[v] = true
				next = append(next, v)
			}
		}
		sort.SliceStable(next, func(i, j int) bool { return len(near[next[i]]) < len(near[next[j]]) })
		queue = append(queue, next...)
	}
	return queue
}
