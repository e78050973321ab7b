package volume

import (
	"math"

	"epslim/solver/grid"

	"gonum.org/v1/gonum/mat"
)

// assembleFull builds the operator for a diffusion matrix with off-diagonal
// entries: links along the axes and along the two diagonals of every
// coordinate plane, nine points in two dimensions and nineteen in three.
//
// Around every inner vertex of a plane (a, b) the dual rectangle carries the
// energy of the gradient u, A_aa u_a^2 + 2 A_ab u_a u_b + A_bb u_b^2. Its mixed
// term is expressed by the squared difference along that diagonal on which A_ab
// (with the sign of the diagonal) is positive, weight |A_ab|, and the axis links around the vertex
// are reduced accordingly. All weights are non-negative, and M is an M-matrix,
// as long as A_aa h_b/h_a exceeds the sum of |A_ab|; Report tells where it does
// not. Beside a reflecting side the vanishing normal current is used to
// eliminate the normal gradient, which leaves A_aa - A_ab^2/A_bb for the half cell
// at the side.
//
// The force along a link e is e.A^-1(2f - div A), so that a density exp(phi) with
// A grad(phi) = 2f - div A, which is detailed balance, has no flow along any link
// up to the error of the midpoint rule. Where A is singular the part of the
// drift outside its range is carried by upwind flows along the axes.
func (a *assembly) assembleFull() error {
	m, l := a.m, &a.m.Layout
	a.pairs = nil
	for p := 0; p < a.dim; p++ {
		for q := p + 1; q < a.dim; q++ {
			a.pairs = append(a.pairs, pair{p, q, l.Vector()})
			for _, sign := range [2]int{1, -1} {
				var step [grid.MaxDim]int
				step[p], step[q] = sign, 1
				m.Links = append(m.Links, Link{step, l.Vector(), l.Vector()})
			}
		}
	}
	m.up, m.down = nil, nil
	m.finish()
	if err := a.each(a.vertexRow); err != nil {
		return err
	}
	for _, p := range a.pairs {
		for r := 0; r < l.Rows; r++ {
			l.Wrap(p.weight, r)
		}
	}
	return a.each(a.faceRow)
}

// pair is a coordinate plane; weight[k] is |A_ab| at the vertex above cell k in
// both directions times the width along the third axis, zero where there is no
// vertex.
type pair struct {
	a, b   int
	weight []float64
}

// derivative step for div A, as a fraction of the cell.
const divergenceStep = 1e-4

// forces evaluates the first n points of row r with the given staggering and
// returns for every point G = A^-1 (2f - div A), and the drift outside the
// range of A. The diffusion at the points is left in diff.
func (ev *evaluator) forces(stagger, r, n int, g, rest, diff [][]float64) error {
	dim := ev.a.dim
	if err := ev.row(stagger, r, n); err != nil {
		return err
	}
	for d := 0; d < dim; d++ {
		for i := 0; i < n; i++ {
			g[d][i] = 2 * ev.drift[d][i]
		}
	}
	for e := range diff {
		copy(diff[e][:n], ev.diffusion[e][:n])
	}
	j, k := ev.a.m.Layout.RowCoordinates(r)
	for d := 0; d < dim; d++ {
		axis := ev.a.g.Axis(d)
		h := func(i int) float64 { return divergenceStep * axis.Width([]int{i, j, k}[d]) }
		for _, sign := range [2]float64{1, -1} {
			ev.fillPoints(stagger, r, n)
			for i := 0; i < n; i++ {
				ev.points[d][i] += sign * h(i)
			}
			if err := ev.eval(n); err != nil {
				return err
			}
			for p := 0; p < dim; p++ {
				col := ev.diffusion[Entry(dim, p, d)]
				for i := 0; i < n; i++ {
					g[p][i] -= sign * col[i] / (2 * h(i))
				}
			}
		}
	}
	var point, out, left [grid.MaxDim]float64
	var a [6]float64
	for i := 0; i < n; i++ {
		for d := 0; d < dim; d++ {
			point[d] = g[d][i]
		}
		for e := range diff {
			a[e] = diff[e][i]
		}
		solveForce(dim, &a, &point, &out, &left)
		for d := 0; d < dim; d++ {
			g[d][i], rest[d][i] = out[d], 0.5*left[d]
		}
	}
	return nil
}

