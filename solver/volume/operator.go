package volume

import (
	"epslim/solver/grid"
)

// Link is one direction of the stencil. The net flow from cell k to the cell
// Step away is Out[k]*p[k] - Back[k]*p[k+Step]; both slices are padded vectors
// indexed by the lower cell k and zero where the link would leave the grid.
type Link struct {
	Step      [grid.MaxDim]int
	Out, Back []float64
}

// maxLinks is the largest number of link directions: three axes and the two
// diagonals of three coordinate planes.
const maxLinks = 9

// Operator is the assembled finite-volume operator. It is immutable and safe
// for concurrent use.
type Operator struct {
	Grid   *grid.Grid
	Layout Layout
	Links  []Link
	Kill   []float64 // outflow rate through absorbing sides times volume; nil without them
	Report Report
	// KillAt[d][0] and KillAt[d][1] are the parts of Kill that leave through the
	// lower and the upper side of axis d; nil for sides that do not absorb.
	KillAt [grid.MaxDim][2][]float64

	rowVolume []float64 // product of the widths of a row along the other axes
	width     []float64 // widths along the first axis
	up, down  [][]int32 // up[link][row]: row of the upper cell; down: row of the cell below
	workers   int
}

// finish prepares the tables of neighbouring rows and of volumes.
func (m *Operator) finish() {
	l := &m.Layout
	m.width = m.Grid.Axis(0).Widths()
	m.rowVolume = make([]float64, l.Rows)
	for r := range m.rowVolume {
		v := 1.0
		j, k := l.RowCoordinates(r)
		if m.Grid.Dim() > 1 {
			v *= m.Grid.Axis(1).Width(j)
		}
		if m.Grid.Dim() > 2 {
			v *= m.Grid.Axis(2).Width(k)
		}
		m.rowVolume[r] = v
	}
	for _, link := range m.Links {
		up, down := make([]int32, l.Rows), make([]int32, l.Rows)
		for r := range up {
			up[r] = int32(l.Neighbour(r, link.Step[1], link.Step[2]))
			down[r] = int32(l.Neighbour(r, -link.Step[1], -link.Step[2]))
		}
		m.up, m.down = append(m.up, up), append(m.down, down)
	}
}

// Workers returns the number of goroutines the operator was told to use.
func (m *Operator) Workers() int { return m.workers }

// Each runs body over all rows in contiguous pieces on the operator's workers.
func (m *Operator) Each(body func(worker, lo, hi int)) {
	Parallel(m.workersFor(), m.Layout.Rows, body)
}

// workersFor keeps small grids on one goroutine: starting another costs more
// than a sweep over a few thousand cells.
func (m *Operator) workersFor() int {
	if m.Layout.Rows*m.Layout.Nx < 1<<14 || m.Layout.Rows < 8 {
		return 1
	}
	return m.workers
}

// UpperRow returns the row of the upper cells of a link seen from row r, or -1.
func (m *Operator) UpperRow(link, r int) int { return int(m.up[link][r]) }

// LowerRow returns the row whose links in this direction end in row r, or -1.
func (m *Operator) LowerRow(link, r int) int { return int(m.down[link][r]) }

// RowVolume returns the product of the widths of row r along all axes but the
// first; the volume of cell i of the row is RowVolume(r)*Width(i).
func (m *Operator) RowVolume(r int) float64 { return m.rowVolume[r] }

// Width returns the width of column i along the first axis.
func (m *Operator) Width(i int) float64 { return m.width[i] }

// Apply computes y = (M + shift V) x. The ghost cells of x are refreshed; each
// flux is evaluated alike from both its ends, so the outflows of all cells add
// up to what the absorbing sides take, to rounding of the fluxes themselves.
func (m *Operator) Apply(y, x []float64, shift float64) {
	m.WrapAll(x)
	m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			m.ApplyRow(y, x, r, shift)
		}
	})
}

// ApplyRow computes row r of Apply; the ghost cells of x must be up to date.
func (m *Operator) ApplyRow(y, x []float64, r int, shift float64) {
	m.applyRow(y, x, r)
	m.addShift(y, x, r, shift)
}

// ApplyAdjointRow computes row r of ApplyAdjoint; the ghost cells of x must be
// up to date.
func (m *Operator) ApplyAdjointRow(y, x []float64, r int, shift float64) {
	m.applyAdjointRow(y, x, r)
	m.addShift(y, x, r, shift)
}

// ApplyAdjoint computes y = (M^T + shift V) x, minus the generator of the
// process times the cell volumes.
func (m *Operator) ApplyAdjoint(y, x []float64, shift float64) {
	m.WrapAll(x)
	m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			m.applyAdjointRow(y, x, r)
			m.addShift(y, x, r, shift)
		}
	})
}

