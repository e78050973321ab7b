package volume

import (
	"math"

	"epslim/solver/grid"
)

// blockCells bounds the number of blocks in Rebalance.
const blockCells = 1200

// Rebalance improves a positive approximation p of the stationary density by
// one step of aggregation: cells are lumped into rectangular blocks, the flows
// between the blocks are added up with the density as it is, the resulting
// Markov chain is solved by elimination without subtractions, and every block
// is scaled to its weight. (Takahashi 1975; Koury, McAllister and Stewart, SIAM
// J. Alg. Disc. Meth. 5 (1984) 164-186.) It returns the change, the L1 distance of the
// weights of the blocks before and after.
//
// The step finds the weights of parts that hardly exchange mass, which no
// residual shows: a part may be wrong by the residual over the exchange rate.
func Rebalance(m *Operator, p []float64) (float64, error) {
	g := m.Grid
	var shift [grid.MaxDim]int
	for {
		merge := make([]bool, g.Dim())
		if g.Cells() <= blockCells {
			break
		}
		longest := 0
		for _, n := range g.Shape() {
			longest = max(longest, n)
		}
		for d, n := range g.Shape() {
			if 2*n > longest {
				merge[d] = true
				shift[d]++
			}
		}
		g = g.Coarsen(merge)
	}
	c := &Operator{Grid: g, Layout: NewLayout(g, 1), workers: 1}
	for _, link := range m.Links {
		c.Links = append(c.Links, Link{link.Step, c.Layout.Vector(), c.Layout.Vector()})
	}
	c.finish()
	m.WrapAll(p)
	mass := lump(m, c, p, shift)
	e, err := EliminateClass(c, nil)
	if err != nil {
		return 0, err
	}
	s := c.Layout.Vector()
	e.Stationary(s)
	var before, after float64
	for k, w := range mass {
		before += w
		after += w * s[c.Layout.Row(k/c.Layout.Nx)+k%c.Layout.Nx]
	}
	if !(after > 0) {
		return math.Inf(1), nil
	}
	scale := before / after
	var change float64
	for k, w := range mass {
		at := c.Layout.Row(k/c.Layout.Nx) + k%c.Layout.Nx
		s[at] *= scale
		change += math.Abs(s[at]-1) * w / before
	}
	l := &m.Layout
	m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			j, k := l.RowCoordinates(r)
			f := s[c.Layout.Row(j>>shift[1]+c.Layout.Shape(1)*(k>>shift[2])):]
			row := p[l.Row(r):][:l.Nx]
			for i := range row {
				row[i] *= f[i>>shift[0]]
			}
		}
	})
	m.WrapAll(p)
	return change, nil
}

// lump adds up the flows between blocks into the links of c and returns the
// masses of the blocks.
func lump(m, c *Operator, p []float64, shift [grid.MaxDim]int) []float64 {
	l := &m.Layout
	mass := make([]float64, c.Grid.Cells())
	find := map[[grid.MaxDim]int]int{}
	for li, link := range c.Links {
		find[link.Step] = li
	}
	for r := 0; r < l.Rows; r++ {
		j, k := l.RowCoordinates(r)
		s := l.Row(r)
		block := [grid.MaxDim]int{0, j >> shift[1], k >> shift[2]}
		row := block[1] + c.Layout.Shape(1)*block[2]
		for i := 0; i < l.Nx; i++ {
			mass[row*c.Layout.Nx+i>>shift[0]] += p[s+i] * m.rowVolume[r] * m.width[i]
		}
		for li := range m.Links {
			link := &m.Links[li]
			u := m.UpperRow(li, r)
			if u < 0 {
				continue
			}
			uj, uk := l.RowCoordinates(u)
			sameRow := uj>>shift[1] == block[1] && uk>>shift[2] == block[2]
			if sameRow && link.Step[0] == 0 {
				continue
			}
			t := l.Row(u) + link.Step[0]
			stride := 1
			if sameRow && link.Step[0] == 1 { // only the last column of every block leaves it
				stride = 1 << shift[0]
			}
			for i := stride - 1; i < l.Nx+stride-1; i += stride {
				i := min(i, l.Nx-1)
				x := i + link.Step[0]
				if x < 0 || x >= l.Nx {
					if !l.PeriodicX {
						continue
					}
					x = (x + l.Nx) % l.Nx
				}
				if sameRow && x>>shift[0] == i>>shift[0] {
					continue
				}
				block[0] = i >> shift[0]
				c.addFlow(find, block, [grid.MaxDim]int{x >> shift[0], uj >> shift[1], uk >> shift[2]}, link.Out[s+i]*p[s+i], link.Back[s+i]*p[t+i])
			}
		}
	}
	return mass
}

// addFlow adds the one-way flows between two blocks to the link that joins them.
func (m *Operator) addFlow(find map[[grid.MaxDim]int]int, from, to [grid.MaxDim]int, out, back float64) {
	l := &m.Layout
	var step, reverse [grid.MaxDim]int
	for d := range step {
		n := l.Shape(d)
		step[d] = to[d] - from[d]
		if l.periodic[d] && n > 2 {
			if step[d] == n-1 {
				step[d] = -1
			} else if step[d] == 1-n {
				step[d] = 1
			}
		}
		reverse[d] = -step[d]
	}
	li, ok := find[step]
	if !ok {
		if li, ok = find[reverse]; !ok {
			return
		}
		from, out, back = to, back, out
	}
	at := l.Row(from[1]+l.Shape(1)*from[2]) + from[0]
	m.Links[li].Out[at] += out
	m.Links[li].Back[at] += back
}
