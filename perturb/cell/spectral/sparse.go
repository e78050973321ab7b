package spectral

import (
	"math"
	"sort"

	"epslim/perturb/cell/spectral/internal/band"
)

// entry is one element of a row.
type entry = band.Entry

// sparse is a square matrix by rows.
type sparse [][]entry

func newSparse(n int) sparse { return make(sparse, n) }

func identity(n int) sparse {
	m := newSparse(n)
	for i := range m {
		m[i] = []entry{{Col: i, V: 1}}
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
				m[i] = append(m[i], entry{Col: j, V: v})
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
			for _, f := range b[e.Col] {
				if !seen[f.Col] {
					seen[f.Col] = true
					cols = append(cols, f.Col)
				}
				acc[f.Col] += e.V * f.V
			}
		}
		sort.Ints(cols)
		for _, c := range cols {
			if acc[c] != 0 {
				out[i] = append(out[i], entry{Col: c, V: acc[c]})
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
			merged[e.Col] += e.V
		}
		for _, e := range b[i] {
			merged[e.Col] += s * e.V
		}
		for c, v := range merged {
			if v != 0 {
				out[i] = append(out[i], entry{Col: c, V: v})
			}
		}
		sort.Slice(out[i], func(p, q int) bool { return out[i][p].Col < out[i][q].Col })
	}
	return out
}

// cut keeps the leading n x n block.
func (a sparse) cut(n int) sparse {
	out := newSparse(n)
	for i := range out {
		for _, e := range a[i] {
			if e.Col < n {
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
			s += e.V * x[e.Col]
		}
		out[i] = s
	}
	return out
}

// product is a constant times a Kronecker product, one factor a space.
type product struct {
	c       float64
	factors []sparse
}

// kronecker adds up products, restricted to the basis functions of an index
// set.
func kronecker(set *indexSet, terms []product) sparse {
	out := newSparse(len(set.keep))
	acc, seen := make([]float64, len(out)), make([]bool, len(out))
	index := make([]int, len(set.sizes))
	for i, full := range set.keep {
		set.split(full, index)
		var cols []int
		add := func(full int, v float64) {
			c := set.place[full]
			if c < 0 {
				return
			}
			if !seen[c] {
				seen[c] = true
				cols = append(cols, c)
			}
			acc[c] += v
		}
		for _, t := range terms {
			walk(t.factors, set.sizes, index, 0, 0, t.c, add)
		}
		sort.Ints(cols)
		var size float64
		for _, c := range cols {
			size = math.Max(size, math.Abs(acc[c]))
		}
		for _, c := range cols {
			if math.Abs(acc[c]) > 1e-16*size {
				out[i] = append(out[i], entry{Col: c, V: acc[c]})
			}
			acc[c], seen[c] = 0, false
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
		walk(factors, sizes, index, k+1, col*sizes[k]+e.Col, v*e.V, add)
	}
}

// indexSet is the part of a tensor basis that is used: the functions whose
// degrees, each relative to the largest of its space, add up to little more than one.
// For one space that is all of it.
type indexSet struct {
	sizes []int
	full  int
	keep  []int // positions in the full tensor, in order
	place []int // the inverse, -1 outside the set
}

func newIndexSet(spaces []*space) *indexSet {
	s := &indexSet{full: 1}
	for _, sp := range spaces {
		s.sizes = append(s.sizes, sp.n)
		s.full *= sp.n
	}
	s.place = make([]int, s.full)
	index := make([]int, len(spaces))
	for i := range s.place {
		s.split(i, index)
		if share(spaces, index) <= 1+1e-12 {
			s.place[i] = len(s.keep)
			s.keep = append(s.keep, i)
		} else {
			s.place[i] = -1
		}
	}
	return s
}

// headroom lets the highest degrees of one space meet a few of the others: an
// operator without noise in one variable, such as w d/dtheta, would otherwise
// have nothing to couple the corner of the set to.
const headroom = 1.12

func share(spaces []*space, index []int) float64 {
	sum := 0.0
	for k, sp := range spaces {
		sum += float64(sp.degree(index[k])) / float64(sp.degree(sp.n-1))
	}
	if len(spaces) > 1 {
		sum /= headroom
	}
	return sum
}

func (s *indexSet) split(i int, index []int) {
	for k := len(s.sizes) - 1; k >= 0; k-- {
		index[k] = i % s.sizes[k]
		i /= s.sizes[k]
	}
}

// orders are those in which one axis varies slowest, as positions in the set.
func (s *indexSet) orders() [][]int {
	var out [][]int
	index := make([]int, len(s.sizes))
	for k := range s.sizes {
		order, key := make([]int, len(s.keep)), make([]int, len(s.keep))
		for i, full := range s.keep {
			s.split(full, index)
			order[i], key[i] = i, index[k]
		}
		sort.SliceStable(order, func(a, b int) bool { return key[order[a]] < key[order[b]] })
		out = append(out, order)
	}
	return out
}

// gather takes the coefficients in the set; scatter puts them back.
func (s *indexSet) gather(full []float64) []float64 {
	out := make([]float64, len(s.keep))
	for i, f := range s.keep {
		out[i] = full[f]
	}
	return out
}

func (s *indexSet) scatter(part []float64) []float64 {
	out := make([]float64, s.full)
	for i, f := range s.keep {
		out[f] = part[i]
	}
	return out
}
