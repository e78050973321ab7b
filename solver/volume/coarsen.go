package volume

import (
	"fmt"
	"math"
)

// Coarsen returns the operator on the grid with the cells of the chosen axes
// merged in pairs, made from the links of m alone. It needs links along the
// axes only.
//
// The face between two coarse cells consists of fine faces, and the coarse link
// is the sum of their links, each stretched to the distance of the coarse
// centres with drift and diffusion as they are at the face: the fitted flux with
// the cell Peclet number of the longer distance. Non-negative links stay
// non-negative, column sums stay zero, and the drift through the faces of a
// coarse cell is the sum over the fine faces, so a drift without divergence
// stays one without.
func Coarsen(m *Operator, merge []bool) (*Operator, error) {
	d := m.Grid.Dim()
	if len(m.Links) != d {
		return nil, fmt.Errorf("coarsening: links off the axes cannot be merged")
	}
	g := m.Grid.Coarsen(merge)
	c := &Operator{Grid: g, Layout: NewLayout(g, m.Layout.Ghost), workers: m.workers, Report: m.Report}
	block := Block64(2*d, c.Layout.Len)
	for i, link := range m.Links {
		c.Links = append(c.Links, Link{link.Step, block[2*i], block[2*i+1]})
	}
	if m.Kill != nil {
		c.Kill = c.Layout.Vector()
	}
	c.finish()
	w := &merger{fine: m, coarse: c}
	for a := range w.merged {
		w.merged[a] = a < d && merge[a]
	}
	ratio := make([][]float64, d)
	for a := range ratio {
		ratio[a] = w.ratios(a)
	}
	c.Each(func(_, lo, hi int) {
		o, b := make([]float64, m.Layout.Nx), make([]float64, m.Layout.Nx)
		for r := lo; r < hi; r++ {
			w.alongRow(r, ratio[0])
			for a := 1; a < d; a++ {
				w.acrossRows(r, a, ratio[a], o, b)
			}
			if c.Kill != nil {
				w.kill(r)
			}
			for a := range c.Links {
				c.Layout.Wrap(c.Links[a].Out, r)
				c.Layout.Wrap(c.Links[a].Back, r)
			}
		}
	})
	return c, nil
}

type merger struct {
	fine, coarse *Operator
	merged       [3]bool
}

// children returns the fine indices of coarse index i along axis a.
func (w *merger) children(a, i int) (lo, hi int) {
	if !w.merged[a] {
		return i, i + 1
	}
	return 2 * i, min(2*i+2, w.fine.Layout.Shape(a))
}

// stretch returns the fitted link over ratio times the distance. For a ratio of
// two B(2z) = 2 B(z)/(exp(z)+1) makes it a rational function of the link.
func stretch(out, back, ratio float64) (float64, float64) {
	s := out + back
	switch {
	case ratio == 1 || s == 0:
		return out, back
	case math.Abs(ratio-2) < 1e-9 || out <= 0 || back <= 0:
		return out * (out / s), back * (back / s)
	}
	z := math.Log(out / back)
	if math.Abs(z) < 1e-8 {
		return out / ratio, back / ratio
	}
	m, p := bernoulliPair(z)
	rm, rp := bernoulliPair(ratio * z)
	return out * rm / (ratio * m), back * rp / (ratio * p)
}

// ratios returns for every coarse cell along axis a the distance to the next
// one over that of the fine cells at the face.
func (w *merger) ratios(a int) []float64 {
	f, c := w.fine.Grid.Axis(a), w.coarse.Grid.Axis(a)
	v := make([]float64, c.Cells())
	for i := range v {
		v[i] = 1
		if w.merged[a] {
			_, hi := w.children(a, i)
			v[i] = c.Distance(i) / f.Distance(hi-1)
		}
	}
	return v
}

// fineRows calls body for the fine rows of coarse row r whose place along axis
// skip (0 for none) is the given child.
func (w *merger) fineRows(r, skip, child int, body func(row int)) {
	j, k := w.coarse.Layout.RowCoordinates(r)
	j0, j1 := w.children(1, j)
	k0, k1 := w.children(2, k)
	switch skip {
	case 1:
		j0, j1 = child, child+1
	case 2:
		k0, k1 = child, child+1
	}
	for k := k0; k < k1; k++ {
		for j := j0; j < j1; j++ {
			body(j + w.fine.Layout.Shape(1)*k)
		}
	}
}

func (w *merger) alongRow(r int, ratio []float64) {
	f, c := &w.fine.Links[0], &w.coarse.Links[0]
	s, n, nf := w.coarse.Layout.Row(r), w.coarse.Layout.Nx, w.fine.Layout.Nx
	out, back := c.Out[s:][:n], c.Back[s:][:n]
	links := n - 1
	if w.fine.Layout.PeriodicX && n > 1 {
		links = n
	}
	w.fineRows(r, 0, 0, func(q int) {
		t := w.fine.Layout.Row(q)
		fo, fb := f.Out[t:][:nf], f.Back[t:][:nf]
		for i := 0; i < links; i++ {
			_, hi := w.children(0, i)
			o, b := stretch(fo[hi-1], fb[hi-1], ratio[i])
			out[i] += o
			back[i] += b
		}
	})
}

func (w *merger) acrossRows(r, a int, ratio, o, b []float64) {
	c, l := &w.coarse.Links[a], &w.fine.Layout
	s, n, nf := w.coarse.Layout.Row(r), w.coarse.Layout.Nx, l.Nx
	if w.coarse.UpperRow(a, r) < 0 || w.coarse.Layout.Shape(a) == 1 {
		return
	}
	j, k := w.coarse.Layout.RowCoordinates(r)
	at := [3]int{0, j, k}[a]
	_, hi := w.children(a, at)
	f := &w.fine.Links[a]
	out, back := c.Out[s:][:n], c.Back[s:][:n]
	w.fineRows(r, a, hi-1, func(q int) {
		t := l.Row(q)
		fo, fb := f.Out[t:][:nf], f.Back[t:][:nf]
		for i := range o {
			o[i], b[i] = stretch(fo[i], fb[i], ratio[at])
		}
		w.addColumns(out, o)
		w.addColumns(back, b)
	})
}

// addColumns adds fine columns to their coarse ones.
func (w *merger) addColumns(dst, src []float64) {
	if !w.merged[0] {
		for i, v := range src {
			dst[i] += v
		}
		return
	}
	for i := 0; i < len(src)/2; i++ {
		dst[i] += src[2*i] + src[2*i+1]
	}
	if n := len(src); n%2 == 1 {
		dst[n/2] += src[n-1]
	}
}

// kill adds the losses of the children; the longer way to the side is left to
// the coarse correction.
func (w *merger) kill(r int) {
	s, n, nf := w.coarse.Layout.Row(r), w.coarse.Layout.Nx, w.fine.Layout.Nx
	w.fineRows(r, 0, 0, func(q int) {
		w.addColumns(w.coarse.Kill[s:][:n], w.fine.Kill[w.fine.Layout.Row(q):][:nf])
	})
}
