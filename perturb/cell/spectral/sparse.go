package spectral

import (
	"math"
	"sort"
)

// entry is one element of a row.
type entry struct {
	col int
	v   float64
}

// sparse is a square matrix by rows.
type sparse [][]entry

func newSparse(n int) sparse { return make(sparse, n) }

func identity(n int) sparse {
	m := newSparse(n)
	for i := range m {
		m[i] = []entry{{i, 1}}
	}
	return m
}

// fromDense keeps the elements that are larger than rounding in their row or
// in their column; what is smaller is noise of the quadrature and would only
// widen the band.
func fromDense(n int, a []float64) sparse {
	m := newSparse(n)
	row, col := make([]float64, n), make([]float64, n)
	noise := 4e-14 * math.Max(1, float64(n)/20)
	for i := range row {
		for j, v := range a[i*n : (i+1)*n] {
			v = math.Abs(v)
			row[i], col[j] = math.Max(row[i], v), math.Max(col[j], v)
		}
	}
	for i := range m {
		for j, v := range a[i*n : (i+1)*n] {
			if math.Abs(v) > noise*math.Min(row[i], col[j]) {
				m[i] = append(m[i], entry{j, v})
			}
		}
	}
	return m
}

// times is the product a*b, cut to the first n rows and columns.
func (a sparse) times(b sparse) sparse {
	out := newSparse(len(a))
	acc := make([]float64, len(a))
	seen := make([]bool, len(a))
	for i, row := range a {
		var cols []int
		for _, e := range row {
			for _, f := range b[e.col] {
				if !seen[f.col] {
					seen[f.col] = true
					cols = append(cols, f.col)
				}
				acc[f.col] += e.v * f.v
			}
		}
		sort.Ints(cols)
		for _, c := range cols {
			if acc[c] != 0 {
				out[i] = append(out[i], entry{c, acc[c]})
			}
			acc[c], seen[c] = 0, false
		}
	}
	return out
}

// plus is a + s*b.
func (a sparse) plus(s float64, b sparse) sparse {
	out := newSparse(len(a))
	for i := range a {
		merged := map[int]float64{}
		for _, e := range a[i] {
			merged[e.col] += e.v
		}
		for _, e := range b[i] {
			merged[e.col] += s * e.v
		}
		for c, v := range merged {
			if v != 0 {
				out[i] = append(out[i], entry{c, v})
			}
		}
		sort.Slice(out[i], func(p, q int) bool { return out[i][p].col < out[i][q].col })
	}
	return out
}

// cut keeps the leading n x n block.
func (a sparse) cut(n int) sparse {
	out := newSparse(n)
	for i := range out {
		for _, e := range a[i] {
			if e.col < n {
				out[i] = append(out[i], e)
			}
		}
	}
	return out
}

func (a sparse) apply(x []float64) []float64 {
	out := make([]float64, len(a))
	for i, row := range a {
		var s float64
		for _, e := range row {
			s += e.v * x[e.col]
		}
		out[i] = s
	}
	return out
}

func (a sparse) entries() int {
	n := 0
	for _, r := range a {
		n += len(r)
	}
	return n
}

// product is a constant times a Kronecker product, one factor a space.
type product struct {
	c       float64
	factors []sparse
}

// kronecker adds up products; the last space varies fastest.
func kronecker(sizes []int, terms []product) sparse {
	n := 1
	for _, s := range sizes {
		n *= s
	}
	out := newSparse(n)
	acc, seen := make([]float64, n), make([]bool, n)
	index := make([]int, len(sizes))
	for i := 0; i < n; i++ {
		var cols []int
		add := func(c int, v float64) {
			if !seen[c] {
				seen[c] = true
				cols = append(cols, c)
			}
			acc[c] += v
		}
		for _, t := range terms {
			walk(t.factors, sizes, index, 0, 0, t.c, add)
		}
		sort.Ints(cols)
		var size float64
		for _, c := range cols {
			size = math.Max(size, math.Abs(acc[c]))
		}
		for _, c := range cols {
			if math.Abs(acc[c]) > 1e-16*size {
				out[i] = append(out[i], entry{c, acc[c]})
			}
			acc[c], seen[c] = 0, false
		}
		for k := len(sizes) - 1; k >= 0; k-- {
			if index[k]++; index[k] < sizes[k] {
				break
			}
			index[k] = 0
		}
	}
	return out
}

func walk(factors []sparse, sizes, index []int, k, col int, v float64, add func(int, float64)) {
	if k == len(sizes) {
		add(col, v)
		return
	}
	for _, e := range factors[k][index[k]] {
		walk(factors, sizes, index, k+1, col*sizes[k]+e.col, v*e.v, add)
	}
}
