package density

import (
	"math"

	"epslim/solver/grid"
)

// Mass returns the integral of the density.
func (r *Result) Mass() float64 { return r.Operator.Mass(r.padded) }

// Minimum returns the smallest value of the density and its cell.
func (r *Result) Minimum() (float64, int) {
	best := 0
	for k, v := range r.P {
		if v < r.P[best] {
			best = k
		}
	}
	return r.P[best], best
}

// Maximum returns the largest value of the density and its cell.
func (r *Result) Maximum() (float64, int) {
	best := 0
	for k, v := range r.P {
		if v > r.P[best] {
			best = k
		}
	}
	return r.P[best], best
}

// Mean returns the expectation of f over the density, f being evaluated at the
// cell centres.
func (r *Result) Mean(f func(x []float64) float64) float64 {
	l := &r.Operator.Layout
	x := make([]float64, r.Grid.Dim())
	var total float64
	for q := 0; q < l.Rows; q++ {
		j, k := l.RowCoordinates(q)
		if r.Grid.Dim() > 1 {
			x[1] = r.Grid.Axis(1).Center(j)
		}
		if r.Grid.Dim() > 2 {
			x[2] = r.Grid.Axis(2).Center(k)
		}
		var t float64
		for i := 0; i < l.Nx; i++ {
			x[0] = r.Grid.Axis(0).Center(i)
			t += r.P[q*l.Nx+i] * r.Operator.Width(i) * f(x)
		}
		total += t * r.Operator.RowVolume(q)
	}
	return total
}

// Moments returns mean vector and covariance matrix.
func (r *Result) Moments() (mean []float64, cov [][]float64) {
	d := r.Grid.Dim()
	mean = make([]float64, d)
	for a := range mean {
		mean[a] = r.Mean(func(x []float64) float64 { return x[a] })
	}
	cov = make([][]float64, d)
	for a := range cov {
		cov[a] = make([]float64, d)
		for b := range cov[a] {
			if b < a {
				cov[a][b] = cov[b][a]
				continue
			}
			cov[a][b] = r.Mean(func(x []float64) float64 { return (x[a] - mean[a]) * (x[b] - mean[b]) })
		}
	}
	return mean, cov
}

// Marginal returns the density of the given axes alone, the first of them
// fastest; the others are integrated out.
func (r *Result) Marginal(axes ...int) []float64 {
	n := 1
	stride := make([]int, r.Grid.Dim())
	for _, d := range axes {
		stride[d] = n
		n *= r.Grid.Axis(d).Cells()
	}
	out := make([]float64, n)
	kept := make([]bool, r.Grid.Dim())
	for _, d := range axes {
		kept[d] = true
	}
	shape := r.Grid.Shape()
	cell := make([]int, r.Grid.Dim())
	for k := range r.P {
		at, w := 0, r.P[k]
		for d, i := range cell {
			if kept[d] {
				at += i * stride[d]
			} else {
				w *= r.Grid.Axis(d).Width(i)
			}
		}
		out[at] += w
		for d := range cell {
			if cell[d]++; cell[d] < shape[d] {
				break
			}
			cell[d] = 0
		}
	}
	return out
}

// Side is what the density does at one side of the grid.
type Side struct {
	Mass  float64 // probability in the outermost layer of cells
	Level float64 // marginal density in that layer times length of the axis: one for a uniform density
}

// Boundary returns the state of the lower and the upper side of every axis.
func (r *Result) Boundary() [][2]Side {
	out := make([][2]Side, r.Grid.Dim())
	for d := range out {
		a := r.Grid.Axis(d)
		m := r.Marginal(d)
		for q, i := range [2]int{0, a.Cells() - 1} {
			out[d][q] = Side{Mass: m[i] * a.Width(i), Level: m[i] * (a.Hi() - a.Lo())}
		}
	}
	return out
}

// Current is the probability current J = f p - div(A p)/2 of a density.
type Current struct {
	Faces [][]float64 // Faces[d][k]: component d through the upper face along axis d of cell k, per unit area
	Cells [][]float64 // Cells[d][k]: component d averaged to the centre of cell k
	Max   float64     // largest length of the vector at a cell
	MaxAt int
	// Divergence is the largest net outflow of a cell divided by its volume,
	// and Scale what it should be compared with: the largest sum of the flows
	// through all faces of a cell, counted without sign and in both senses.
	Divergence, Scale float64
}

// Current computes the current of the density. Flows along links off the axes
// are attributed to the axes they run along.
func (r *Result) Current() *Current {
	m, g := r.Operator, r.Grid
	l := &m.Layout
	d := g.Dim()
	c := &Current{}
	for a := 0; a < d; a++ {
		c.Faces = append(c.Faces, make([]float64, g.Cells()))
		c.Cells = append(c.Cells, make([]float64, g.Cells()))
	}
	p := r.padded
	for q := 0; q < l.Rows; q++ {
		s := l.Row(q)
		for li := range m.Links {
			link := &m.Links[li]
			u := m.UpperRow(li, q)
			if u < 0 {
				continue
			}
			t := l.Row(u) + link.Step[0]
			if li < d {
				r.alongAxis(c, li, q, u)
				continue
			}
			for i := 0; i < l.Nx; i++ {
				flow := link.Out[s+i]*p[s+i] - link.Back[s+i]*p[t+i]
				if flow == 0 {
					continue
				}
				other := u*l.Nx + ((i+link.Step[0])%l.Nx+l.Nx)%l.Nx
				r.attribute(c, link.Step, q*l.Nx+i, other, flow)
			}
		}
	}
	for k := range r.P {
		var s float64
		for a := 0; a < d; a++ {
			s += c.Cells[a][k] * c.Cells[a][k]
		}
		if s = math.Sqrt(s); s > c.Max {
			c.Max, c.MaxAt = s, k
		}
	}
	c.Divergence, c.Scale = r.divergence()
	return c
}