// solveForce solves A x = b for a positive semidefinite A given by its upper
// triangle; left is the part of b outside the range of A.
func solveForce(dim int, a *[6]float64, b, x, left *[grid.MaxDim]float64) {
	*left = [grid.MaxDim]float64{}
	if dim == 2 {
		det, trace := a[0]*a[2]-a[1]*a[1], a[0]+a[2]
		if det > 1e-12*a[0]*a[2] {
			x[0], x[1] = (a[2]*b[0]-a[1]*b[1])/det, (a[0]*b[1]-a[1]*b[0])/det
			return
		}
		if trace == 0 {
			x[0], x[1] = 0, 0
			left[0], left[1] = b[0], b[1]
			return
		}
		// Rank one: A = trace * v v^T.
		y0, y1 := a[0]*b[0]+a[1]*b[1], a[1]*b[0]+a[2]*b[1]
		x[0], x[1] = y0/(trace*trace), y1/(trace*trace)
		left[0], left[1] = b[0]-y0/trace, b[1]-y1/trace
		return
	}
	c00 := a[3]*a[5] - a[4]*a[4]
	c01 := a[2]*a[4] - a[1]*a[5]
	c02 := a[1]*a[4] - a[2]*a[3]
	det := a[0]*c00 + a[1]*c01 + a[2]*c02
	if det > 1e-12*a[0]*a[3]*a[5] {
		c11 := a[0]*a[5] - a[2]*a[2]
		c12 := a[1]*a[2] - a[0]*a[4]
		c22 := a[0]*a[3] - a[1]*a[1]
		x[0] = (c00*b[0] + c01*b[1] + c02*b[2]) / det
		x[1] = (c01*b[0] + c11*b[1] + c12*b[2]) / det
		x[2] = (c02*b[0] + c12*b[1] + c22*b[2]) / det
		return
	}
	pseudoSolve(a, b, x, left)
}

// pseudoSolve is solveForce for a singular 3 x 3 matrix.
func pseudoSolve(a *[6]float64, b, x, left *[grid.MaxDim]float64) {
	s := mat.NewSymDense(3, []float64{a[0], a[1], a[2], a[1], a[3], a[4], a[2], a[4], a[5]})
	*x, *left = [grid.MaxDim]float64{}, *b
	var eig mat.EigenSym
	if !eig.Factorize(s, true) {
		return
	}
	var v mat.Dense
	eig.VectorsTo(&v)
	values := eig.Values(nil)
	for q, lambda := range values {
		if lambda <= 1e-10*values[2] {
			continue
		}
		var dot float64
		for d := 0; d < 3; d++ {
			dot += v.At(d, q) * b[d]
		}
		for d := 0; d < 3; d++ {
			x[d] += dot / lambda * v.At(d, q)
			left[d] -= dot * v.At(d, q)
		}
	}
}

// scratch for forces.
func (ev *evaluator) forceBuffers() (g, rest, diff [][]float64) {
	n := ev.a.g.Axis(0).Cells() + 1
	block := func(k int) [][]float64 {
		v := make([][]float64, k)
		for i := range v {
			v[i] = make([]float64, n)
		}
		return v
	}
	return block(ev.a.dim), block(ev.a.dim), block(entries(ev.a.dim))
}