// WrapAll refreshes the ghost cells of x.
func (m *Operator) WrapAll(x []float64) {
	if m.Layout.PeriodicX {
		for r := 0; r < m.Layout.Rows; r++ {
			m.Layout.Wrap(x, r)
		}
	}
}

// linkRow points to what one row needs of one link direction: the link upwards
// with the value at its far end, and the link from below with the value there.
type linkRow struct {
	out, back, xu, outd, backd, xd *float64
}

// linkView is linkRow as slices.
type linkView struct {
	out, back, xu, outd, backd, xd []float64
}

func (m *Operator) applyRow(y, x []float64, r int) {
	l := &m.Layout
	n := l.Nx
	s := l.Row(r)
	var views [maxLinks]linkView
	var rows [maxLinks]linkRow
	for li := range m.Links {
		link := &m.Links[li]
		e := link.Step[0]
		u, d := l.Row(int(m.up[li][r]))+e, l.Row(int(m.down[li][r]))-e
		v := linkView{link.Out[s:][:n], link.Back[s:][:n], x[u:][:n], link.Out[d:][:n], link.Back[d:][:n], x[d:][:n]}
		views[li] = v
		rows[li] = linkRow{&v.out[0], &v.back[0], &v.xu[0], &v.outd[0], &v.backd[0], &v.xd[0]}
	}
	fluxRow(y[s:][:n], x[s:][:n], views[:len(m.Links)], rows[:len(m.Links)])
}

// fluxRow writes the net outflow of every cell of a row.
func fluxRow(y, x []float64, views []linkView, rows []linkRow) {
	for i := fluxFast(y, x, rows); i < len(y); i++ {
		var t float64
		for li := range views {
			v := &views[li]
			t += (float64(v.out[i]*x[i]) - float64(v.back[i]*v.xu[i])) - (float64(v.outd[i]*v.xd[i]) - float64(v.backd[i]*x[i]))
		}
		y[i] = t
	}
}

func (m *Operator) applyAdjointRow(y, x []float64, r int) {
	l := &m.Layout
	n := l.Nx
	s := l.Row(r)
	xc, yy := x[s:][:n], y[s:][:n]
	clear(yy)
	for li := range m.Links {
		link := &m.Links[li]
		e := link.Step[0]
		u, d := l.Row(int(m.up[li][r]))+e, l.Row(int(m.down[li][r]))-e
		out, xu := link.Out[s:][:n], x[u:][:n]
		backd, xd := link.Back[d:][:n], x[d:][:n]
		for i := range yy {
			yy[i] += out[i]*(xc[i]-xu[i]) - backd[i]*(xd[i]-xc[i])
		}
	}
}

func (m *Operator) addShift(y, x []float64, r int, shift float64) {
	l := &m.Layout
	s := l.Row(r)
	if m.Kill != nil {
		for i := 0; i < l.Nx; i++ {
			y[s+i] += m.Kill[s+i] * x[s+i]
		}
	}
	if shift != 0 {
		v := shift * m.rowVolume[r]
		for i, w := range m.width {
			y[s+i] += v * w * x[s+i]
		}
	}
}

// DiagonalRow writes the diagonal of M + shift V for row r into diag[:Nx].
func (m *Operator) DiagonalRow(diag []float64, r int, shift float64) {
	l := &m.Layout
	s := l.Row(r)
	diag = diag[:l.Nx]
	v := shift * m.rowVolume[r]
	for i, w := range m.width {
		diag[i] = v * w
	}
	if m.Kill != nil {
		for i := range diag {
			diag[i] += m.Kill[s+i]
		}
	}
	for li := range m.Links {
		link := &m.Links[li]
		d := l.Row(int(m.down[li][r])) - link.Step[0]
		out, backd := link.Out[s:][:l.Nx], link.Back[d:][:l.Nx]
		for i := range diag {
			diag[i] += out[i] + backd[i]
		}
	}
}

// Mass returns the integral of a density given as a padded vector: the sum of
// volume times value, row by row in order.
func (m *Operator) Mass(p []float64) float64 {
	part := make([]float64, m.Layout.Rows)
	m.Each(func(_, lo, hi int) {
		for r := lo; r < hi; r++ {
			s := m.Layout.Row(r)
			var t float64
			for i, w := range m.width {
				t += w * p[s+i]
			}
			part[r] = t * m.rowVolume[r]
		}
	})
	var t float64
	for _, v := range part {
		t += v
	}
	return t
}