// alongAxis books the flows of row q along axis d into row u.
func (r *Result) alongAxis(c *Current, d, q, u int) {
	m := r.Operator
	l := &m.Layout
	link := &m.Links[d]
	s, t := l.Row(q), l.Row(u)+link.Step[0]
	p := r.padded
	area := m.RowVolume(q)
	if d > 0 {
		j, k := l.RowCoordinates(q)
		area /= r.Grid.Axis(d).Width([]int{0, j, k}[d])
	}
	for i := 0; i < l.Nx; i++ {
		other := u*l.Nx + i
		w := area
		if d == 0 {
			other = q*l.Nx + (i+1)%l.Nx
		} else {
			w *= m.Width(i)
		}
		flow := (link.Out[s+i]*p[s+i] - link.Back[s+i]*p[t+i]) / w
		c.Faces[d][q*l.Nx+i] += flow
		c.Cells[d][q*l.Nx+i] += 0.5 * flow
		c.Cells[d][other] += 0.5 * flow
	}
}

// attribute books a flow between two cells: on the face between them for a
// link along an axis, shared among the faces on the two ways round otherwise;
// and as half of a current density in either cell.
func (r *Result) attribute(c *Current, step [grid.MaxDim]int, from, to int, flow float64) {
	g := r.Grid
	a, b := g.Coordinates(from), g.Coordinates(to)
	for d := range a {
		if step[d] == 0 {
			continue
		}
		sign := float64(step[d])
		for _, cell := range [2][]int{a, b} {
			area := 1.0
			for e := range cell {
				if e != d {
					area *= g.Axis(e).Width(cell[e])
				}
			}
			c.Cells[d][g.Index(cell...)] += 0.5 * sign * flow / area
		}
	}
	axes := 0
	for d := range a {
		if step[d] != 0 {
			axes++
		}
	}
	for d := range a {
		if step[d] == 0 {
			continue
		}
		// Half of the ways round cross the face along d first, half last.
		for _, cell := range [2][]int{a, b} {
			at := append([]int(nil), cell...)
			at[d] = a[d]
			if step[d] < 0 {
				at[d] = b[d]
			}
			area := 1.0
			for e := range at {
				if e != d {
					area *= g.Axis(e).Width(at[e])
				}
			}
			c.Faces[d][g.Index(at...)] += 0.5 * float64(step[d]) * flow / area
		}
	}
}

func (r *Result) divergence() (worst, scale float64) {
	m := r.Operator
	l := &m.Layout
	y, diag := l.Vector(), make([]float64, l.Nx)
	m.Apply(y, r.padded, 0)
	for q := 0; q < l.Rows; q++ {
		m.DiagonalRow(diag, q, 0)
		s := l.Row(q)
		for i := range diag {
			v := m.RowVolume(q) * m.Width(i)
			worst = math.Max(worst, math.Abs(y[s+i])/v)
			scale = math.Max(scale, 2*diag[i]*math.Abs(r.padded[s+i])/v)
		}
	}
	return worst, scale
}

// relativeResidual returns the root mean square over the cells of the net
// outflow relative to the outflow.
func (r *Result) relativeResidual() float64 {
	m := r.Operator
	l := &m.Layout
	y, diag := l.Vector(), make([]float64, l.Nx)
	m.Apply(y, r.padded, 0)
	var t float64
	for q := 0; q < l.Rows; q++ {
		m.DiagonalRow(diag, q, 0)
		for i := range diag {
			if d := diag[i] * r.padded[l.Row(q)+i]; d > 0 {
				w := y[l.Row(q)+i] / d
				t += w * w
			}
		}
	}
	return math.Sqrt(t / float64(r.Grid.Cells()))
}

// EntropyProduction returns the entropy production rate in units of k_B per
// unit time, the sum over the links of flow times logarithm of the ratio of
// the one-way flows (Schnakenberg, Rev. Mod. Phys. 48 (1976) 571-585). It is
// zero exactly in detailed balance and +Inf when some link carries flow in one
// sense only. Links between cells below 1e-14 of the largest density, where
// that is known to rounding only, are left out.
func (r *Result) EntropyProduction() float64 {
	m := r.Operator
	l := &m.Layout
	part := make([]float64, l.Rows)
	p := r.padded
	top, _ := r.Maximum()
	noise := 1e-14 * top
	m.Each(func(_, lo, hi int) {
		for q := lo; q < hi; q++ {
			s := l.Row(q)
			for li := range m.Links {
				link := &m.Links[li]
				u := m.UpperRow(li, q)
				if u < 0 {
					continue
				}
				t := l.Row(u) + link.Step[0]
				for i := 0; i < l.Nx; i++ {
					a, b := link.Out[s+i]*p[s+i], link.Back[s+i]*p[t+i]
					if a != b && (p[s+i] > noise || p[t+i] > noise) {
						part[q] += (a - b) * logRatio(a, b)
					}
				}
			}
		}
	})
	var t float64
	for _, v := range part {
		t += v
	}
	return t
}

// logRatio returns log(a/b), accurate for a close to b.
func logRatio(a, b float64) float64 {
	if x := (a - b) / b; math.Abs(x) < 0.5 {
		return math.Log1p(x)
	}
	return math.Log(a / b)
}