// vertexRow fills the weights and the diagonal links of row r.
func (a *assembly) vertexRow(ev *evaluator, r int) error {
	m, l := a.m, &a.m.Layout
	g, rest, diff := ev.forceBuffers()
	s := l.Row(r)
	for pi := range a.pairs {
		p := &a.pairs[pi]
		n := min(a.linksOf(p.a, r), a.linksOf(p.b, r))
		if n == 0 {
			continue
		}
		if err := ev.forces(1<<p.a|1<<p.b, r, n, g, rest, diff); err != nil {
			return err
		}
		plus, minus := &m.Links[a.dim+2*pi], &m.Links[a.dim+2*pi+1]
		var row int // row of the cells above along the first axis of the pair
		shift := 1
		if p.a == 0 {
			row = s
		} else {
			row, shift = l.Row(m.UpperRow(p.a, r)), 0
		}
		for i := 0; i < n; i++ {
			v := diff[Entry(a.dim, p.a, p.b)][i]
			w := math.Abs(v) * a.thirdWidth(p, r, i)
			p.weight[s+i] = w
			ha, hb := a.distance(p.a, r, i), a.distance(p.b, r, i)
			if v > 0 {
				o, b := bernoulliPair(g[p.a][i]*ha + g[p.b][i]*hb)
				plus.Out[s+i], plus.Back[s+i] = 0.5*w*o, 0.5*w*b
			} else if v < 0 {
				o, b := bernoulliPair(g[p.b][i]*hb - g[p.a][i]*ha)
				at := row + i + shift
				if shift == 1 && i == l.Nx-1 {
					at = row // around the period
				}
				minus.Out[at], minus.Back[at] = 0.5*w*o, 0.5*w*b
			}
		}
	}
	return nil
}

// distance returns the distance of the centres along axis d of cell i of row r
// and its upper neighbour.
func (a *assembly) distance(d, r, i int) float64 {
	if d == 0 {
		return a.g.Axis(0).Distance(i)
	}
	return a.distanceOf(d, r)
}

func (a *assembly) cellWidth(d, r, i int) float64 {
	if d == 0 {
		return a.m.width[i]
	}
	return a.widthOf(d, r)
}

// thirdWidth returns the width along the axis that is not in the plane.
func (a *assembly) thirdWidth(p *pair, r, i int) float64 {
	if a.dim == 2 {
		return 1
	}
	return a.cellWidth(3-p.a-p.b, r, i)
}

// faceRow fills the links along the axes of row r.
func (a *assembly) faceRow(ev *evaluator, r int) error {
	m, l := a.m, &a.m.Layout
	g, rest, diff := ev.forceBuffers()
	s := l.Row(r)
	for d := 0; d < a.dim; d++ {
		n := a.linksOf(d, r)
		if n == 0 {
			continue
		}
		if err := ev.forces(1<<d, r, n, g, rest, diff); err != nil {
			return err
		}
		link := &m.Links[d]
		for i := 0; i < n; i++ {
			h := a.distance(d, r, i)
			area := m.rowVolume[r] * m.width[i] / a.cellWidth(d, r, i)
			c := diff[Entry(a.dim, d, d)][i] * area / h
			full := c
			for pi := range a.pairs {
				p := &a.pairs[pi]
				if p.a != d && p.b != d {
					continue
				}
				other := p.a + p.b - d
				cross, normal := diff[Entry(a.dim, p.a, p.b)][i], diff[Entry(a.dim, other, other)][i]
				c -= a.crossShare(p, d, other, r, i, cross, normal, area/h)
			}
			if c < 0 && c > -1e-12*full {
				c = 0
			}
			o, b := bernoulliPair(g[d][i] * h)
			link.Out[s+i] = 0.5*c*o + area*max(rest[d][i], 0)
			link.Back[s+i] = 0.5*c*b + area*max(-rest[d][i], 0)
		}
	}
	return nil
}

// crossShare returns what the two halves of an axis link give up for the mixed
// term with another axis.
func (a *assembly) crossShare(p *pair, d, other, r, i int, cross, normal, conductance float64) float64 {
	l := &a.m.Layout
	w := a.cellWidth(other, r, i)
	axis := a.g.Axis(other)
	j, k := l.RowCoordinates(r)
	at := [3]int{i, j, k}[other]
	var total float64
	for _, up := range [2]bool{true, false} {
		row, col, next := r, i, at
		if up {
			next++
		} else {
			next--
			if other == 0 {
				col--
			} else {
				row = a.m.LowerRow(other, r)
			}
		}
		if axis.IsPeriodic() {
			next = (next + axis.Cells()) % axis.Cells()
		}
		if next < 0 || next >= axis.Cells() {
			if normal > 0 {
				total += cross * cross / normal * 0.5 * conductance
			}
			continue
		}
		if other == 0 && col < 0 {
			col += l.Nx
		}
		share := w / (w + axis.Width(next))
		total += p.weight[l.Row(row)+col] * share
	}
	return total
}
